"""Malformed hammer tests: one error that names the file and the line, what stands there and what should."""

import numpy as np
import pytest

from tests.loaders import universal_samples as sample
from tests.loaders.test_hammer_tests import FREQUENCIES, POINTS, SHAPES, tables
from viewer.errors import LoadError
from viewer.loaders import read_test

LINES = "from,to\n1,2\n"
TWO = "mode,point,direction,value\n1,1,+X,1\n1,2,+X,2\n2,1,+X,3\n2,2,+X,4\n"
TWO_HZ = "mode,freq_hz\n1,5\n2,6\n"
COMPLEX = "mode,point,direction,re,im\n1,1,+X,1,{}\n1,2,+X,2,3\n"

# what is wrong: (tables that differ from the good ones, the table to be named, its line, words of the message)
BAD_TABLES = {
    "points missing": ({"points": None}, "points", None, ["there is no such file"]),
    "shapes missing": ({"shapes": None}, "shapes", None, ["there is no such table"]),
    "frequencies missing": ({"frequencies": None}, "frequencies", None, ["there is no such table"]),
    "points empty": ({"points": ""}, "points", None, ["is empty"]),
    "shapes empty": ({"shapes": "\n\n"}, "shapes", None, ["is empty"]),
    "shapes without rows": ({"shapes": "mode,point,direction,value\n"}, "shapes", 1, ["holds no mode"]),
    "points without rows": ({"points": "point,x,y,z\n"}, "points", 1, ["holds no point"]),
    "not text": ({"points": "point,x,y,z\n1,0,0,0\0\n"}, "points", 2, ["is not a text file"]),
    "no column": ({"points": "point,x,y\n1,0,0\n"}, "points", 1, ["column 'z' is missing", "point, x, y"]),
    "column twice": ({"points": "point,x,y,z,x\n1,0,0,0,0\n"}, "points", 1, ["two columns are called 'x'"]),
    "too few fields": ({"points": POINTS + "3,1,1\n"}, "points", 4, ["wrong number of fields", "found: 3"]),
    "decimal commas parted by commas": ({"points": "point,x,y,z\n1,0,5,0,5,0,5\n"}, "points", 2, ["semicolons"]),
    "decimal marks mixed": (
        {"points": "point;x;y;z\n1;0,5;0;0\n2;0.5;0;0\n"},
        "points",
        2,
        ["are mixed", "a point in line 3"],
    ),
    "thousands": ({"points": "point;x;y;z\n1;1.000,5;0;0\n"}, "points", 2, ["marks between thousands"]),
    "word for a number": ({"points": POINTS + "3,a,0,0\n"}, "points", 4, ["column 'x' holds no number", "'a'"]),
    "coordinate NaN": ({"points": POINTS + "3,0,nan,0\n"}, "points", 4, ["a coordinate is not finite", "y = nan"]),
    "coordinate infinite": ({"points": POINTS + "3,0,0,-inf\n"}, "points", 4, ["is not finite", "z = -inf"]),
    "coordinate huge": ({"points": POINTS + "3,1e300,0,0\n"}, "points", 4, ["beyond reason", "x = 1e300"]),
    "label missing": ({"points": POINTS + ",1,1,1\n"}, "points", 4, ["a point has no label"]),
    "label twice": ({"points": POINTS + "2,1,1,1\n"}, "points", 4, ["point 2 is given twice", "also in line 3"]),
    "axes in two ways": (
        {"points": "point,x,y,z,turn_x,x_axis_x\n1,0,0,0,0,1\n"},
        "points",
        1,
        ["given in two ways", "turn_x and x_axis_x"],
    ),
    "a turn missing": ({"points": "point,x,y,z,turn_z,turn_y\n1,0,0,0,0,1\n"}, "points", 1, ["'turn_x' is missing"]),
    "axes askew": (
        {"points": "point,x,y,z,x_axis_x,x_axis_y,x_axis_z,y_axis_x,y_axis_y,y_axis_z\n1,0,0,0,1,0,0,1,0,0\n"},
        "points",
        2,
        ["not of unit length and at right angles", "(1.0, 0.0, 0.0) and (1.0, 0.0, 0.0)"],
    ),
    "line to no point": ({"lines": LINES + "1,9\n"}, "lines", 3, ["there is no point '9'", "1, 2"]),
    "line to itself": ({"lines": LINES + "2,2\n"}, "lines", 3, ["joins a point with itself", "point 2"]),
    "line without end": ({"lines": "from\n1\n"}, "lines", 1, ["column 'to' is missing"]),
    "shape at no point": ({"shapes": SHAPES + "1,tip,+X,1\n"}, "shapes", 5, ["there is no point 'tip'"]),
    "no direction": ({"shapes": SHAPES + "1,2,up,1\n"}, "shapes", 5, ["is no direction", "'up'", "+X, -Z, y"]),
    "two signs": ({"shapes": SHAPES + "1,2,+-X,1\n"}, "shapes", 5, ["is no direction", "'+-X'"]),
    "directions in two ways": (
        {"shapes": "mode,point,direction,dx,dy,dz,value\n1,1,+X,1,0,0,1\n"},
        "shapes",
        1,
        ["directions are given in two"],
    ),
    "component missing": ({"shapes": "mode,point,dx,dy,value\n1,1,1,0,1\n"}, "shapes", 1, ["column 'dz' is missing"]),
    "direction without length": (
        {"shapes": "mode,point,dx,dy,dz,value\n1,1,1,0,0,1\n1,2,0,0,0,1\n"},
        "shapes",
        3,
        ["a direction has no length"],
    ),
    "direction too long": (
        {"shapes": "mode,point,dx,dy,dz,value\n1,1,1,1,0,1\n"},
        "shapes",
        2,
        ["not of unit length", "length 1.414"],
    ),
    "direction NaN": (
        {"shapes": "mode,point,dx,dy,dz,value\n1,1,nan,1,0,1\n"},
        "shapes",
        2,
        ["a direction is not finite", "dx = nan"],
    ),
    "channel twice": ({"shapes": SHAPES + "1,1,X,7\n"}, "shapes", 5, ["twice in mode 1", "+X", "also in line 2"]),
    "channel twice, turned": ({"shapes": SHAPES + "1,1,-X,7\n"}, "shapes", 5, ["twice in mode 1", "also in line 2"]),
    "channel lacks a mode": (
        {"shapes": TWO.replace("2,2,+X,4\n", ""), "frequencies": TWO_HZ},
        "shapes",
        3,
        ["a channel has no value in mode 2", "point 2, +X"],
    ),
    "channel of one mode only": (
        {"shapes": TWO + "2,2,+Z,4\n", "frequencies": TWO_HZ},
        "shapes",
        6,
        ["no value in mode 1", "point 2, +Z"],
    ),
    "modes not counted from 1": (
        {"shapes": SHAPES.replace("\n1,", "\n2,")},
        "shapes",
        2,
        ["numbered 1, 2, 3", "mode 2"],
    ),
    "mode no whole number": ({"shapes": SHAPES + "1.5,2,+Z,1\n"}, "shapes", 5, ["no whole number", "'1.5'"]),
    "still mode": (
        {"shapes": TWO.replace("3\n", "0\n").replace("4\n", "0\n"), "frequencies": TWO_HZ},
        "shapes",
        4,
        ["mode 2 does not move at all"],
    ),
    "value missing": ({"shapes": "mode,point,direction\n1,1,+X\n"}, "shapes", 1, ["'value' is missing", "re, im"]),
    "values in two ways": (
        {"shapes": "mode,point,direction,re,phase_deg\n1,1,+X,1,0\n"},
        "shapes",
        1,
        ["given in two ways", "re and phase_deg"],
    ),
    "phase missing": (
        {"shapes": "mode,point,direction,amplitude\n1,1,x,1\n"},
        "shapes",
        1,
        ["'phase_deg' is missing"],
    ),
    "amplitude below zero": (
        {"shapes": "mode,point,direction,amplitude,phase_deg\n1,1,x,-1,0\n"},
        "shapes",
        2,
        ["below zero", "found: -1"],
    ),
    "imaginary part infinite": (
        {"shapes": COMPLEX.format("inf")},
        "shapes",
        2,
        ["a value is not finite", "im = inf"],
    ),
    "imaginary part NaN": ({"shapes": COMPLEX.format("NaN")}, "shapes", 2, ["a value is not finite", "im = NaN"]),
    "complex number in one field": ({"shapes": COMPLEX.format("2j")}, "shapes", 2, ["'im' holds no number", "'2j'"]),
    "value huge": ({"shapes": SHAPES + "1,2,+Z,1e200\n"}, "shapes", 5, ["a value is beyond reason", "at most 1e+30"]),
    "value blank": ({"shapes": SHAPES + "1,2,+Z,\n"}, "shapes", 5, ["'value' holds no number"]),
    "mode without frequency": (
        {"shapes": TWO, "frequencies": "mode,freq_hz\n1,5\n"},
        "shapes",
        4,
        ["mode 2 has no freq"],
    ),
    "frequency of no mode": ({"frequencies": FREQUENCIES + "2,9,0\n"}, "frequencies", 3, ["mode 2 has no shape"]),
    "frequency twice": ({"frequencies": FREQUENCIES + "1,9,0\n"}, "frequencies", 3, ["mode 1 is given twice"]),
    "frequency zero": ({"frequencies": "mode,freq_hz\n1,0\n"}, "frequencies", 2, ["not above zero", "found: 0"]),
    "frequency NaN": ({"frequencies": "mode,freq_hz\n1,nan\n"}, "frequencies", 2, ["a frequency is not finite"]),
    "frequency blank": ({"frequencies": "mode,freq_hz\n1,\n"}, "frequencies", 2, ["'freq_hz' holds no number"]),
    "damping in percent": (
        {"frequencies": "mode,freq_hz,damping\n1,5,1.5\n"},
        "frequencies",
        2,
        ["damping is not below 1", "one percent"],
    ),
    "damping infinite": (
        {"frequencies": "mode,freq_hz,damping\n1,5,inf\n"},
        "frequencies",
        2,
        ["damping is not finite"],
    ),
    "quotes left open": ({"points": POINTS + '"3,0,0,0\n'}, "points", 4, ["cannot be taken apart"]),
}


