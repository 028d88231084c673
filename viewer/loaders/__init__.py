"""Reading and writing: one door for meshes, mode sets and test sets, one for the dossier.

``read_mesh``, ``read_mesh_report``, ``read_modes``, ``write_interchange``; ``read_test``, ``read_planned_test``,
``merge_runs``, ``write_test``; ``read_dossier``, ``read_dossier_report``, ``read_matrices``, ``save_mode_name``,
``write_test_changes``, ``bare_dossier``.
"""

from viewer.loaders.dossier_changes import save_mode_name, write_test_changes
from viewer.loaders.dossier_file import read_dossier, read_dossier_report
from viewer.loaders.dossier_text import bare_dossier
from viewer.loaders.hammer_runs import merge_runs
from viewer.loaders.hammer_write import write_test
from viewer.loaders.matrix_market import read_matrices
from viewer.loaders.planned_test import read_planned_test
from viewer.loaders.raw_data import ReadReport
from viewer.loaders.registry import read_mesh, read_mesh_report, read_modes, read_test, write_interchange

__all__ = [
    "ReadReport",
    "bare_dossier",
    "merge_runs",
    "read_dossier",
    "read_dossier_report",
    "read_matrices",
    "read_mesh",
    "read_mesh_report",
    "read_modes",
    "read_planned_test",
    "read_test",
    "save_mode_name",
    "write_interchange",
    "write_test",
    "write_test_changes",
]
