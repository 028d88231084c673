"""Where a mode folds and what merely flaps: hinge lines, joints and flaps (DESIGN §6)."""

from viewer.insight.hinges.finding import Flap, Hinge, HingeFinding
from viewer.insight.hinges.search import find_hinges

__all__ = ["Flap", "Hinge", "HingeFinding", "find_hinges"]
