"""Cache keys: what a solution depends on, and nothing else."""

from __future__ import annotations

import hashlib
from collections.abc import Iterable, Mapping
from dataclasses import fields, is_dataclass
from functools import cache
from importlib.resources import files
from typing import Any

import numpy as np

from viewer.model.design import Design


def design_key(design: Design, *extra: object) -> str:
    """Hex digest over the mesh's bytes, the canonical physics, the solver's own source and ``extra``.

    Names, functional points, notes and mode names do not change a solution and are left out.
    """
    digest = hashlib.sha256(solver_version().encode())
    mesh = design.mesh
    for part in ("points", "blocks", "node_ids", "node_groups", "cell_groups"):
        _feed(digest, getattr(mesh, part))
    _feed(digest, design.physics)
    _feed(digest, extra)
    return digest.hexdigest()


@cache
def solver_version() -> str:
    """Digest of the sources that decide a solution, so that no stale result survives a change of the solver."""
    digest = hashlib.sha256()
    for package in ("viewer.cells", "viewer.mechanics"):
        for item in sorted(files(package).iterdir(), key=lambda entry: entry.name):
            if item.name.endswith(".py"):
                digest.update(item.name.encode() + b"\0" + item.read_bytes())
    return digest.hexdigest()


def _feed(digest: Any, value: object) -> None:
    """Feed any frozen value canonically: a type mark, a length, then the content."""
    if isinstance(value, np.ndarray):
        digest.update(f"a{value.dtype.str}{value.shape}".encode())
        digest.update(np.ascontiguousarray(value).data)
    elif is_dataclass(value) and not isinstance(value, type):
        digest.update(f"d{type(value).__name__}".encode())
        for field in fields(value):
            if field.name != "source":
                _feed(digest, getattr(value, field.name))
    elif isinstance(value, Mapping):
        digest.update(f"m{len(value)}".encode())
        for key in sorted(value, key=repr):
            _feed(digest, key)
            _feed(digest, value[key])
    elif isinstance(value, Iterable) and not isinstance(value, str | bytes):
        items = list(value)
        digest.update(f"s{len(items)}".encode())
        for item in items:
            _feed(digest, item)
    else:
        text = repr(value).encode()
        digest.update(f"v{len(text)}".encode() + text)
