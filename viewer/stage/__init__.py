"""Draws pictures with VTK: in a window, or off the screen."""

from viewer.stage.stage import Stage

__all__ = ["Stage"]
