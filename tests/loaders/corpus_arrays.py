"""Bad ``.npz``, ``.h5`` and ``.vtkhdf`` files."""

import io
import zipfile

import h5py
import numpy as np

from tests.loaders.samples import cube_rows, grid_points, make_mesh, make_modes
from viewer.loaders import write_interchange


def good_arrays():
    return {
        "points": grid_points(),
        "cells_hex8": cube_rows(),
        "modes": np.ones((2, 16, 3)),
        "freq_hz": np.array([1.0, 2]),
    }


BAD_NPZ = {
    "no points": ({"points": None}, r"array 'points' is missing"),
    "flat points": ({"points": np.ones(48)}, r"points have a wrong shape"),
    "points of text": ({"points": np.full((16, 3), "1")}, r"points are not real numbers"),
    "complex points": ({"points": np.ones((16, 3)) + 1j}, r"points are not real numbers"),
    "no cells": ({"cells_hex8": None}, r"no cell of a known kind"),
    "unknown kind": ({"cells_hex9": np.zeros((1, 9), int)}, r"unknown kind of cell 'hex9'"),
    "cells of floats": ({"cells_hex8": cube_rows() + 0.0}, r"connectivity is not of whole numbers"),
    "wrong width": ({"cells_hex8": cube_rows()[:, :6]}, r"wrong number of nodes per cell.*expected: \(cells, 8\)"),
    "index from one": ({"cells_hex8": cube_rows() + 1}, r"cell 3: .*found: index 16; expected: 0 to 15"),
    "too few ids": ({"node_id": np.arange(5)}, r"wrong number of node ids"),
    "ids too large": ({"node_id": np.arange(16).astype(np.uint64) + 2**63}, r"node ids are not whole numbers"),
    "element ids": ({"elem_id_hex8": np.array([1, 1, 2])}, r"element ids repeat"),
    "too few element ids": ({"elem_id_hex8": np.array([1, 2])}, r"wrong number of element ids"),
    "group length": ({"node_group_a": np.ones(3)}, r"node_group_a: a group's mask has a wrong length"),
    "flat modes": ({"modes": np.ones((32, 3))}, r"mode shapes have a wrong shape"),
    "modes of integers": ({"modes": np.ones((2, 16, 3), int)}, r"mode shapes have a wrong shape"),
    "not a number": ({"modes": np.full((2, 16, 3), np.nan)}, r"mode 1, row 1.*not finite"),
    "modes on other nodes": ({"modes": np.ones((2, 9, 3))}, r"node ids|not those of this mesh"),
    "frequencies too few": (
        {"freq_hz": np.array([1.0])},
        r"freq_hz does not fit the modes; found: 1 values; expected: 2",
    ),
    "frequency not finite": (
        {"freq_hz": np.array([1.0, np.inf])},
        r"freq_hz holds a number that is not finite.*|mode 2",
    ),
    "damping too many": ({"damping": np.ones(3)}, r"damping does not fit the modes"),
    "rotations": ({"rotations": np.ones((2, 16, 2))}, r"rotations do not fit the modes"),
    "no modes": ({"modes": np.ones((0, 16, 3)), "freq_hz": np.array([])}, r"holds no mode"),
}
_FAULTS = {
    **dict.fromkeys(("points of text", "complex points", "cells of floats", "not a number"), "NUMBER"),
    "index from one": "INDEX",
    **dict.fromkeys(("too few ids", "ids too large", "element ids", "too few element ids"), "IDS"),
    **dict.fromkeys(
        (
            "flat modes",
            "modes of integers",
            "modes on other nodes",
            "frequencies too few",
            "frequency not finite",
            "damping too many",
            "rotations",
            "no modes",
        ),
        "MODES",
    ),
}


def made():
    """(name, class of fault, maker, message) of every case."""
    for suffix in (".npz", ".h5"):
        for name, (change, says) in BAD_NPZ.items():
            says = f"no plain array of numbers|{says}" if suffix == ".h5" else says
            yield f"{suffix}: {name}", _FAULTS.get(name, "SHAPE"), _changed(suffix, change), says
    for number in (-1, 16, 2**40):
        cells = cube_rows()
        cells[1, 3] = number
        yield (
            f".npz: index {number}",
            "INDEX",
            _changed(".npz", {"cells_hex8": cells}),
            rf"cell 2: .*found: index {number}",
        )
    yield ".npz: pickle", "BOMB", _pickle, "holds Python objects, which are never read"
    yield ".npz: 300 MB of zeros in 300 kB", "BOMB", _npz_bomb, "inflates to far more than numbers do"
    for claim in ((16, 4), (2_000_000_000, 3), (2**62, 3)):
        yield f".npz: header claims {claim}", "COUNT", _npz_claim(claim), "an array's size does not fit its header"
    yield ".h5: declared, never stored", "BOMB", _h5_hollow, "an array declares more than the file stores"
    yield ".h5: link to another file", "REFERENCE", _h5_link, "array 'points' is missing"
    yield ".h5: external storage", "REFERENCE", _h5_external, "is no plain array of numbers"
    yield ".h5: link in a circle", "REFERENCE", _h5_circle, "array 'points' is missing"
    yield ".exo: node set number 0", "SHAPE", _exodus_set_0, "", "equal"
    for name, (fault, change, says) in _VTKHDF.items():
        yield f".vtkhdf: {name}", fault, _hdf(change), says


