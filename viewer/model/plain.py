"""Findings as plain numbers and words, for JSON."""

from __future__ import annotations

import math
from collections.abc import Mapping
from pathlib import PurePath
from typing import Any


def plain(value: Any) -> Any:
    """``value`` with arrays as lists, paths as text, NaN and infinity as None (JSON has no word for them)."""
    if isinstance(value, Mapping):
        return {str(key): plain(item) for key, item in value.items()}
    if isinstance(value, list | tuple):
        return [plain(item) for item in value]
    if hasattr(value, "tolist"):
        return plain(value.tolist())
    if isinstance(value, float):
        return value if math.isfinite(value) else None
    return str(value) if isinstance(value, PurePath) else value
