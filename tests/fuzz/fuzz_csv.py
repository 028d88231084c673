"""``.csv`` tables: the four of one mesh in one input, parted by a separator. See :mod:`harness`."""

import tempfile
from pathlib import Path

from harness import fuzz, instrumented, read_all, small_mesh, small_modes

_TABLES = ("input.csv", "input_nodes.csv", "input_elements.csv", "input_frequencies.csv")
_MARK = b"\x1e"


def write(place, data):
    for name, part in zip(_TABLES, data.split(_MARK), strict=False):
        (place / name).write_bytes(part)
    return place / _TABLES[0]


def seeds(folder):
    from viewer.loaders import write_interchange

    for modes in (None, small_modes(), small_modes(True)):
        write_interchange(folder / _TABLES[0], small_mesh(), modes)
        parts = [(folder / name).read_bytes() if (folder / name).exists() else b"" for name in _TABLES]
        yield _MARK.join(parts)
        yield _MARK.join(parts).replace(b",", b";").replace(b".", b",")


if __name__ == "__main__":
    instrumented()
    with tempfile.TemporaryDirectory() as folder:
        start = list(seeds(Path(folder)))
    fuzz(read_all, write, start)
