"""Universal files that are cut short, garbled or say impossible things: one error that names the line."""

import numpy as np
import pytest

from tests.loaders import universal_samples as sample
from tests.loaders.samples import clear, make_mesh, make_modes, read_all
from tests.loaders.test_universal_files import LABELS, QUAD, SQUARE, put
from viewer.errors import LoadError
from viewer.loaders import read_mesh, read_modes, write_interchange

NODES = sample.nodes_2411(LABELS, SQUARE)
MODE = sample.mode_55(LABELS, [[1.0, 2, 3]] * 4, 5.0)
WHOLE = NODES + QUAD + MODE

BAD = {
    "no universal file": ("hello\nworld\n", r"line 1: text stands outside of data sets; found: 'hello"),
    "blank": ("\n\n \n", r"holds no nodes"),
    "no number": ("    -1\nabc\n    -1\n", r"line 2: a data set has no number; found: 'abc"),
    "delimiter missing between": (
        WHOLE.replace("    -1\n    -1\n  2412", "    -1\n  2412"),
        r"line 12: text stands outside of data sets; found: '2412",
    ),
    "end missing": (WHOLE[: WHOLE.rindex("    -1")], r"data set 55 does not end"),
    "node cut": (
        NODES.replace(NODES.splitlines()[9] + "\n", ""),
        r"line 9 \(data set 2411\): the data set ends inside a node; found: 7",
    ),
    "word for a number": (
        WHOLE.replace("2.0000000000000000D+00", "2.0000000000000000X+00", 1),
        r"line 6 \(data set 2411\): field 1 holds no number; found: '2.0000000000000000X\+00'",
    ),
    "digit groups": (
        WHOLE.replace("2.0000000000000000D+00", "2.00000_0000000000D+00", 1),
        r"line 6 .*holds no number",
    ),
    "label too long": (
        WHOLE.replace(f"{3:10d}{1:10d}", "99999999999999999999 1 1 11;"),
        r"line 9 .*holds no whole number",
    ),
    "label zero": (
        WHOLE.replace(f"{3:10d}{1:10d}{1:10d}", f"{0:10d}{1:10d}{1:10d}"),
        r"line 9 .*label is not above zero",
    ),
    "node of no place": (NODES + sample.elements_2412((8, 91, [11, 7, 99])), r"element 8: .*found: node 99"),
    "element cut": (
        NODES + sample.data_set(2412, sample.record("6I10", 1, 115, 1, 1, 7, 8)),
        r"line 14 \(data set 2412\): the data set ends inside element 1; found: 0 lines; expected: 1",
    ),
    "two thousand million nodes": (
        NODES + sample.data_set(2412, sample.record("6I10", 1, 115, 1, 1, 7, 2000000000)),
        r"ends inside element 1",
    ),
    "no nodes on an element": (
        NODES + sample.data_set(2412, sample.record("6I10", 1, 115, 1, 1, 7, 0)),
        r"line 14 .*not above zero",
    ),
    "not finite": (WHOLE.replace("2.0000000000000000D+00", "                   NaN", 1), r"point 2: .*not finite"),
    "labels twice": (
        NODES.replace(f"{3:10d}{1:10d}", f"{7:10d}{1:10d}") + sample.elements_2412((5, 91, LABELS[:3])),
        r"node ids repeat; found: node 7",
    ),
    "units zero": (sample.units(0.0) + WHOLE, r"line 5 \(data set 164\): a factor of units is not above zero"),
    "units of a raised digit": (  # found by fuzzing
        sample.units().replace(f"{1:10d}", f"{'³':>10}", 1) + WHOLE,
        r"line 3 \(data set 164\): the code of units is no number; found: '³'",
    ),
    "units twice": (sample.units() + sample.units(1000.0) + WHOLE, r"units of length are stated twice"),
    "system on a line": (
        sample.data_set(
            18,
            sample.record("5I10", 5, 0, 0, 8, 1),
            "A",
            sample.record("6E13.5", 0, 0, 0, 1, 0, 0),
            sample.record("6E13.5", 2, 0, 0),
        )
        + WHOLE,
        r"line 3 \(data set 18\): the points of a coordinate system lie on one line",
    ),
    "system skew": (
        sample.data_set(
            2420,
            sample.record("2I10", 1),
            "P",
            sample.record("4I10", 5, 0, 8),
            "A",
            *(sample.record("3D25.16", *row) for row in ([1, 1, 0], [0, 1, 0], [0, 0, 1], [0, 0, 0])),
        )
        + WHOLE,
        r"at right angles",
    ),
    "system of no kind": (
        sample.data_set(
            18,
            sample.record("5I10", 5, 7, 0, 8, 1),
            "A",
            sample.record("6E13.5", 0, 0, 0, 1, 0, 0),
            sample.record("6E13.5", 1, 0, 1),
        )
        + WHOLE,
        r"unknown kind of coordinate system; found: 7",
    ),
    "binary beyond the end": (
        "    -1\n    58b     1     2          11     4000000000     0     0           0           0\n"
        + "x\n" * 11
        + "    -1\n",
        r"line 2: binary data set 58 does not fit the file",
    ),
    "binary without sizes": ("    -1\n    58b\n    -1\n", r"line 2: binary data set 58 does not fit the file"),
}