def _put(path, arrays):
    path.parent.mkdir(exist_ok=True)
    arrays = {name: values for name, values in arrays.items() if values is not None}
    if path.suffix == ".npz":
        np.savez(path, **arrays)
    else:
        with h5py.File(path, "w") as file:
            for name, values in arrays.items():
                file[name] = values.astype("S") if values.dtype.kind == "U" else values
    return path


def _changed(suffix, change):
    def make(folder):
        _put(folder / "whole" / f"a{suffix}", good_arrays())
        return _put(folder / f"a{suffix}", {**good_arrays(), **change})

    return make


class _Trap:
    """Writes a file when it is unpickled; the test sees every new file."""

    def __reduce__(self):
        return (open, ("sprung", "w"))


def _pickle(folder):
    np.savez(folder / "a.npz", points=grid_points(), cells_hex8=np.array([_Trap()], dtype=object))
    return folder / "a.npz"


def _npz_bomb(folder):
    with (
        zipfile.ZipFile(folder / "a.npz", "w", zipfile.ZIP_DEFLATED) as archive,
        archive.open("points.npy", "w") as out,
    ):
        np.lib.format.write_array_header_1_0(out, {"descr": "<f8", "fortran_order": False, "shape": (12_500_000, 3)})
        for _ in range(30):
            out.write(bytes(10_000_000))
    return folder / "a.npz"


def _npz_claim(shape):
    def make(folder):
        buffer = io.BytesIO()
        np.lib.format.write_array_header_1_0(buffer, {"descr": "<f8", "fortran_order": False, "shape": shape})
        with zipfile.ZipFile(folder / "a.npz", "w") as archive:
            archive.writestr("points.npy", buffer.getvalue() + grid_points().tobytes())
        return folder / "a.npz"

    return make


def _h5_hollow(folder):
    """Chunked storage never written reads as zeros without end: 7 GB declared in a few kilobytes."""
    with h5py.File(folder / "a.h5", "w") as file:
        file.create_dataset("points", (300_000_000, 3), "f8", chunks=(1000, 3))
        file["cells_hex8"] = cube_rows()
    return folder / "a.h5"


def _h5_link(folder):
    write_interchange(folder / "other.h5", make_mesh())
    with h5py.File(folder / "a.h5", "w") as file:
        file["points"] = h5py.ExternalLink(str(folder / "other.h5"), "points")
        file["cells_hex8"] = cube_rows()
    return folder / "a.h5"


def _h5_external(folder):
    grid_points().tofile(folder / "raw")
    with h5py.File(folder / "a.h5", "w") as file:
        file.create_dataset("points", (16, 3), "f8", external=[(str(folder / "raw"), 0, 384)])
        file["cells_hex8"] = cube_rows()
    return folder / "a.h5"


def _h5_circle(folder):
    with h5py.File(folder / "a.h5", "w") as file:
        file["points"] = h5py.SoftLink("/again")
        file["again"] = h5py.SoftLink("/points")
        file["cells_hex8"] = cube_rows()
    return folder / "a.h5"


def _exodus_set_0(folder):
    """Found by fuzzing: sets count from 1, so that this one is none of them."""
    import netCDF4

    from tests.loaders.test_exodus_files import full

    (folder / "whole").mkdir()
    full(folder / "whole" / "a.exo", "NETCDF3_CLASSIC")
    with netCDF4.Dataset(full(folder / "a.exo", "NETCDF3_CLASSIC"), "a") as file:
        file.renameVariable("node_ns1", "node_ns0")
    return folder / "a.exo"


# --- .vtkhdf: one change each of a good file ---


def _hdf(change):
    def make(folder):
        mesh = make_mesh()
        (folder / "whole").mkdir()
        for path in (folder / "whole" / "a.vtkhdf", folder / "a.vtkhdf"):
            write_interchange(path, mesh, make_modes(mesh))
        with h5py.File(folder / "a.vtkhdf", "a") as file:
            change(file["VTKHDF"])
        return folder / "a.vtkhdf"

    return make


