"""Tables of plain rows as CSV, JSON and text: the same figures in each, full in files, rounded for reading.

A row is a mapping from stable keys to text, numbers, booleans or None; all rows share the first one's order of
keys. The end of a key says the unit: ``frequency_hz``, ``largest_real_m``, ``strain_percent``. Files carry the keys
as they are; text turns them into words and picks a readable prefix of the metre for each column.
"""

from __future__ import annotations

import csv
import io
import json
import math
import os
import unicodedata
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from viewer.errors import ExportError
from viewer.jobs import write_text

Rows = Sequence[Mapping[str, Any]]

_UNITS = {
    "hz": "Hz", "percent": "%", "m": "m", "kg": "kg", "s": "s", "deg": "°", "j": "J", "n": "N", "nmrad": "N·m/rad",
    "hzperkg": "Hz/kg", "nperm": "N/m",
}  # fmt: skip
_PREFIXES = ((1.0, "m"), (1e-3, "mm"), (1e-6, "µm"), (1e-9, "nm"))
_IDENTITY = (
    "design", "mode", "group", "point", "hinge", "flap", "strut", "lineage", "step",
    "first_design", "first_mode", "second_design", "second_mode", "test", "test_mode", "channel", "correction",
    "placement",
)  # fmt: skip
_NOTHING = "–"
_DIGITS = 4  # significant digits of a number in text, when its key has no rule below
_DECIMALS = {"%": 1}  # decimals by unit


@dataclass(frozen=True)
class TextTable:
    """A table rounded and worded for reading. ``titles`` and ``units`` by column, ``cells`` by row and column;
    ``numeric`` columns are set flush right; the first ``identity`` columns say what a row is about."""

    titles: tuple[str, ...]
    units: tuple[str, ...]
    cells: tuple[tuple[str, ...], ...]
    numeric: tuple[bool, ...]
    identity: int


def write_table(path: str | os.PathLike[str], rows: Rows) -> Path:
    """Write ``rows`` by suffix, .csv or .json, atomically; returns the path. Raises ``ExportError``."""
    suffix = Path(path).suffix.lower()
    if suffix == ".csv":
        return write_text(path, csv_text(rows))
    if suffix == ".json":
        return write_text(path, json_text(rows))
    raise ExportError("a table is written as .csv or .json", file=path, found=suffix or "no suffix")


def csv_text(rows: Rows) -> str:
    """CSV (RFC 4180 quoting): comma, decimal point, floats in full, nothing where a figure is unknown."""
    keys = _keys(rows)
    stream = io.StringIO()
    writer = csv.writer(stream, lineterminator="\n")
    if keys:
        writer.writerow(keys)
    for row in rows:
        writer.writerow([_csv_cell(_plain(row.get(key))) for key in keys])
    return stream.getvalue()


def json_text(rows: Rows) -> str:
    """JSON: ``units`` by key where a key has one, and ``rows`` with floats in full; null where unknown."""
    keys = _keys(rows)
    units = {key: unit for key in keys if (unit := unit_of(key))}
    plain = [{key: _plain(row.get(key)) for key in keys} for row in rows]
    return json.dumps({"units": units, "rows": plain}, ensure_ascii=False, indent=1, allow_nan=False) + "\n"


def readable(rows: Rows, width: int = 118) -> str:
    """Aligned text. Columns without any figure are left out; a table wider than ``width`` is broken into several,
    each of which repeats the columns that say what a row is about."""
    table = text_table(rows)
    if not table.cells:
        return "(nothing to list)"
    widths = [
        max(_width(text) for text in (title, unit, *(row[c] for row in table.cells)))
        for c, (title, unit) in enumerate(zip(table.titles, table.units, strict=True))
    ]
    return "\n\n".join(_block(table, part, widths) for part in _parts(table.identity, widths, width))


def text_table(rows: Rows) -> TextTable:
    """The rows rounded and worded for reading: what the terminal and the page show."""
    keys = [key for key in _keys(rows) if any(_plain(row.get(key)) not in (None, "") for row in rows)]
    keys.sort(key=lambda key: key not in _IDENTITY)  # stable: what a row is about comes first
    columns, units, numeric = [], [], []
    for key in keys:
        values = [_plain(row.get(key)) for row in rows]
        texts, unit = _column(key, values)
        columns.append(texts)
        units.append(unit)
        numeric.append(all(v is None or (isinstance(v, int | float) and not isinstance(v, bool)) for v in values))
    return TextTable(
        tuple(_words(key) for key in keys),
        tuple(units),
        tuple(zip(*columns, strict=True)) if columns else (),
        tuple(numeric),
        sum(key in _IDENTITY for key in keys),
    )


