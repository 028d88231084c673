"""Text of a ready dossier for a mesh that has none."""

from __future__ import annotations

import os
from collections.abc import Mapping
from pathlib import Path

import numpy as np

from viewer.cells import KINDS
from viewer.model.arrays import Array
from viewer.model.mesh import Mesh

_SHOWN = 20


def bare_dossier(
    mesh: Mesh, mesh_path: str | os.PathLike[str], modes_path: str | os.PathLike[str] | None = None
) -> str:
    """Text of a ``dossier.toml`` to be saved beside the mesh file.

    Found facts stand in comments; what only the user knows is marked TO FILL IN, and nothing physical is invented.
    With ``modes_path`` the text reads as it stands, the model is optional; without, once the material is filled in.
    """
    name = Path(mesh_path).name
    lines = [
        f"# Dossier for {_quoted(name)}. Lines marked TO FILL IN need your numbers; the rest may stay.",
        *_found_lines(mesh),
        "",
        f"title = {_quoted(Path(name).stem)}",
        'condition = ""                 # words for the pictures: "clamped root, camera 1.2 kg"',
        "",
        "[units]                        # of the numbers in this file",
        'length = "m"',
        'modulus = "GPa"',
        'density = "kg/m3"',
        "",
        *_model_lines(mesh, name, "" if modes_path is None else _beside(modes_path, Path(mesh_path).parent)),
        *_question_lines(mesh),
    ]
    return "\n".join(lines) + "\n"


def _found_lines(mesh: Mesh) -> list[str]:
    size = np.ptp(mesh.points, axis=0)
    kinds = ", ".join(f"{number} {kind}" for kind, number in _counts(mesh).items())
    return [
        f"# Found: {mesh.n_nodes} nodes; {kinds}; {size[0]:.4g} × {size[1]:.4g} × {size[2]:.4g} m as read.",
        *_group_lines("node groups", mesh.node_groups),
        *_group_lines("cell groups", mesh.cell_groups),
    ]


def _model_lines(mesh: Mesh, name: str, modes: str) -> list[str]:
    """Material and design. Where modes are given the model is optional: all of it stands in comments."""
    shells = any(KINDS[kind].dim == 2 for kind in _counts(mesh))
    optional = "# " if modes else ""
    unfilled = "# " if modes or shells else ""
    thickness = ", thickness = " if shells else ""
    group = next(iter([*mesh.node_groups, *mesh.cell_groups]), "")
    place = f"group = {_quoted(group)}" if group else _lowest_end(mesh)
    sized = f"the sheet thickness{' (alone, without material: relative energies)' if modes else ''}, and "
    return [
        "# Energies are relative only until a material is given: it brings closure and trust."
        if modes
        else "# The material.",
        f"{optional}[materials.material]           # TO FILL IN: remove the # and put your material's values",
        "# youngs_modulus = ",
        "# poisson = ",
        "# density = ",
        "",
        "[[designs]]",
        'name = "baseline"',
        f"mesh = {_quoted(name)}",
        'length_unit = "m"              # TO FILL IN: the unit of the mesh file, "mm", "m", "in"',
        f"modes = {_quoted(modes)}" if modes else 'solve = 6                      # or: modes = "FILE"',
        f"# TO FILL IN: {sized if shells else ''}one entry per group where it differs",
        f'{unfilled}assign = [{{target = "*", material = "material"{thickness}}}]',
        "# TO FILL IN where it is held; a body without supports is free and has six rigid-body modes first",
        f'# supports = [{{name = "root", {place}}}]',
        f'# masses = [{{name = "camera", {place}, mass = 1.2}}]',
        "",
    ]


def _question_lines(mesh: Mesh) -> list[str]:
    middle = ", ".join(f"{x:.6g}" for x in mesh.points.mean(axis=0))
    return [
        "# A point whose motion matters, and the direction that hurts:",
        "# [[points]]",
        '# name = "camera lens"',
        f"# near = [{middle}]",
        '# direction = "+y"',
        '# effect = "image blur"',
        "",
        "# A measured motion gives a mode its real size:",
        "# [[amplitudes]]",
        '# design = "baseline"',
        "# mode = 1",
        '# point = "camera lens"',
        "# value = 0.0002",
        '# condition = "belt drive at 12 Hz"',
    ]


def _counts(mesh: Mesh) -> dict[str, int]:
    counts: dict[str, int] = {}
    for block in mesh.blocks:
        counts[block.kind] = counts.get(block.kind, 0) + len(block)
    return counts


def _beside(path: str | os.PathLike[str], folder: Path) -> str:
    """``path`` as seen from ``folder``, with forward strokes."""
    try:
        return Path(os.path.relpath(path, folder)).as_posix()
    except ValueError:  # another drive
        return Path(path).resolve().as_posix()


def _group_lines(word: str, groups: Mapping[str, Array]) -> list[str]:
    if not groups:
        return [f"# Found no {word}."]
    shown = [f"{_quoted(name)} ({len(rows)})" for name, rows in list(groups.items())[:_SHOWN]]
    more = f" and {len(groups) - _SHOWN} more" if len(groups) > _SHOWN else ""
    return [f"# Found {word}: {', '.join(shown)}{more}"]


def _lowest_end(mesh: Mesh) -> str:
    """A box around the lowest end of the longest side, as an example of a place."""
    low, high = mesh.points.min(axis=0), mesh.points.max(axis=0)
    axis = int(np.argmax(high - low))
    high = high.copy()
    high[axis] = low[axis]
    corner = lambda p: "[" + ", ".join(f"{x:.6g}" for x in p) + "]"  # noqa: E731
    return f"box = [{corner(low)}, {corner(high)}]"


def _quoted(text: str) -> str:
    """A TOML basic string."""
    escaped = text.replace("\\", "\\\\").replace('"', '\\"')
    return '"' + "".join(c if c.isprintable() else f"\\u{ord(c):04x}" for c in escaped) + '"'