@pytest.mark.parametrize("case", BAD_TABLES)
def test_bad_tables(tmp_path, case):
    changes, table, line, words = BAD_TABLES[case]
    path = tables(tmp_path, **{"lines": LINES, **changes})
    _check(path, f"t_{table}.csv" + (f", line {line}:" if line else ":"), words)


def _check(path, place, words):
    with pytest.raises(LoadError) as caught:
        read_test(path, 0.001)
    text = str(caught.value)
    for word in [f"{path.parent}", place, *words]:
        assert word in text
    assert "cannot be read" not in text and "Error:" not in text and "\n" not in text


NODES = sample.nodes_15([1, 2], [[0.0, 0, 0], [1, 0, 0]])
MODE = sample.mode_55([1, 2], [[1.0, 0, 0], [2.0, 0, 0]], 5.0)
OTHER = sample.mode_55([1, 2], [[1.0, 0, 0], [-2.0, 0, 0]], 9.0, mode=2)
GOOD = NODES + MODE + OTHER


def _complex(eigenvalue=-0.3 + 30j, value=2.0 + 1j):
    return sample.complex_mode_55([1, 2], [[1.0 + 0j, 0j, 0j], [value, 0j, 0j]], eigenvalue)


BAD_UNIVERSAL = {
    "empty": ("", None, ["is empty"]),
    "no universal file": ("mode;point\n", 1, ["text stands outside of data sets"]),
    "no shapes": (NODES, None, ["holds no mode shape", "no results"]),
    "no points": (MODE, None, ["holds no nodes", "2411, 781 or 15"]),
    "cut short": (GOOD[:-20], None, ["data set 55 does not end", "cut short"]),
    "static result": (
        NODES + MODE.replace(f"{1:10d}{2:10d}{2:10d}{8:10d}", f"{1:10d}{1:10d}{2:10d}{8:10d}"),
        None,
        ["static"],
    ),
    "point twice": (sample.nodes_15([1, 2, 1], [[0.0, 0, 0]] * 3) + MODE, 5, ["node 1 is given twice", "line 3"]),
    "point twice, 2411": (
        sample.nodes_2411([1, 2, 1], [[0.0, 0, 0]] * 3) + MODE,
        7,
        ["node 1 is given twice", "also in line 3"],
    ),
    "point not finite": (GOOD.replace("1.00000E+00", "        NaN", 1), 4, ["not finite", "node 2"]),
    "point huge": (GOOD.replace("1.00000E+00", "1.0000E+200", 1), 4, ["beyond reason", "node 2"]),
    "point in unknown system": (
        sample.nodes_15([1, 2], [[0.0, 0, 0]] * 2, system=7) + MODE,
        None,
        ["node 1", "system 7"],
    ),
    "moves in unknown system": (
        sample.nodes_2411([1, 2], [[0.0, 0, 0]] * 2, moves_in=7) + MODE,
        3,
        ["moves in a coordinate", "system 7", "18 or 2420"],
    ),
    "trace line to no point": (
        NODES + sample.trace_line(1, [1, 2, 9]) + MODE,
        8,
        ["a trace line names a node", "node 9"],
    ),
    "trace line cut": (
        NODES + sample.data_set(82, sample.record("3I10", 1, 5, 1), "NONE", sample.record("8I10", 1, 2)) + MODE,
        10,
        ["ends inside a trace line", "found: 2 nodes"],
    ),
    "result at no point": (
        NODES + sample.mode_55([1, 5], [[1.0, 0, 0]] * 2, 5.0),
        18,
        ["node that does not exist", "node 5"],
    ),
    "point twice in a mode": (
        NODES + sample.mode_55([1, 1], [[1.0, 0, 0]] * 2, 5.0),
        18,
        ["two results in one mode", "line 16"],
    ),
    "point lacks a mode": (
        NODES + MODE + sample.mode_55([1], [[1.0, 0, 0]], 9.0, mode=2),
        23,
        ["no value in mode 2", "node 2 is missing"],
    ),
    "point of one mode only": (
        NODES + sample.mode_55([1], [[1.0, 0, 0]], 9.0, mode=2) + MODE,
        8,
        ["no value in mode 2", "node 2", "which mode 1"],
    ),
    "value NaN": (GOOD.replace("2.00000E+00", "        NaN", 1), 18, ["a value is not finite", "node 2"]),
    "value overflows": (GOOD.replace("2.00000E+00", "2.0000E+999", 1), 18, ["a value is not finite", "node 2"]),
    "value huge": (GOOD.replace("2.00000E+00", "2.0000E+200", 1), 18, ["a value is beyond reason", "node 2"]),
    "value too wide": (
        GOOD.replace("2.00000E+00", "***********", 1),
        19,
        ["holds no number", "did not fit its columns"],
    ),
    "complex infinity": (NODES + _complex(value=complex(1, np.inf)), 18, ["a value is not finite", "node 2"]),
    "complex NaN": (NODES + _complex(value=complex(np.nan, 1)), 18, ["a value is not finite", "node 2"]),
    "eigenvalue zero": (NODES + _complex(eigenvalue=0j), 8, ["mode 1 has no frequency", "eigenvalue in rad/s"]),
    "eigenvalue NaN": (NODES + _complex(eigenvalue=complex(np.nan, 1)), 8, ["mode 1 has no frequency"]),
    "frequency zero": (NODES + sample.mode_55([1, 2], [[1.0, 0, 0]] * 2, 0.0), 8, ["mode 1 has no frequency"]),
    "frequency below zero": (NODES + sample.mode_55([1, 2], [[1.0, 0, 0]] * 2, -4.0), 8, ["no frequency", "-4 Hz"]),
    "still mode": (NODES + sample.mode_55([1, 2], [[0.0, 0, 0]] * 2, 5.0), 8, ["mode 1 does not move at all"]),
    "word for a number": (GOOD.replace("2.00000E+00", "        two", 1), 19, ["field 1 holds no number", "'two'"]),
    "inside an entry": (GOOD.replace("\n         2\n", "\n", 1), None, ["ends inside an entry", "a multiple of 2"]),
    "unknown type of numbers": (
        GOOD.replace(f"{2:10d}{3:10d}\n", f"{9:10d}{3:10d}\n", 1),
        None,
        ["unknown type of numbers"],
    ),
    "runs not to be told from modes": (
        GOOD + sample.mode_55([1, 2], [[1.0, 0, 0]] * 2, 5.1) + sample.mode_55([1, 2], [[1.0, 0, 0]] * 2, 50.0),
        None,
        ["do not tell modes from runs", "number the modes"],
    ),
    "runs apart": (
        NODES + sample.mode_55([1], [[1.0, 0, 0]], 5.0) + sample.mode_55([2], [[1.0, 0, 0]], 5.0),
        None,
        ["run 2 has no channel in common", "reference point"],
    ),
    "units differ": (sample.units(1.0) + sample.units(1000.0) + GOOD, None, ["stated twice and differ"]),
    "unit of zero": (sample.units(0.0) + GOOD, None, ["factor of units is not above zero"]),
    "unit other than declared": (
        sample.units(1.0) + GOOD,
        None,
        ["stated twice and differs", "leave length_unit out"],
    ),
}


def test_the_good_file_is_good(tmp_path):
    path = tmp_path / "t.unv"
    path.write_text(GOOD)
    assert read_test(path, 0.001).shapes.tolist() == [[1, 2], [1, -2]]


@pytest.mark.parametrize("case", BAD_UNIVERSAL)
def test_bad_universal_files(tmp_path, case):
    text, line, words = BAD_UNIVERSAL[case]
    path = tmp_path / "t.unv"
    path.write_text(text)
    _check(path, f"t.unv, line {line} (data set" if line and line > 1 else "t.unv", words)


def test_other_files(tmp_path):
    (tmp_path / "t.txt").write_text("a")
    (tmp_path / "t.unv").mkdir()
    for name, words in {
        "t.txt": ["unknown format of a test", ".csv, .unv, .uff"],
        "t.unv": ["is a folder"],
        "u.unv": ["there is no such file"],
        "u.csv": ["there is no such file"],
    }.items():
        _check(tmp_path / name, name, words)
