"""Off-screen windows that come up without noise on machines that have no screen."""

from __future__ import annotations

import pyvista as pv
from vtkmodules.vtkCommonCore import vtkLogger


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
