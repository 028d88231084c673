"""Every format cut short at the boundaries of its structure."""

import re
import zipfile

import h5py
import meshio
import numpy as np
import pyvista

from tests.loaders.samples import END_QUAD, cube_rows, grid_points, make_mesh, make_modes
from viewer.loaders import write_interchange

WRITTEN = (".vtu", ".vtkhdf", ".npz", ".h5", ".csv", ".unv")
SUFFIXES = (*WRITTEN, ".xdmf", ".inp", ".bdf", ".vtk", ".vtp", ".msh", ".med", ".stl", ".ply", ".obj")
_MOST = 10  # cuts a format


def write(folder, suffix):
    """A good file ``a`` of the format in ``folder``."""
    folder.mkdir(exist_ok=True)
    path, mesh = folder / f"a{suffix}", make_mesh()
    if suffix in WRITTEN:
        return write_interchange(path, mesh, make_modes(mesh))
    if suffix in (".stl", ".ply"):
        pyvista.Cube().triangulate().save(path)
    elif suffix == ".obj":
        path.write_text("v 0 0 0\nv 1 0 0\nv 1 1 0\nv 0 1 0\nf 1 2 3 4\n" + "f 1 2 3\n" * 5)
    elif suffix in (".vtk", ".vtp"):
        data = pyvista.UnstructuredGrid({12: cube_rows(), 9: END_QUAD}, grid_points())
        (data.extract_surface(algorithm=None) if suffix == ".vtp" else data).save(path)
    else:
        cells = [("hexahedron", cube_rows())] + ([] if suffix == ".inp" else [("quad", END_QUAD)])
        more = {".msh": {"file_format": "gmsh22", "binary": True}, ".xdmf": {"data_format": "XML"}}
        meshio.write(path, meshio.Mesh(grid_points(), cells), **more.get(suffix, {}))
    return path


def boundaries(path):
    """Where something ends in the file: tags, members, data sets, lines."""
    data = path.read_bytes()
    if path.suffix == ".npz":
        with zipfile.ZipFile(path) as archive:
            found = [info.header_offset for info in archive.infolist()] + [archive.start_dir]
    elif data.startswith(b"\x89HDF"):
        found = [8, 96, 2048]
        with h5py.File(path) as file:
            file.visititems(
                lambda _, item: found.append(item.id.get_offset() or 0) if isinstance(item, h5py.Dataset) else None
            )
    elif path.suffix in (".stl", ".ply"):
        found = [3, 80, 84, 84 + 50, len(data) // 2, len(data) - 50]
    else:
        end = data.find(b"<AppendedData")
        marks = re.finditer(rb"<[A-Z]" if data.lstrip().startswith(b"<") else rb"\n", data if end < 0 else data[:end])
        found = [mark.start() for mark in marks] + ([end, end + 40, (end + len(data)) // 2] if end > 0 else [])
    places = sorted({at for at in [*found, len(data) - 1] if 0 < at < len(data)})
    return [places[i] for i in sorted({round(x) for x in np.linspace(0, len(places) - 1, _MOST)})]


# Where nothing marks the end of the file, or what was cut is not missed.
_NO_END = {".inp": "part", ".obj": "part", ".xdmf": "equal", ".vtu": "equal", ".vtk": "equal", ".msh": "part"}
_NO_END |= {".med": "equal", ".vtp": "equal", ".csv": "part", ".unv": "part", ".bdf": "equal"}


def made():
    """(name, class of fault, maker, message, what else may be) of every cut."""
    for suffix in SUFFIXES:
        for number in range(5 if suffix in (".stl", ".ply") else _MOST):
            yield (
                f"{suffix} cut at boundary {number + 1}",
                "CUT",
                _cut(suffix, number),
                "",
                _NO_END.get(suffix, ""),
            )


def _cut(suffix, number):
    def make(folder):
        whole = write(folder / "whole", suffix)
        for path in whole.parent.iterdir():  # tables come in sets
            (folder / path.name).write_bytes(path.read_bytes())
        target = folder / whole.name
        places = boundaries(whole)
        target.write_bytes(whole.read_bytes()[: places[min(number, len(places) - 1)]])
        return target

    return make
