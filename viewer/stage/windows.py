"""Off-screen windows that come up without noise on machines that have no screen."""

from __future__ import annotations

from typing import Any

import numpy as np
import pyvista as pv
from vtkmodules.util.numpy_support import vtk_to_numpy
from vtkmodules.vtkCommonCore import vtkLogger, vtkUnsignedCharArray

from viewer.model.arrays import Array


def off_screen(width: int, height: int) -> pv.Plotter:
    """An empty off-screen plotter of ``width`` × ``height`` real pixels.

    Without a screen VTK tries X first, warns, and takes EGL by itself: only that warning is held back.
    """
    verbosity = vtkLogger.GetCurrentVerbosityCutoff()
    vtkLogger.SetStderrVerbosity(vtkLogger.VERBOSITY_ERROR)
    try:
        return pv.Plotter(off_screen=True, window_size=[width, height], lighting=None)
    finally:
        vtkLogger.SetStderrVerbosity(verbosity)


def pixels(window: Any) -> Array:
    """(h, w, 3) uint8 sRGB of what a window shows after rendering it, top row first."""
    window.Render()
    width, height = window.GetSize()
    found = vtkUnsignedCharArray()
    window.GetPixelData(0, 0, width - 1, height - 1, 0, found, 0)
    return np.array(vtk_to_numpy(found).reshape(height, width, 3)[::-1])
