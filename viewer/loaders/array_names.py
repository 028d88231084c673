"""Names of arrays in the interchange files: ASCII, never empty, without characters that XML or HDF5 would mangle."""

from __future__ import annotations

import re
from urllib.parse import quote, unquote

import numpy as np

from viewer.model.arrays import Array

GROUP = "group_"
_ENERGY = re.compile(r"strain_energy_(\d{3}|[1-9]\d{3,8})")
_MODE = re.compile(r"mode_(\d{3}|[1-9]\d{3,8})(_rot)?(_re|_im)?")


def group_array(name: str) -> str:
    """Array name of a group: ``group_`` and the name, everything but plain ASCII letters percent-encoded."""
    return GROUP + quote(name, safe=" ()+,-:=@_~")


def group_name(array: str) -> str:
    """The group that an array name stands for, "" when it is none."""
    return unquote(array[len(GROUP) :]) if array.startswith(GROUP) else ""


def mode_array(index: int, turned: bool = False, part: str = "") -> str:
    """``mode_001``, ``mode_001_rot``, ``mode_001_re`` … for mode ``index`` counted from 0."""
    return f"mode_{index + 1:03d}{'_rot' if turned else ''}{part}"


def parse_mode_array(name: str) -> tuple[int, bool, str] | None:
    """Index from 0, whether rotations, part ("", "_re", "_im"); None when the name is none of ours."""
    match = _MODE.fullmatch(name)
    return None if match is None else (int(match[1]) - 1, bool(match[2]), match[3] or "")


def energy_array(index: int) -> str:
    """``strain_energy_001`` …: strain energy by cell of mode ``index`` counted from 0."""
    return f"strain_energy_{index + 1:03d}"


def parse_energy_array(name: str) -> int | None:
    """Index from 0 of a name from :func:`energy_array`; None when it is none."""
    match = _ENERGY.fullmatch(name)
    return int(match[1]) - 1 if match else None


def mask(rows: Array, count: int) -> Array:
    """(count,) uint8 mask of a group's rows."""
    values = np.zeros(count, np.uint8)
    values[rows] = 1
    return values
