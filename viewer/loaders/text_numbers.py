"""Words of a text file as numbers."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from viewer.model.arrays import Array

# One word of endless length would make room for as much at every other one.
_LONGEST = 64


def numbers_from(words: Sequence[bytes], dtype: np.dtype) -> Array:
    """(words,) numbers of ``dtype``. Raises ``ValueError`` in words when one is none or does not fit."""
    if not words:
        return np.empty(0, dtype)
    longest = max(words, key=len)
    if len(longest) > _LONGEST:
        raise ValueError(f"a word of {len(longest)} letters")
    odd = next((word for word in words if b"_" in word), None)  # Python's own digit groups are no numbers
    if odd is not None:
        raise ValueError(f"invalid number {odd!r}")
    try:
        return np.array(words, "S").astype(np.float64 if dtype.kind == "f" else dtype).astype(dtype)
    except OverflowError as error:
        raise ValueError(str(error)) from None
