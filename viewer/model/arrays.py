"""Arrays of frozen types: copied in, read-only out."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, DTypeLike, NDArray

Array = NDArray[Any]


def frozen(
    values: ArrayLike, dtype: DTypeLike | None = None, *, shape: tuple[int | None, ...] | None = None
) -> Array:
    """A read-only, contiguous copy of ``values``; ``shape`` (None = any length) is asserted.

    An array that is already read-only and owns its data is passed through, so that copies are made once.
    """
    source = np.asarray(values)
    wanted = np.dtype(dtype) if dtype is not None else source.dtype
    if source.dtype == wanted and not source.flags.writeable and source.flags.owndata and source.flags.c_contiguous:
        array = source
    else:
        array = np.array(source, dtype=wanted, order="C", copy=True)
        array.flags.writeable = False
    if shape is not None and (
        array.ndim != len(shape) or any(w is not None and w != g for w, g in zip(shape, array.shape, strict=True))
    ):
        raise ValueError(f"array of shape {array.shape}, expected {shape}")
    return array


class FrozenMap(Mapping[Any, Any]):
    """A read-only mapping that, unlike the standard library's proxy, can be pickled."""

    __slots__ = ("_items",)

    def __init__(self, items: Mapping[Any, Any]) -> None:
        self._items = dict(items)

    def __getitem__(self, key: Any) -> Any:
        return self._items[key]

    def __iter__(self) -> Iterator[Any]:
        return iter(self._items)

    def __len__(self) -> int:
        return len(self._items)

    def __repr__(self) -> str:
        return f"FrozenMap({self._items!r})"


def frozen_map(values: Mapping[Any, Any], dtype: DTypeLike | None = None) -> FrozenMap:
    """A read-only copy of a mapping; with ``dtype`` its values are frozen arrays."""
    if dtype is None:
        return FrozenMap(values)
    return FrozenMap({key: frozen(value, dtype) for key, value in values.items()})
