"""Looking into a file before a library does that would crash on it, fill the memory or follow its references."""

from __future__ import annotations

import mmap
import re
from pathlib import Path

from viewer.errors import LoadError

_XML_SUFFIXES = (".xml", ".vtu", ".vtp", ".hmf")
_LEGACY_COUNT = re.compile(
    rb"(?:^|\n)(POINTS|CELLS|CELL_TYPES|POLYGONS|VERTICES|LINES|TRIANGLE_STRIPS|POINT_DATA|CELL_DATA)[ \t]+(-?\d+)"
)
_PLY_SIZES = {"char": 1, "uchar": 1, "short": 2, "ushort": 2, "int": 4, "uint": 4, "float": 4, "double": 8} | {
    "int8": 1, "uint8": 1, "int16": 2, "uint16": 2, "int32": 4, "uint32": 4, "float32": 4, "float64": 8
}  # fmt: skip
_MOST_LINKS = 100_000


def check_container(path: Path) -> None:
    """Refuses document types and entities in XML, and links out of an HDF5 file. Raises ``LoadError``."""
    with path.open("rb") as stream:
        head = stream.read(8)
        if path.suffix.lower() in _XML_SUFFIXES:
            with mmap.mmap(stream.fileno(), 0, access=mmap.ACCESS_READ) as data:
                if re.search(rb"<!(DOCTYPE|ENTITY)", data):
                    raise LoadError("declares a document type or entities", do="remove them")
    if head == b"\x89HDF\r\n\x1a\n":
        _check_links(path)


def _check_links(path: Path) -> None:
    import h5py

    count = 0

    def outside(name: str, link: object) -> tuple[str, str] | None:
        nonlocal count
        count += 1
        if count > _MOST_LINKS:
            return name, f"more than {_MOST_LINKS} entries"
        return (name, str(link.filename)) if isinstance(link, h5py.ExternalLink) else None

    try:
        with h5py.File(path, "r") as file:
            found = file.visititems_links(outside)
    except (OSError, RuntimeError, KeyError, ValueError) as error:
        raise LoadError("the file is damaged or no HDF5 file", found=str(error)[:160]) from None
    if found is not None:
        raise LoadError(
            "refers to another file" if count <= _MOST_LINKS else "holds too many entries",
            place=found[0][:80],
            found=found[1][:80],
            do="put the data into the file itself",
        )


def check_stl(path: Path) -> int:
    """Number of triangles declared by the size of the file or by its words. Raises ``LoadError``."""
    with path.open("rb") as stream, mmap.mmap(stream.fileno(), 0, access=mmap.ACCESS_READ) as data:
        count = int.from_bytes(data[80:84], "little")
        if len(data) == 84 + 50 * count:
            return count
        if not data[:512].lstrip().startswith(b"solid"):
            raise LoadError(
                "the number of triangles does not fit the file",
                found=f"{len(data)} bytes",
                expected=f"{84 + 50 * count} bytes for {count} triangles",
            )
        found = {word: len(re.findall(rb"\b%s\b" % word, data, re.I)) for word in (b"facet", b"vertex", b"endsolid")}
        # "endfacet" is one word
        if not found[b"endsolid"] or found[b"vertex"] != 3 * found[b"facet"]:
            raise LoadError(
                "is not complete",
                found=f"{found[b'facet']} facets, {found[b'vertex']} vertices",
                expected="three vertices to a facet, and endsolid",
                do="the file is cut short: write it again",
            )
        return found[b"facet"]


def check_ply(path: Path) -> dict[str, int]:
    """Elements declared by the header, if the file can hold them. Raises ``LoadError``."""
    with path.open("rb") as stream, mmap.mmap(stream.fileno(), 0, access=mmap.ACCESS_READ) as data:
        end = re.search(rb"\bend_header\r?\n", data[:65536])
        if data[:3] != b"ply" or end is None:
            raise LoadError("has no complete header", expected="ply … end_header")
        counts: dict[str, int] = {}
        smallest: dict[str, int] = {}
        binary, name = False, ""
        for row in data[: end.start()].decode("ascii", "replace").splitlines():
            words = row.split() or [""]
            if words[0] == "format" and len(words) > 1:
                binary = words[1].startswith("binary")
            elif words[0] == "element" and len(words) == 3 and re.fullmatch(r"\d{1,15}", words[2]):
                name = words[1]
                counts[name], smallest[name] = int(words[2]), 0
            elif words[0] == "property" and name and len(words) >= 3:
                kind = words[2] if words[1] == "list" else words[1]
                if kind not in _PLY_SIZES:
                    raise LoadError("its header is not understood", place=row.strip()[:60])
                smallest[name] += _PLY_SIZES[kind]
            elif words[0] in ("element", "property"):
                raise LoadError("its header is not understood", place=row.strip()[:60])
        for name, count in counts.items():
            if count * (smallest[name] if binary else 2) > len(data):
                raise LoadError("declares more than the file can hold", place=f"element {name}", found=str(count))
        needed = sum(counts[name] * smallest[name] for name in counts) if binary else 0
        rows = data[end.end() :].split() if not binary and len(data) < 100_000_000 else None
        if end.end() + needed > len(data) or (rows is not None and len(rows) < sum(counts.values())):
            raise LoadError("the file ends early", found=f"{len(data)} bytes", do="it is cut short: write it again")
        return counts


def check_legacy(path: Path) -> int | None:
    """Every declared count against the file's size; the number of points declared, if it is."""
    points = None
    with path.open("rb") as stream, mmap.mmap(stream.fileno(), 0, access=mmap.ACCESS_READ) as data:
        if not data[:256].lower().startswith(b"# vtk datafile"):
            raise LoadError("is no legacy VTK file", found=repr(data[:20]), expected="# vtk DataFile Version …")
        for match in _LEGACY_COUNT.finditer(data):
            word, count = match[1].decode(), int(match[2])
            if count < 0 or count > len(data):
                raise LoadError(
                    "declares more than the file can hold", place=word, found=str(count), expected=f"0 to {len(data)}"
                )
            if word == "POINTS" and points is None:
                points = count
    return points
