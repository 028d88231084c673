"""Writes pictures, loops, strips, tables and pages; everything lands whole or not at all.

The names below are loaded when first asked for, so that writing a table needs no VTK.
"""

from __future__ import annotations

from importlib import import_module
from typing import Any

_HOME = {
    "RenderRequest": "request",
    "image": "stills",
    "save_gif": "gif_loop",
    "save_mp4": "video",
    "save_png": "stills",
    "save_strip": "strip",
}
__all__ = ["RenderRequest", "image", "save_gif", "save_mp4", "save_png", "save_strip"]


def __getattr__(name: str) -> Any:
    if name in _HOME:
        return getattr(import_module(f"viewer.export.{_HOME[name]}"), name)
    raise AttributeError(f"module 'viewer.export' has no attribute '{name}'")
