"""What was decided while looking is written into an existing dossier: names of modes, corrections, placements.

Comments, order and layout stay; writing is atomic, and a text that would not read again is never written.
"""

from __future__ import annotations

import os
from collections.abc import Iterable, Sequence
from pathlib import Path
from typing import Any

import tomlkit
from tomlkit.items import AoT, Array, Table, Whitespace

from viewer.errors import DossierError
from viewer.jobs import write_text
from viewer.loaders.dossier_parse import checked, parsed
from viewer.loaders.dossier_values import LENGTHS
from viewer.model.testset import Correction, Placement


def save_mode_name(path: str | os.PathLike[str], design: str, mode: int, name: str) -> None:
    """Write the user's name for mode ``mode`` (number from 1) of ``design`` into the dossier, keeping comments,
    order and layout; an empty name removes it. Atomic. Raises ``DossierError``."""
    path = Path(path)
    text, _ = parsed(path)
    if mode < 1:
        raise DossierError("a mode number counts from 1", file=path, found=str(mode))
    document = tomlkit.parse(text)
    table = _table(path, document, "designs", "design", design)
    if "mode_names" not in table:
        if not name:
            return
        _put(table, "mode_names", tomlkit.inline_table())
    names_table = table["mode_names"]
    if name:
        names_table[str(mode)] = name
    elif str(mode) in names_table:
        del names_table[str(mode)]
    _write(path, document)


def write_test_changes(
    path: str | os.PathLike[str],
    test_name: str,
    *,
    corrections: Sequence[Correction] | None = None,
    placement: Placement | None = None,
) -> None:
    """Write what was accepted for the test ``test_name`` into the dossier: all its corrections from now on (an empty
    sequence removes them) and its placement; None leaves what is there. Raises ``DossierError``."""
    path = Path(path)
    text, tables = parsed(path)
    document = tomlkit.parse(text)
    table = _table(path, document, "tests", "test", test_name)
    length = LENGTHS[tables.units.length]
    if placement is not None:
        rotation = [[float(v) for v in row] for row in placement.rotation]
        shift = _in_unit(placement.shift, length)
        _put(table, "placement", _inline(rotation=rotation, shift=shift, scale=float(placement.scale)))
    if corrections is not None:
        _put_corrections(table, [_correction(each, length) for each in corrections])
    _write(path, document)


def _correction(item: Correction, length: float) -> dict[str, Any]:
    """What a table of ``corrections`` says, lengths in the dossier's unit."""
    words = {key: getattr(item, key) for key in ("kind", "point", "axis", "other_axis", "other")}
    given: dict[str, Any] = {key: word for key, word in words.items() if word}
    if item.position is not None:
        given["position"] = _in_unit(item.position, length)
    return given


def _in_unit(values: Iterable[float], length: float) -> list[float]:
    """Metres in the dossier's unit; 30 mm shall not read 29.999999999999996."""
    return [float(f"{value / length:.12g}") for value in values]


def _put_corrections(table: Any, wanted: list[dict[str, Any]]) -> None:
    """Entries that stay keep their text and comments where the new list only continues the old one."""
    there = table.get("corrections")
    before = [] if there is None else [dict(entry) for entry in there.unwrap()]
    if wanted == before:
        return
    if not wanted:
        del table["corrections"]
        return
    if there is None or wanted[: len(before)] != before:
        there, before = tomlkit.array().multiline(True), []
        _put(table, "corrections", there)
    for entry in wanted[len(before) :]:
        if isinstance(there, AoT):
            there.append(tomlkit.item(entry))
        else:
            assert isinstance(there, Array)
            there.append(_inline(**entry))


def _put(table: Any, key: str, value: Any) -> None:
    """A new key stands behind the last one, not behind the comments that lead to the next table."""
    if key in table or not isinstance(table, Table):
        table[key] = value
        return
    body = table.value.body
    last = max((row for row, (name, _) in enumerate(body) if name is not None), default=-1)
    leading = next((row for row in range(last + 1, len(body)) if isinstance(body[row][1], Whitespace)), len(body))
    kept = body[leading:]
    del body[leading:]
    table[key] = value
    body.extend(kept)


def _inline(**values: Any) -> Any:
    table = tomlkit.inline_table()
    table.update(values)
    return table


def _table(path: Path, document: tomlkit.TOMLDocument, tables: str, word: str, name: str) -> Any:
    """The table of the array ``tables`` that is called ``name``."""
    known: Any = document.get(tables, [])
    for table in known:
        if table["name"] == name:
            return table
    names = ", ".join(str(table["name"]) for table in known)
    raise DossierError(
        f"no {word} named '{name}'",
        file=path,
        expected=f"one of: {names}" if names else f"a {word}, none is declared",
    )


def _write(path: Path, document: tomlkit.TOMLDocument) -> None:
    text = tomlkit.dumps(document)
    checked(path, text)
    write_text(path, text)