def _set(name, at, value):
    return lambda root: root[name].__setitem__(at, value)


def _new(name, values):
    def change(root):
        del root[name]
        root[name] = values

    return change


def _steps(**more):
    """Three steps on one mesh, of which something is wrong."""

    def change(root):
        steps = root.create_group("Steps")
        steps.attrs["NSteps"] = more.get("NSteps", 3)
        for name in ("PartOffsets", "PointOffsets", "CellOffsets", "ConnectivityIdOffsets"):
            steps[name] = np.zeros(3, np.int64) + more.get(name, 0)
        steps["NumberOfParts"] = np.ones(3, np.int64)
        steps["Values"] = np.array([3.5, 3.5, 9])
        steps.create_group("PointDataOffsets")["mode_001"] = np.array(more.get("offsets", [0, 0, 0]))

    return change


_VTKHDF = {
    "no group": ("SHAPE", lambda root: root.file.move("VTKHDF", "HDFVTK"), "holds no group VTKHDF; found: HDFVTK"),
    "version 9": ("MEANING", lambda root: root.attrs.__setitem__("Version", [9, 0]), r"unknown version"),
    "no version": ("SHAPE", lambda root: root.attrs.__delitem__("Version"), r"unknown version"),
    "image": (
        "MEANING",
        lambda root: root.attrs.__setitem__("Type", b"ImageData"),
        r"not read here; found: ImageData",
    ),
    "index -1": ("INDEX", _set("Connectivity", 3, -1), r"Connectivity, row 4: a cell names .*found: index -1"),
    "index n": ("INDEX", _set("Connectivity", 3, 16), r"found: index 16"),
    "index 2**40": ("INDEX", _set("Connectivity", 3, 2**40), r"found: index 1099511627776"),
    "offsets fall": ("SHAPE", _set("Offsets", 1, 17), r"cell offsets do not grow"),
    "offsets from one": ("SHAPE", _set("Offsets", 0, 1), r"offsets of a piece do not fit; |do not fit its conn"),
    "2e9 points": (
        "COUNT",
        _set("NumberOfPoints", 0, 2_000_000_000),
        r"wrong length; found: 16 rows; expected: at l",
    ),
    "-1 points": ("COUNT", _set("NumberOfPoints", 0, -1), r"counts are not whole numbers from 0"),
    "2e9 cells": ("COUNT", _set("NumberOfCells", 0, 2_000_000_000), r"has a wrong length"),
    "one point too few": ("INDEX", _set("NumberOfPoints", 0, 15), r"index 15; expected: 0 to one less"),
    "no piece": (
        "COUNT",
        _new("NumberOfPoints", np.zeros(0, np.int64)),
        r"holds no piece",
    ),
    "counts of floats": ("SHAPE", _new("NumberOfCells", [4.0]), r"counts are not whole numbers"),
    "types of text": ("SHAPE", _new("Types", np.array([b"a"] * 4)), r"is no plain array of numbers"),
    "types unknown": ("SHAPE", _new("Types", np.full(4, 99, np.uint8)), r"holds no cell of a known kind"),
    "not a number": ("NUMBER", _set("Points", (2, 1), np.nan), r"point 3: a coordinate is not finite"),
    "infinite shape": ("NUMBER", _set("PointData/mode_002", (2, 1), np.inf), r"mode 2, row 3: .*not finite"),
    "ids repeat": ("IDS", _set("PointData/node_id", 0, 3), r"node ids repeat; found: node 3"),
    "mode missing": ("MODES", lambda root: root["PointData"].__delitem__("mode_002"), r"a mode shape is missing"),
    "frequency of nothing": ("MODES", _new("FieldData/freq_hz", [1.0]), r"freq_hz does not fit the modes"),
    "points elsewhere": (
        "REFERENCE",
        lambda root: (root.__delitem__("Points"), root.__setitem__("Points", h5py.ExternalLink("other.h5", "/p"))),
        r"has no points with three coordinates",
    ),
    "no step": ("MODES", _steps(NSteps=0), r"the number of steps is wrong; found: 0"),
    "-5 steps": ("COUNT", _steps(NSteps=-5), r"the number of steps is wrong; found: -5"),
    "2e9 steps": ("COUNT", _steps(NSteps=2_000_000_000), r"the steps' table is too short; found: 3"),
    "step beyond the pieces": ("INDEX", _steps(PartOffsets=7), r"names pieces that do not exist; found: 1 from 7"),
    "step beyond the points": (
        "INDEX",
        _steps(PointOffsets=7),
        r"wrong length; found: 16 rows; expected: at least 23",
    ),
    "step beyond its array": ("INDEX", _steps(offsets=[0, 0, 5]), r"no vector array|wrong length; found: 16 rows"),
}
