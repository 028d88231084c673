"""Bad files end in one clear error, or are read right; nothing crashes, hangs or takes memory it was not given."""

import io
import re
import zipfile

import h5py
import numpy as np
import pytest

from tests.loaders.samples import (
    assert_same_mesh,
    assert_same_modes,
    clear,
    cube_rows,
    grid_points,
    make_mesh,
    make_modes,
    read_all,
)
from viewer.errors import LoadError
from viewer.loaders import read_mesh, read_modes, write_interchange

SUFFIXES = (".vtu", ".vtkhdf", ".npz", ".h5", ".csv")


# --- cut short, everywhere ---


@pytest.mark.parametrize("suffix", [".vtu", ".vtkhdf", ".npz", ".h5"])
@pytest.mark.parametrize("percent", [1, 10, 25, 40, 55, 70, 85, 95, 99])
def test_cut_short(tmp_path, mesh, modes, suffix, percent):
    path = write_interchange(tmp_path / f"cut{suffix}", mesh, modes)
    data = path.read_bytes()
    path.write_bytes(data[: len(data) * percent // 100])
    with pytest.raises(LoadError) as caught:
        read_all(path, mesh)
    clear(caught.value, path)


@pytest.mark.parametrize("percent", [1, 10, 30, 50, 70, 90])
@pytest.mark.parametrize("table", ["cut.csv", "cut_nodes.csv", "cut_elements.csv", "cut_frequencies.csv"])
def test_table_cut_short(tmp_path, mesh, modes, table, percent):
    path = write_interchange(tmp_path / "cut.csv", mesh, modes)
    data = (tmp_path / table).read_bytes()
    (tmp_path / table).write_bytes(data[: len(data) * percent // 100])
    try:
        found, read, _ = read_all(path, mesh)
    except LoadError as error:
        clear(error, path)
    else:  # a cut between two lines of elements leaves a smaller mesh, which nothing can tell
        assert table == "cut_elements.csv"
        assert found.n_cells < mesh.n_cells
        assert_same_modes(modes, read)


@pytest.mark.parametrize("suffix", [".vtu", ".vtkhdf", ".npz", ".h5"])
@pytest.mark.parametrize("seed", range(25))
def test_bytes_turned(tmp_path, mesh, modes, suffix, seed):
    """Random damage: an error of ours, or arrays of the right size."""
    path = write_interchange(tmp_path / f"hit{suffix}", mesh, modes)
    data, rng = bytearray(path.read_bytes()), np.random.default_rng(seed)
    for at in rng.integers(0, len(data), 3):
        data[at] ^= int(rng.integers(1, 256))
    path.write_bytes(bytes(data))
    try:
        found, _, shapes = read_all(path, mesh)
    except LoadError as error:
        clear(error, path)
    else:
        assert found.points.shape == (found.n_nodes, 3)
        assert np.isfinite(found.points).all()
        assert all(np.isfinite(shape).all() and shape.shape == (mesh.n_nodes, 3) for shape in shapes)
        assert all(b.nodes.min() >= 0 and b.nodes.max() < found.n_nodes for b in found.blocks)


# --- at the door ---


@pytest.mark.parametrize("suffix", [*SUFFIXES, ".vtk", ".msh", ".med", ".stl", ".ply"])
def test_empty_file_folder_and_none(tmp_path, mesh, suffix):
    path = tmp_path / f"x{suffix}"
    for read in (read_mesh, lambda p: read_modes(p, mesh)):
        with pytest.raises(LoadError, match="there is no such file"):
            read(path)
    path.write_bytes(b"")
    for read in (read_mesh, lambda p: read_modes(p, mesh)):
        with pytest.raises(LoadError, match="is empty"):
            read(path)
    path.unlink()
    path.mkdir()
    with pytest.raises(LoadError, match="is a folder"):
        read_mesh(path)


@pytest.mark.parametrize("claimed", [*SUFFIXES, ".vtk", ".med", ".msh"])
@pytest.mark.parametrize("real", SUFFIXES)
def test_wrong_suffix(tmp_path, mesh, modes, real, claimed):
    if real == claimed:
        pytest.skip("nothing wrong")
    path = write_interchange(tmp_path / f"a{real}", mesh, modes)
    wrong = tmp_path / "b" / f"b{claimed}"
    wrong.parent.mkdir()
    path.rename(wrong)
    with pytest.raises(LoadError) as caught:
        read_all(wrong, mesh)
    clear(caught.value, wrong, foreseen=claimed in SUFFIXES)


def test_unknown_suffix(tmp_path):
    (tmp_path / "a.qqq").write_text("x")
    with pytest.raises(LoadError, match=r"unknown format; found: \.qqq; expected: one of: .*\.vtu"):
        read_mesh(tmp_path / "a.qqq")


def test_unexpected_failures_become_ours(tmp_path, monkeypatch, mesh):
    """Even a reader that ends the process with SystemExit."""
    from viewer.loaders import npz_files

    path = write_interchange(tmp_path / "a.npz", mesh)
    for failure in (SystemExit(1), RuntimeError("odd"), MemoryError(), RecursionError(), PermissionError(13, "no")):

        def broken(*_, failure=failure):
            raise failure

        monkeypatch.setattr(npz_files, "read_mesh", broken)
        with pytest.raises(LoadError) as caught:
            read_mesh(path)
        clear(caught.value, path, foreseen=False)


# --- .vtu ---

VTU = """<?xml version="1.0"?>
<VTKFile type="UnstructuredGrid" version="0.1" byte_order="LittleEndian">
<UnstructuredGrid><FieldData><DataArray type="Float64" Name="freq_hz" NumberOfTuples="1" format="ascii">5</DataArray>
</FieldData><Piece NumberOfPoints="4" NumberOfCells="2">
<PointData><DataArray type="Float64" Name="mode_001" NumberOfComponents="3" format="ascii">
1 0 0 0 1 0 0 0 1 1 1 1</DataArray><DataArray type="Int64" Name="node_id" format="ascii">4 3 2 1</DataArray>
</PointData>
<CellData/>
<Points><DataArray type="Float64" NumberOfComponents="3" format="ascii">0 0 0 1 0 0 0 1 0 1 1 0</DataArray></Points>
<Cells><DataArray type="Int64" Name="connectivity" format="ascii">0 1 2 1 3 2</DataArray>
<DataArray type="Int64" Name="offsets" format="ascii">3 6</DataArray>
<DataArray type="UInt8" Name="types" format="ascii">5 5</DataArray></Cells>
</Piece></UnstructuredGrid></VTKFile>
"""


def test_the_hand_written_file_is_right(tmp_path):
    (tmp_path / "a.vtu").write_text(VTU)
    mesh, modes, shapes = read_all(tmp_path / "a.vtu", read_mesh(tmp_path / "a.vtu"))
    assert mesh.blocks[0].nodes.tolist() == [[0, 1, 2], [1, 3, 2]]
    assert mesh.node_ids.tolist() == [4, 3, 2, 1]
    assert modes.freq_hz.tolist() == [5]
    assert shapes[0][3].tolist() == [1, 1, 1]


BAD_VTU = {
    "index minus one": (
        "0 1 2 1 3 2",
        "0 -1 2 1 3 2",
        r"names a point that does not exist; found: index -1; expected: 0 to 3",
    ),
    "index n": ("0 1 2 1 3 2", "0 1 4 1 3 2", r"cell 1: a cell names a point that does not exist; found: index 4"),
    "index 2**40": ("0 1 2 1 3 2", f"0 1 2 1 3 {2**40}", r"cell 2: .*found: index 1099511627776"),
    "index too large for its type": ("0 1 2 1 3 2", f"0 1 2 1 3 {2**70}", r"connectivity.*no number"),
    "offsets fall": ("3 6</DataArray>", "6 3</DataArray>", r"offsets, cell 2.*do not grow; found: 3 after 6"),
    "offsets too few": (
        "3 6</DataArray>",
        "3</DataArray>",
        r"'offsets': an array's size.*found: 1 numbers; expected: 2",
    ),
    "wrong count for its type": (">5 5<", ">5 9<", r"cell 2: a cell of kind quad4 has a wrong number of nodes"),
    "types unknown": (">5 5<", ">99 99<", r"holds no cell of a known kind"),
    "claims 2e9 points": (
        'NumberOfPoints="4"',
        'NumberOfPoints="2000000000"',
        r"'Points': an array's size.*6000000000",
    ),
    "claims 2e9 cells": ('NumberOfCells="2"', 'NumberOfCells="2000000000"', r"'types': an array's size.*2000000000"),
    "one point too few": ('NumberOfPoints="4"', 'NumberOfPoints="3"', r"'Points': .*found: 12 numbers; expected: 9"),
    "points minus one": (
        'NumberOfPoints="4"',
        'NumberOfPoints="-1"',
        r"Piece: NumberOfPoints is not a number; found: '-1'",
    ),
    "not a number": (
        "0 1 0 1 1 0</DataArray></Points>",
        "0 1 0 1 nan 0</DataArray></Points>",
        r"point 4: a coordinate is not finite",
    ),
    "beyond reason": (
        "0 1 0 1 1 0</DataArray></Points>",
        "0 1 0 1 1e300 0</DataArray></Points>",
        r"point 4: a coordinate is beyond reason",
    ),
    "infinite shape": ("1 1 1</DataArray><", "1 1 inf</DataArray><", r"mode 1, row 4.*not finite"),
    "negative frequency": (">5</DataArray>", ">-5</DataArray>", r"freq_hz 1: a frequency is negative"),
    "word for a number": (
        "0 1 0 1 1 0</DataArray></Points>",
        "0 1 0 1 x 0</DataArray></Points>",
        r"'Points': .*no number",
    ),
    "decimal commas": (
        "0 1 0 1 1 0</DataArray></Points>",
        "0 1 0 1 1,5 0</DataArray></Points>",
        r"'Points': .*no number",
    ),
    "ids repeat": ("4 3 2 1", "4 3 3 1", r"node ids repeat; found: node 3 more than once"),
    "ids broken": (
        '"Int64" Name="node_id" format="ascii">4 3 2 1',
        '"Float64" Name="node_id" format="ascii">4 3 2.5 1',
        r"node ids are not whole numbers",
    ),
    "two components": (
        'Name="mode_001" NumberOfComponents="3" format="ascii">\n1 0 0 0 1 0 0 0 1 1 1 1',
        'Name="mode_001" NumberOfComponents="2" format="ascii">\n1 0 0 0 1 0 0 0',
        r"needs three components",
    ),
    "mode missing": ("mode_001", "mode_002", r"a mode shape is missing.*expected: array 'mode_001'"),
    "modes from zero": (
        "mode_001",
        "mode_000",
        r"a mode shape is missing.*expected: array 'mode_001'; modes count from 001",
    ),
    "mode number beyond reason": (
        "mode_001",
        "mode_999999999",
        r"a mode shape is missing.*expected: array 'mode_001'",
    ),
    "imaginary part missing": ("mode_001", "mode_001_re", r"do not belong together"),
    "rotations alone": ("mode_001", "mode_001_rot", r"do not belong together"),
    "no frequencies": ("freq_hz", "hertz", r"frequencies of the modes are missing"),
    "no connectivity": ("connectivity", "connections", r"Cells: array 'connectivity' is missing"),
    "no points": ("<Points>", "<Pints>", r"not a complete XML file"),
    "array twice": ('Name="offsets"', 'Name="types"', r"an array is given twice"),
    "other grid": ('type="UnstructuredGrid"', 'type="ImageData"', r"is not an unstructured grid"),
    "unknown format": (
        'Name="offsets" format="ascii"',
        'Name="offsets" format="morse"',
        r"unknown format; found: morse",
    ),
    "entity bomb": (
        '<?xml version="1.0"?>',
        '<?xml version="1.0"?><!DOCTYPE x [<!ENTITY a "aaaa"><!ENTITY b "&a;&a;&a;&a;">]>',
        r"declares a document type or entities",
    ),
    "file outside": (
        '<?xml version="1.0"?>',
        '<!DOCTYPE x SYSTEM "file:///etc/hostname">',
        r"declares a document type",
    ),
    "not XML": ("<VTKFile", "VTKFile", r"not a complete XML file"),
    "no piece": ('<Piece NumberOfPoints="4" NumberOfCells="2">', "", r"not a complete XML file"),
    "bad header type": ('byte_order="LittleEndian"', 'header_type="UInt16"', r"unknown header_type; found: UInt16"),
    "bad base64": ('format="ascii">3 6<', 'format="binary">@@@@<', r"base64 text is damaged"),
    "short base64": ('format="ascii">3 6<', 'format="binary">AAAA<', r"'offsets': an array's size"),
    "nothing appended": (
        'Name="offsets" format="ascii">3 6<',
        'Name="offsets" format="appended" offset="0"><',
        r"base64|ends before an array|size does not fit",
    ),
    "groups too long": (
        "<CellData/>",
        '<CellData><DataArray type="Int8" Name="group_a" format="ascii">1 0 1</DataArray></CellData>',
        r"'group_a': .*found: 3 numbers; expected: 2",
    ),
    "deep nesting": ("<CellData/>", "<a>" * 50 + "</a>" * 50, r"nested too deeply"),
}


@pytest.mark.parametrize("case", BAD_VTU)
def test_bad_vtu(tmp_path, case):
    old, new, message = BAD_VTU[case]
    assert old in VTU
    good = tmp_path / "good.vtu"
    good.write_text(VTU)
    path = tmp_path / "bad.vtu"
    path.write_text(VTU.replace(old, new, 1))
    with pytest.raises(LoadError, match=message) as caught:
        read_all(path, read_mesh(good))
    clear(caught.value, path)


def test_sizes_in_raw_data_are_checked_before_memory_is_taken(tmp_path, mesh, modes):
    """A block header that claims 2e9 bytes, and one that is a byte short."""
    path = write_interchange(tmp_path / "a.vtu", mesh, modes)
    data = path.read_bytes()
    offset = int(re.search(rb'Name="Points"[^/]*offset="(\d+)"', data)[1])
    at = data.index(b"_", data.index(b"<AppendedData")) + 1 + offset
    for claim in (2_000_000_000, 383):
        path.write_bytes(data[:at] + claim.to_bytes(8, "little") + data[at + 8 :])
        with pytest.raises(LoadError, match=rf"'Points': an array's size.*found: {claim} bytes; expected: 384 bytes"):
            read_mesh(path)


def test_compressed_bomb_in_vtu(tmp_path):
    """A zlib block of 4 GB of zeros declared in a few kilobytes is refused by its declared sizes."""
    import base64
    import zlib

    packed = zlib.compress(bytes(1000))
    count = 178_956_970  # points; × 24 bytes = 4 GB
    head = base64.b64encode(np.array([1, count * 24, 0, len(packed)], "<u4").tobytes())
    text = (
        VTU.replace('NumberOfPoints="4"', f'NumberOfPoints="{count}"')
        .replace('byte_order="LittleEndian"', 'byte_order="LittleEndian" compressor="vtkZLibDataCompressor"')
        .replace(
            'NumberOfComponents="3" format="ascii">0 0 0 1 0 0 0 1 0 1 1 0',
            f'NumberOfComponents="3" format="binary">{(head + base64.b64encode(packed)).decode()}',
        )
    )
    (tmp_path / "a.vtu").write_text(text)
    with pytest.raises(LoadError, match=r"declares more than its compressed bytes can hold"):
        read_mesh(tmp_path / "a.vtu")


# --- .npz ---


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


@pytest.mark.parametrize("suffix", [".npz", ".h5"])
@pytest.mark.parametrize("case", BAD_NPZ)
def test_bad_arrays(tmp_path, suffix, case):
    change, message = BAD_NPZ[case]

    def put(path, arrays):
        arrays = {name: values for name, values in arrays.items() if values is not None}
        if suffix == ".npz":
            np.savez(path, **arrays)
        else:
            with h5py.File(path, "w") as file:
                for name, values in arrays.items():
                    file[name] = values.astype("S") if values.dtype.kind == "U" else values
        return path

    good = put(tmp_path / f"good{suffix}", good_arrays())
    path = put(tmp_path / f"bad{suffix}", {**good_arrays(), **change})
    message = r"no plain array of numbers|" + message if suffix == ".h5" else message
    with pytest.raises(LoadError, match=message) as caught:
        read_all(path, read_mesh(good))
    clear(caught.value, path)


def test_objects_are_never_unpickled(tmp_path):
    class Trap:
        def __reduce__(self):
            return (open, (str(tmp_path / "sprung"), "w"))

    np.savez(tmp_path / "a.npz", points=grid_points(), cells_hex8=np.array([Trap()], dtype=object))
    with pytest.raises(LoadError, match="holds Python objects, which are never read"):
        read_mesh(tmp_path / "a.npz")
    assert not (tmp_path / "sprung").exists()


def test_inflation_bomb_in_npz(tmp_path):
    """300 MB of zeros in 300 kB."""
    with (
        zipfile.ZipFile(tmp_path / "a.npz", "w", zipfile.ZIP_DEFLATED) as archive,
        archive.open("points.npy", "w") as out,
    ):
        np.lib.format.write_array_header_1_0(out, {"descr": "<f8", "fortran_order": False, "shape": (12_500_000, 3)})
        for _ in range(30):
            out.write(bytes(10_000_000))
    with pytest.raises(LoadError, match="inflates to far more than numbers do"):
        read_mesh(tmp_path / "a.npz")


@pytest.mark.parametrize("claim", [(16, 4), (2_000_000_000, 3), (2**62, 3)])
def test_npz_header_that_claims_more_than_the_member_holds(tmp_path, claim):
    buffer = io.BytesIO()
    np.lib.format.write_array_header_1_0(buffer, {"descr": "<f8", "fortran_order": False, "shape": claim})
    with zipfile.ZipFile(tmp_path / "a.npz", "w") as archive:
        archive.writestr("points.npy", buffer.getvalue() + grid_points().tobytes())
    with pytest.raises(LoadError, match="an array's size does not fit its header"):
        read_mesh(tmp_path / "a.npz")


def test_hdf5_that_declares_without_storing(tmp_path):
    """Chunked storage never written reads as zeros without end: 7 GB declared in a few kilobytes."""
    with h5py.File(tmp_path / "a.h5", "w") as file:
        file.create_dataset("points", (300_000_000, 3), "f8", chunks=(1000, 3))
        file["cells_hex8"] = cube_rows()
    with pytest.raises(LoadError, match="an array declares more than the file stores"):
        read_mesh(tmp_path / "a.h5")


def test_hdf5_links_out_of_the_file_are_not_followed(tmp_path, mesh):
    write_interchange(tmp_path / "other.h5", mesh)
    with h5py.File(tmp_path / "a.h5", "w") as file:
        file["points"] = h5py.ExternalLink(str(tmp_path / "other.h5"), "points")
        file["cells_hex8"] = cube_rows()
    with pytest.raises(LoadError, match="array 'points' is missing"):
        read_mesh(tmp_path / "a.h5")


def test_reading_writes_nothing(tmp_path):
    mesh = make_mesh()
    modes = make_modes(mesh)
    for suffix in SUFFIXES:
        write_interchange(tmp_path / f"a{suffix}", mesh, modes)
    before = sorted(p.name for p in tmp_path.iterdir())
    for suffix in SUFFIXES:
        assert_same_mesh(mesh, read_mesh(tmp_path / f"a{suffix}"))
    assert sorted(p.name for p in tmp_path.iterdir()) == before
