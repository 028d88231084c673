"""All parts by family group and by name."""

from __future__ import annotations

from functools import cache
from importlib import import_module

from tests.collection.parts import Part

NAMES = ("tuning", "held", "unseen", "held2", "unseen2")
GROUPS = {name: name for name in NAMES} | {"held": "held_out"}  # group → module
DEVELOPMENT = ("tuning", "held", "unseen")  # seen while the search was made
SCORED = ("held2", "unseen2")  # never looked at before the final scoring


def parts_of(group: str) -> list[Part]:
    return import_module(f"tests.collection.{GROUPS[group]}").parts()


@cache
def _by_name() -> dict[str, Part]:
    return {part.name: part for group in GROUPS for part in parts_of(group)}


def part_named(name: str) -> Part:
    """The part of that name, or "name>kind" for its twin: names go to other processes, parts hold functions."""
    first, _, kind = name.partition(">")
    return _by_name()[first].twin(kind) if kind else _by_name()[first]