def unit_of(key: str) -> str:
    """The unit that a key ends with, or empty."""
    return _UNITS.get(key.rpartition("_")[2], "") if "_" in key else ""


def _keys(rows: Rows) -> list[str]:
    return list(dict.fromkeys(key for row in rows for key in row))


def _plain(value: Any) -> Any:
    """A value that CSV and JSON know: NumPy scalars unpacked, figures that are no numbers unknown."""
    if hasattr(value, "item") and getattr(value, "ndim", 0) == 0:
        value = value.item()
    if isinstance(value, float) and not math.isfinite(value):
        return None
    if value is None or isinstance(value, str | bool | int | float):
        return value
    raise TypeError(f"a table cell holds text, a number, a truth value or None, not {type(value).__name__}")


def _csv_cell(value: Any) -> str:
    if value is None:
        return ""
    if isinstance(value, bool):
        return "true" if value else "false"
    return repr(value) if isinstance(value, float) else str(value)


def _column(key: str, values: list[Any]) -> tuple[list[str], str]:
    unit = unit_of(key)
    factor = 1.0
    if unit == "m":
        sizes = [abs(v) for v in values if isinstance(v, float) and v != 0]
        if sizes:
            factor, unit = next((p for p in _PREFIXES if max(sizes) >= p[0]), _PREFIXES[-1])
    return [_text(v if not isinstance(v, float) else v / factor, unit) for v in values], unit


def _text(value: Any, unit: str) -> str:
    if value is None or value == "":
        return _NOTHING
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, str):
        return " ".join(value.split())
    if isinstance(value, int):
        return str(value)
    if unit in _DECIMALS:
        return _fixed(value, _DECIMALS[unit])
    return rounded(value)


def _fixed(value: float, decimals: int) -> str:
    """``decimals`` places; what would print as nothing though it is something is said to be less than the last."""
    least = 0.1**decimals
    if 0 < abs(value) < least / 2:
        return f"<{least:.{decimals}f}" if value > 0 else f">-{least:.{decimals}f}"
    return f"{value:.{decimals}f}"


def rounded(value: float, digits: int = _DIGITS) -> str:
    """``digits`` significant digits, with an exponent only beyond 1e-4 … 1e7."""
    if value == 0:
        return "0"
    if not 1e-4 <= abs(value) < 1e7:
        return f"{value:.{digits - 1}e}"
    value = float(f"{value:.{digits - 1}e}")
    return f"{value:.{max(0, digits - 1 - math.floor(math.log10(abs(value))))}f}"


def _words(key: str) -> str:
    return (key.rpartition("_")[0] if unit_of(key) else key).replace("_", " ")


def _parts(identity: int, widths: list[int], width: int) -> Iterable[list[int]]:
    """Columns of each block, so that none is wider than ``width`` unless a single column is."""
    lead = list(range(identity))
    part, used = list(lead), sum(widths[c] + 2 for c in lead)
    for column in range(identity, len(widths)):
        if len(part) > len(lead) and used + widths[column] > width:
            yield part
            part, used = list(lead), sum(widths[c] + 2 for c in lead)
        part.append(column)
        used += widths[column] + 2
    yield part


def _block(table: TextTable, columns: list[int], widths: list[int]) -> str:
    head = [[table.titles[c] for c in columns]]
    if any(table.units[c] for c in columns):
        head.append([table.units[c] for c in columns])
    lines = [*head, ["─" * widths[c] for c in columns], *([row[c] for c in columns] for row in table.cells)]
    return "\n".join(
        "  ".join(_pad(text, widths[c], table.numeric[c]) for text, c in zip(line, columns, strict=True)).rstrip()
        for line in lines
    )


def _pad(text: str, width: int, right: bool) -> str:
    space = " " * (width - _width(text))
    return space + text if right else text + space


def _width(text: str) -> int:
    """Columns that a terminal gives the text."""
    return sum(0 if unicodedata.combining(c) else 2 if unicodedata.east_asian_width(c) in "WF" else 1 for c in text)
