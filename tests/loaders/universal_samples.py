"""Universal files by Fortran's own rules: records from formats such as ``4I10,1P3E13.5``, data sets from records."""

from __future__ import annotations

import re


def record(formats: str, *values) -> str:
    """One record: ``I10``, ``E13.5``, ``D25.16``, ``A20``, with counts before them."""
    out, rest = "", list(values)
    for count, kind, width, digits in re.findall(r"(?:1P)?(\d*)([IEDA])(\d+)(?:\.(\d+))?", formats):
        for _ in range(int(count or 1)):
            if not rest:
                return out
            value = rest.pop(0)
            if kind == "I":
                text = f"{value:{width}d}"
            elif kind == "A":
                text = f"{value:<{width}}"
            else:
                text = f"{value:{width}.{digits}E}".replace("E", kind)
            out += text if len(text) <= int(width) else "*" * int(width)
    assert not rest, "more values than the format has fields"
    return out


def data_set(number: int, *records: str) -> str:
    return "\n".join([f"{-1:6d}", f"{number:6d}", *records, f"{-1:6d}"]) + "\n"


def in_lines(formats: str, per_line: int, values) -> list[str]:
    values = list(values)
    return [record(formats, *values[i : i + per_line]) for i in range(0, len(values), per_line)] or [""]


def nodes_2411(labels, points, moves_in=1) -> str:
    lines = []
    for label, point in zip(labels, points, strict=True):
        lines += [record("4I10", label, 1, moves_in, 11), record("1P3D25.16", *point)]
    return data_set(2411, *lines)


def nodes_15(labels, points, system=0) -> str:
    return data_set(15, *(record("4I10,1P3E13.5", n, system, 0, 11, *p) for n, p in zip(labels, points, strict=True)))


def elements_2412(*elements, beam=(0, 1, 1)) -> str:
    """``elements``: (label, descriptor, nodes); three lines for beams."""
    lines = []
    for label, descriptor, nodes in elements:
        lines.append(record("6I10", label, descriptor, 1, 1, 7, len(nodes)))
        if descriptor in (21, 22, 23, 24):
            lines.append(record("3I10", *beam))
        lines += in_lines("8I10", 8, nodes)
    return data_set(2412, *lines)


def trace_line(number, nodes, name="NONE") -> str:
    return data_set(82, record("3I10", number, len(nodes), 1), name, *in_lines("8I10", 8, nodes))


def units(length=1.0, force=1.0, code=1, words="SI: Meter (newton)") -> str:
    return data_set(
        164, record("I10,A20,I10", code, words, 2), record("3D25.17", length, force, 1.0), record("D25.17", 273.15)
    )


TITLES = ("NONE",) * 5


def mode_55(labels, values, freq, *, mode=1, mass=0.0, viscous=0.0, hysteretic=0.0, quantity=8) -> str:
    head = record("6I10", 1, 2, 2 if len(values[0]) == 3 else 3, quantity, 2, len(values[0]))
    lines = [*TITLES, head, record("8I10", 2, 4, 1, mode), record("6E13.5", freq, mass, viscous, hysteretic)]
    for label, row in zip(labels, values, strict=True):
        lines += [record("I10", label), *in_lines("6E13.5", 6, row)]
    return data_set(55, *lines)


def complex_mode_55(labels, values, eigenvalue, *, mode=1) -> str:
    head = record("6I10", 1, 3, 2 if len(values[0]) == 3 else 3, 8, 5, len(values[0]))
    lines = [*TITLES, head, record("8I10", 2, 6, 1, mode)]
    lines.append(record("6E13.5", eigenvalue.real, eigenvalue.imag, 0.0, 0.0, 0.0, 0.0))
    for label, row in zip(labels, values, strict=True):
        pairs = [part for value in row for part in (value.real, value.imag)]
        lines += [record("I10", label), *in_lines("6E13.5", 6, pairs)]
    return data_set(55, *lines)


def analysis_2414(location, labels, values, freq, *, mode=1, quantity=8, analysis=2, mass=0.0, damping=0.0, real=()):
    """Data at nodes (location 1) or on elements (2)."""
    count, is_complex = len(values[0]), any(isinstance(v, complex) for v in values[0])
    lines = [record("I10", mode), "RESULTS", record("I10", location), *TITLES]
    lines.append(record("6I10", 1, analysis, {1: 1, 3: 2, 6: 3}[count], quantity, 5 if is_complex else 2, count))
    lines += [record("8I10", 0, 0, 0, 0, 1, mode, 0, 0), record("8I10", 0, 0)]
    lines.append(record("6E13.5", 0.0, freq, 0.0, mass, damping, 0.0))
    lines.append(record("6E13.5", *(real or (0.0,) * 6)))
    for label, row in zip(labels, values, strict=True):
        parts = [part for value in row for part in ((value.real, value.imag) if is_complex else (value,))]
        head = record("I10", label) if location == 1 else record("2I10", label, count)
        lines += [head, *in_lines("6E13.5", 6, parts)]
    return data_set(2414, *lines)
