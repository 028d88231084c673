"""VTK's own reader and writer of the format, each run in a process of its own.

VTK and netCDF4 each bring a netCDF library under the same names; together in one process they sometimes crash.
``python vtk_exodus.py write GRID.vtu FILE`` or ``… read FILE ANSWER.npz`` (first cell: VTK type and its points).
"""

import subprocess
import sys

import numpy as np


def apart(*arguments) -> None:
    """Run this file with ``arguments``; a failure there is one here."""
    subprocess.run([sys.executable, __file__, *map(str, arguments)], check=True, timeout=120)


def write(source: str, target: str) -> None:
    from vtkmodules.vtkIOExodus import vtkExodusIIWriter
    from vtkmodules.vtkIOXML import vtkXMLUnstructuredGridReader

    reader = vtkXMLUnstructuredGridReader()
    reader.SetFileName(source)
    reader.Update()
    writer = vtkExodusIIWriter()
    writer.SetInputData(reader.GetOutput())
    writer.SetFileName(target)
    writer.Write()


def read(source: str, target: str) -> None:
    from vtkmodules.util.numpy_support import vtk_to_numpy
    from vtkmodules.vtkIOExodus import vtkExodusIIReader

    reader = vtkExodusIIReader()
    reader.SetFileName(source)
    reader.Update()
    blocks = reader.GetOutput().GetBlock(0)
    grid = blocks.GetBlock(0)
    ids = grid.GetCell(0).GetPointIds()
    rows = [ids.GetId(i) for i in range(ids.GetNumberOfIds())]
    np.savez(
        target,
        counts=[blocks.GetNumberOfBlocks(), grid.GetNumberOfCells()],
        kind=grid.GetCell(0).GetCellType(),
        points=vtk_to_numpy(grid.GetPoints().GetData())[rows],
    )


if __name__ == "__main__":
    {"write": write, "read": read}[sys.argv[1]](*sys.argv[2:])
