"""From the text of ``dossier.toml`` to checked tables, and pydantic's words into ours."""

from __future__ import annotations

import difflib
import re
import tomllib
from collections.abc import Sequence
from pathlib import Path
from typing import Any, NoReturn

from pydantic import BaseModel, ValidationError

from viewer.errors import DossierError
from viewer.loaders import dossier_schema as schema

_LARGEST_FILE = 10_000_000


def parsed(path: Path) -> tuple[str, schema.DossierTable]:
    """The text and the checked tables."""
    try:
        if path.is_dir():
            raise DossierError("is a folder", file=path, expected="a dossier file", do="name the .toml file in it")
        if path.stat().st_size > _LARGEST_FILE:
            raise DossierError("is too large for a dossier", file=path, found=f"{path.stat().st_size} bytes")
        text = path.read_bytes().decode("utf-8-sig")
    except FileNotFoundError:
        raise DossierError("there is no such file", file=path, do="check the path") from None
    except UnicodeDecodeError as error:
        raise DossierError("is not UTF-8 text", file=path, place=f"byte {error.start}", do="save as UTF-8") from None
    except OSError as error:
        raise DossierError("cannot be opened", file=path, found=error.strerror or str(error)) from None
    return text, checked(path, text)


def checked(path: Path, text: str) -> schema.DossierTable:
    """The checked tables of a dossier's text; ``path`` is for messages."""
    try:
        data = tomllib.loads(text)
    except (tomllib.TOMLDecodeError, RecursionError) as error:
        raise DossierError("is not valid TOML", file=path, found=str(error), do="mend the line named") from None
    try:
        return schema.DossierTable.model_validate(data)
    except ValidationError as error:
        _raise_translated(path, data, error)


# --- pydantic's words into ours ---


def _raise_translated(path: Path, data: Any, error: ValidationError) -> NoReturn:
    issues = error.errors(include_url=False)
    # unknown keys first: a misspelt key explains the "missing" one beside it
    issues.sort(key=lambda issue: issue["type"] != "extra_forbidden")
    issue = issues[0]
    location = _key(issue["loc"])
    kind, context = issue["type"], issue.get("ctx", {})
    others = len({_key(other["loc"]) for other in issues}) - 1
    more = f" (and {others} more)" if others else ""
    key = str(location[-1]) if location else ""
    if kind == "extra_forbidden":
        known = list(_keys(_model_at(location[:-1])))
        close = difflib.get_close_matches(key, known, 1)
        raise DossierError(
            f"unknown key '{key}'{more}",
            file=path,
            place=_place(data, location[:-1]),
            expected=f"one of: {', '.join(known)}",
            do=f"did you mean '{close[0]}'?" if close else "remove it",
        )
    if kind == "missing":
        raise DossierError(f"'{key}' is missing{more}", file=path, place=_place(data, location[:-1]))
    if kind == "value_error":
        words, _, expected = str(context["error"]).partition("expected ")
        raise DossierError(
            (words.strip(" ,") or "is not complete") + more,
            file=path,
            place=_place(data, location),
            expected=expected,
        )
    raise DossierError(
        f"has a wrong value{more}",
        file=path,
        place=_place(data, location),
        found=short(issue["input"]),
        expected=_expectation(issue["msg"]),
    )


def _expectation(message: str) -> str:
    """pydantic's sentence as the words after "expected:"."""
    message = re.sub(r"^(Input|List|Dictionary|String) should (be |have )?", "", message)
    message = re.sub(r"( after validation)?, not \d+$", "", message)
    return message.replace("a valid ", "a ").replace("dictionary", "table").replace(" an instance of", "")


def _key(location: Sequence[int | str]) -> tuple[int | str, ...]:
    """Keys and indices of a location, without the names that pydantic adds for members of a union."""
    return tuple(part for part in location if not (isinstance(part, str) and _is_branch(part)))


def _is_branch(part: str) -> bool:
    """Names that pydantic puts into a location for a member of a union, not for a key."""
    return "[" in part or part in ("str", "float", "int", "bool") or part.startswith(("literal", "constrained"))


def _model_at(location: Sequence[int | str]) -> type[BaseModel]:
    """The table type that a location of keys and indices leads to."""
    model: Any = schema.DossierTable
    for part in location:
        if isinstance(part, int):
            continue
        if hasattr(model, "model_fields") and part in _keys(model):
            model = _inner_table(_keys(model)[part].annotation)
    return model


def _keys(model: type[BaseModel]) -> dict[str, Any]:
    """Fields by the key that stands in the file ("from" is no name in Python)."""
    return {field.alias or name: field for name, field in model.model_fields.items()}


def _inner_table(annotation: Any) -> Any:
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        return annotation
    for inner in getattr(annotation, "__args__", ()):
        found = _inner_table(inner)
        if found is not None:
            return found
    return None


def _place(data: Any, location: Sequence[int | str]) -> str:
    """``designs 2 ("modified"), assign 1, thickness``: counted from 1, named where there is a name."""
    words: list[str] = []
    for part in location:
        try:
            data = data[part]
        except (KeyError, IndexError, TypeError):
            data = None
        if isinstance(part, int) and words:
            words[-1] += f" {part + 1}"
            if isinstance(data, dict) and isinstance(data.get("name"), str):
                words[-1] += f' ("{data["name"]}")'
        else:
            words.append(str(part))
    return ", ".join(words)


def short(value: Any) -> str:
    text = repr(value)
    return text if len(text) <= 60 else text[:57] + "…"
