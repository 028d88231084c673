"""What a reader in the worker process hands over."""

from __future__ import annotations

from typing import Any

import numpy as np


class Arrays:
    """Named arrays by section, as in a ``.vtu`` file."""

    def __init__(self) -> None:
        self.values: dict[tuple[str, str], np.ndarray] = {}
        self.notes: list[str] = []

    def put(self, section: str, name: str, values: Any) -> None:
        array = np.asarray(values)
        if array.dtype.kind in "fiub":
            array = array.astype(np.uint8) if array.dtype.kind == "b" else array
            self.values[section, name] = array.astype(array.dtype.newbyteorder("="))
