"""File-safe names for what a user named freely."""

from __future__ import annotations

import re
from collections.abc import Iterable


def slugs(names: Iterable[str]) -> dict[str, str]:
    """File-safe, distinct stems for design names."""
    found: dict[str, str] = {}
    for number, name in enumerate(names, 1):
        slug = re.sub(r"[^A-Za-z0-9]+", "-", name).strip("-").lower() or f"design-{number}"
        stem = slug
        while stem in found.values():  # a numbered stem may itself be the plain one of another design
            stem, number = f"{slug}-{number}", number + 1
        found[name] = stem
    return found