@pytest.mark.parametrize("case", BAD)
def test_bad_meshes(tmp_path, case):
    text, message = BAD[case]
    path = put(tmp_path, text)
    with pytest.raises(LoadError, match=message) as caught:
        read_mesh(path)
    clear(caught.value, path)


BAD_MODES = {
    "stars": (
        WHOLE.replace(sample.record("6E13.5", 1.0), "*" * 13, 1),
        r"line 28 .*field 1 holds no number; found: '\*+'.*did not fit its columns",
    ),
    "no modes": (NODES + QUAD, r"holds no mode shape; found: no results"),
    "static": (
        WHOLE.replace(f"{1:10d}{2:10d}{2:10d}{8:10d}", f"{1:10d}{1:10d}{2:10d}{8:10d}"),
        r"found: 1 × static in",
    ),
    "data cut": (
        WHOLE.replace(MODE.splitlines()[-2] + "\n", "", 1),
        r"the data set ends inside an entry; found: 7 lines",
    ),
    "type of numbers": (
        WHOLE.replace(f"{8:10d}{2:10d}{3:10d}", f"{8:10d}{9:10d}{3:10d}"),
        r"unknown type of numbers; found: 9",
    ),
    "values": (
        WHOLE.replace(f"{8:10d}{2:10d}{3:10d}", f"{8:10d}{2:10d}{999999999:10d}"),
        r"number of values is beyond reason",
    ),
    "parameters": (
        WHOLE.replace(f"{2:10d}{4:10d}{1:10d}{1:10d}", f"{99:10d}{4:10d}{1:10d}{1:10d}"),
        r"parameters are beyond",
    ),
    "negative frequency": (
        NODES + QUAD + sample.mode_55(LABELS, [[1.0, 2, 3]] * 4, -5.0),
        r"a frequency is negative",
    ),
    "twice a node": (
        NODES + QUAD + sample.mode_55([11, 7, 3, 3], [[1.0, 2, 3]] * 4, 5.0),
        r"two results in one mode",
    ),
    "infinite": (WHOLE.replace(sample.record("6E13.5", 1.0), " " * 10 + "inf", 1), r"not finite"),
}


@pytest.mark.parametrize("case", BAD_MODES)
def test_bad_modes(tmp_path, case):
    text, message = BAD_MODES[case]
    assert text != WHOLE
    path = put(tmp_path, text)
    with pytest.raises(LoadError, match=message) as caught:
        read_modes(path, read_mesh(path))
    clear(caught.value, path)


@pytest.mark.parametrize("percent", [1, 10, 25, 40, 55, 70, 85, 95, 99])
def test_cut_short(tmp_path, mesh, modes, percent):
    path = write_interchange(tmp_path / "cut.unv", mesh, modes)
    data = path.read_bytes()
    path.write_bytes(data[: len(data) * percent // 100])
    with pytest.raises(LoadError) as caught:
        read_all(path, read_mesh(path))
    clear(caught.value, path)


@pytest.mark.parametrize("seed", range(40))
def test_bytes_turned(tmp_path, seed):
    """Random damage: an error of ours, or arrays of the right size."""
    mesh = make_mesh()
    path = write_interchange(tmp_path / "hit.unv", mesh, make_modes(mesh))
    data, rng = bytearray(path.read_bytes()), np.random.default_rng(seed)
    for at in rng.integers(0, len(data), 3):
        data[at] = int(rng.integers(32, 127)) if seed % 2 else data[at] ^ int(rng.integers(1, 256))
    path.write_bytes(bytes(data))
    try:
        found, _, shapes = read_all(path, read_mesh(path))
    except LoadError as error:
        clear(error, path)
    else:
        assert np.isfinite(found.points).all()
        assert all(np.isfinite(shape).all() and shape.shape == (found.n_nodes, 3) for shape in shapes)
