"""Hingelight explains vibration mode shapes: see ``viewer.open_dossier`` and README.md.

This public face is lazy: nothing heavy is imported before it is used.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING

__version__ = "0.1.0"

_WHERE = {
    "HingelightError": "viewer.errors",
    "open_dossier": "viewer.script",
    "read_mesh": "viewer.script",
    "read_modes": "viewer.script",
    "read_test": "viewer.script",
    "register": "viewer.insight.register",
    "correlate": "viewer.script",
    "solve": "viewer.script",
    "energies": "viewer.script",
    "animate": "viewer.script",
    "still": "viewer.script",
    "Showing": "viewer.scene.showing",
    "Plane": "viewer.scene.section",
    "find_hinges": "viewer.insight.hinges",
    "describe": "viewer.insight.character",
    "gain_map": "viewer.insight.gain",
    "strut_trial": "viewer.insight.strut",
    "mac": "viewer.insight.correlate",
    "pair": "viewer.script",
    "Strut": "viewer.model.design",
    "Material": "viewer.model.design",
    "Assignment": "viewer.model.design",
    "Selector": "viewer.model.design",
    "Support": "viewer.model.design",
    "Spring": "viewer.model.design",
    "LumpedMass": "viewer.model.design",
    "FunctionalPoint": "viewer.model.design",
    "Physics": "viewer.model.design",
    "Design": "viewer.model.design",
    "Mesh": "viewer.model.mesh",
    "CellBlock": "viewer.model.mesh",
    "ModeSet": "viewer.model.modes",
    "ArrayShapes": "viewer.model.modes",
    "TestSet": "viewer.model.testset",
    "Placement": "viewer.model.testset",
    "write_interchange": "viewer.loaders",
}

__all__ = ["__version__", *_WHERE]

if TYPE_CHECKING:
    from viewer.errors import HingelightError
    from viewer.insight.character import describe
    from viewer.insight.correlate import mac
    from viewer.insight.gain import gain_map
    from viewer.insight.hinges import find_hinges
    from viewer.insight.register import register
    from viewer.insight.strut import strut_trial
    from viewer.loaders import write_interchange
    from viewer.model.design import (
        Assignment,
        Design,
        FunctionalPoint,
        LumpedMass,
        Material,
        Physics,
        Selector,
        Spring,
        Strut,
        Support,
    )
    from viewer.model.mesh import CellBlock, Mesh
    from viewer.model.modes import ArrayShapes, ModeSet
    from viewer.model.testset import Placement, TestSet
    from viewer.scene.section import Plane
    from viewer.scene.showing import Showing
    from viewer.script import (
        animate,
        correlate,
        energies,
        open_dossier,
        pair,
        read_mesh,
        read_modes,
        read_test,
        solve,
        still,
    )


def __getattr__(name: str) -> object:
    if name not in _WHERE:
        raise AttributeError(f"module 'viewer' has no attribute '{name}'")
    return getattr(import_module(_WHERE[name]), name)


def __dir__() -> list[str]:
    return sorted(__all__)
