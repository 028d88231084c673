"""Reading and writing: one door for meshes and mode sets, one for the dossier.

``read_mesh``, ``read_mesh_report``, ``read_modes``, ``write_interchange``, ``read_dossier``,
``read_dossier_report``, ``read_matrices``, ``save_mode_name``, ``bare_dossier``.
"""

from viewer.loaders.dossier_file import read_dossier, read_dossier_report
from viewer.loaders.dossier_text import bare_dossier, save_mode_name
from viewer.loaders.matrix_market import read_matrices
from viewer.loaders.raw_data import ReadReport
from viewer.loaders.registry import read_mesh, read_mesh_report, read_modes, write_interchange

__all__ = [
    "ReadReport",
    "bare_dossier",
    "read_dossier",
    "read_dossier_report",
    "read_matrices",
    "read_mesh",
    "read_mesh_report",
    "read_modes",
    "save_mode_name",
    "write_interchange",
]
