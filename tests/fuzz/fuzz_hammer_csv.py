"""Hammer tests in ``.csv`` tables: the four of one set in one input, parted by a separator. See :mod:`harness`."""

import tempfile
from pathlib import Path

from harness import fuzz, instrumented, read_hammer_test, small_tests

_TABLES = ("input_points.csv", "input_lines.csv", "input_shapes.csv", "input_frequencies.csv")
_MARK = b"\x1e"
_OTHERS = (
    (
        b"point,x,y,z,turn_z,turn_y,turn_x\n1,0,0,0,90,0,0\n2,1,0,0,0,30,5\n",
        b"from,to\n1,2\n",
        b"mode,point,dx,dy,dz,amplitude,phase_deg\n1,1,1,0,0,1,0\n1,2,0,0.6,0.8,2,180\n",
        b"mode,freq_hz\n1,5\n",
    ),
    (
        b"point;x;y;z;x_axis_x;x_axis_y;x_axis_z;y_axis_x;y_axis_y;y_axis_z\na;0,5;0;0;0;1;0;-1;0;0\n",
        b"from;to\n",
        b"mode;point;direction;value\n1;a;-X;0,25\n2;a;x;1\n",
        b"mode;freq_hz;damping\n2;5,5;\n1;6;0,01\n",
    ),
)


def write(place, data):
    for name, part in zip(_TABLES, data.split(_MARK), strict=False):
        (place / name).write_bytes(part)
    return place / "input.csv"


def seeds(folder):
    from viewer.loaders import write_test

    yield from (_MARK.join(tables) for tables in _OTHERS)
    for test in small_tests():
        write_test(folder / "input.csv", test)
        parts = [(folder / name).read_bytes() for name in _TABLES]
        yield _MARK.join(parts)
        yield _MARK.join(parts).replace(b",", b";").replace(b".", b",")


if __name__ == "__main__":
    instrumented()
    with tempfile.TemporaryDirectory() as folder:
        start = list(seeds(Path(folder)))
    fuzz(read_hammer_test, write, start)
