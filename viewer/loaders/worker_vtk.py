"""What VTK reads, in the worker process: its own files, surfaces, CGNS. Output is looked at as much as input."""

from __future__ import annotations

import re
from pathlib import Path
from typing import Any

import numpy as np

from viewer.errors import LoadError
from viewer.loaders.array_names import group_array
from viewer.loaders.deck_lines import Line, lines_of
from viewer.loaders.worker_arrays import Arrays
from viewer.loaders.worker_guards import check_container, check_legacy, check_ply, check_stl

_SURFACE = "a surface for display or test geometry: it has no thickness and no material"


def read_by_vtk(path: Path) -> Arrays:
    """Legacy .vtk files, VTK's XML files, .stl, .ply, .obj, .cgns."""
    check_container(path)
    suffix = path.suffix.lower()
    reader = {".vtk": _legacy, ".stl": _stl, ".ply": _ply, ".obj": _obj, ".cgns": _cgns}.get(suffix, _xml)
    arrays = Arrays()
    data = reader(path, arrays)
    _put_grid(arrays, data)
    return arrays


def _legacy(path: Path, arrays: Arrays) -> Any:
    from vtkmodules.vtkIOLegacy import vtkGenericDataObjectReader

    declared = check_legacy(path)
    reader = vtkGenericDataObjectReader()
    for what in ("Scalars", "Vectors", "Tensors", "Normals", "Fields", "TCoords", "ColorScalars"):
        getattr(reader, f"ReadAll{what}On")()
    data = _updated(reader, path)
    if declared is not None and data.IsA("vtkPointSet") and declared != data.GetNumberOfPoints():
        raise LoadError(
            "the number of points is not the one declared",
            found=str(data.GetNumberOfPoints()),
            expected=str(declared),
        )
    return data


def _xml(path: Path, arrays: Arrays) -> Any:
    from vtkmodules.vtkIOXML import vtkXMLPolyDataReader, vtkXMLUnstructuredGridReader

    return _updated(vtkXMLPolyDataReader() if path.suffix.lower() == ".vtp" else vtkXMLUnstructuredGridReader(), path)


def _stl(path: Path, arrays: Arrays) -> Any:
    """Corners at the same place are one point."""
    from vtkmodules.vtkIOGeometry import vtkSTLReader

    declared = check_stl(path)
    data = _updated(vtkSTLReader(), path)
    if data.GetNumberOfCells() > declared:
        raise LoadError("more triangles than declared", found=str(data.GetNumberOfCells()), expected=str(declared))
    if data.GetNumberOfCells() < declared:
        arrays.notes.append(f"{declared - data.GetNumberOfCells()} triangles without area left out")
    return _surface(data, arrays)


def _ply(path: Path, arrays: Arrays) -> Any:
    from vtkmodules.vtkIOPLY import vtkPLYReader

    declared = check_ply(path)
    data = _updated(vtkPLYReader(), path)
    for word, count in (("vertex", data.GetNumberOfPoints()), ("face", data.GetNumberOfCells())):
        if declared.get(word, 0) != count:
            raise LoadError(
                f"the number of elements '{word}' is not the one declared",
                found=str(count),
                expected=str(declared.get(word, 0)),
            )
    return _surface(data, arrays)


def _obj(path: Path, arrays: Arrays) -> Any:
    """Points and faces only, read here: VTK's reader tears faces apart where textures do. Groups ``g`` are kept."""
    import pyvista

    points: list[list[float]] = []
    faces: list[int] = []
    groups: dict[str, list[int]] = {}
    inside: list[str] = []
    count = 0
    for line in lines_of(path, lambda _: None):
        word, *given = line.text.split("#", 1)[0].split() or [""]
        if word == "v":
            points.append(_coordinates(line, given))
        elif word == "g":
            inside = [name for name in given if name != "default"]
        elif word == "f":
            corners = [_corner(line, text, len(points)) for text in given]
            if len(corners) < 3:
                raise line.error("a face has too few corners", found=str(len(corners)), expected="3 or more")
            faces += [len(corners), *corners]
            for name in inside:
                groups.setdefault(name, []).append(count)
            count += 1
        elif word in ("curv", "curv2", "surf", "deg", "bmat"):
            raise line.error("holds free-form curves or surfaces, which are not read", found=word)
    if not points or not faces:
        raise LoadError("holds no faces", expected="lines v and f")
    data = pyvista.PolyData(np.array(points, float), faces=np.array(faces))
    for name, rows in groups.items():
        members = np.zeros(count, np.uint8)
        members[rows] = 1
        data.cell_data[group_array(name)] = members
    return _surface(data, arrays)


def _coordinates(line: Line, given: list[str]) -> list[float]:
    try:
        xyz = [float(text) for text in given[:3]]
    except ValueError:
        xyz = []
    if len(xyz) != 3:
        raise line.error("is no point", found=line.text.strip()[:60], expected="v x y z with decimal points")
    return xyz


def _corner(line: Line, text: str, n_points: int) -> int:
    number = text.split("/", 1)[0]
    if not re.fullmatch(r"-?\d{1,15}", number):
        raise line.error("a corner of a face is no number", found=repr(text[:40]))
    row = int(number) - 1 if int(number) > 0 else n_points + int(number)
    if int(number) == 0 or not 0 <= row < n_points:
        raise line.error("a face names a point that does not exist", found=number, expected=f"1 to {n_points}")
    return row


def _surface(data: Any, arrays: Arrays) -> Any:
    """The poly data with polygons of more than four corners cut into triangles."""
    from vtkmodules.vtkFiltersCore import vtkTriangleFilter

    arrays.notes.append(_SURFACE)
    if data.GetPolys().GetMaxCellSize() <= 4:
        return data
    arrays.notes.append("polygons of more than four corners: all faces were cut into triangles")
    cut = vtkTriangleFilter()
    cut.SetInputData(data)
    cut.Update()
    return cut.GetOutput()


def _cgns(path: Path, arrays: Arrays) -> Any:
    """All zones as one grid; points of neighbouring zones stay apart. One solution only."""
    from vtkmodules.vtkCommonExecutionModel import vtkStreamingDemandDrivenPipeline
    from vtkmodules.vtkFiltersCore import vtkAppendFilter
    from vtkmodules.vtkIOCGNSReader import vtkCGNSReader

    with path.open("rb") as stream:
        if stream.read(8) != b"\x89HDF\r\n\x1a\n":
            raise LoadError(
                "is kept in a container that is not read",
                expected="CGNS in HDF5",
                do="convert it to HDF5, as the format's own tools do",
            )
    reader = vtkCGNSReader()
    reader.SetLoadBndPatch(False)
    reader.SetFileName(str(path))
    reader.UpdateInformation()
    reader.EnableAllBases()
    reader.EnableAllFamilies()
    reader.EnableAllPointArrays()
    reader.EnableAllCellArrays()
    blocks = _updated(reader, path, needs_points=False)
    join, zones, walker = vtkAppendFilter(), 0, blocks.NewIterator()
    while not walker.IsDoneWithTraversal():
        leaf = walker.GetCurrentDataObject()
        if leaf.IsA("vtkPointSet") and leaf.GetNumberOfPoints():
            zones += 1
            join.AddInputData(leaf)
        walker.GoToNextItem()
    if not zones:
        raise LoadError("holds no zone with points")
    if zones > 1:
        arrays.notes.append(f"{zones} zones were put together; their points were not joined")
    join.Update()
    data = join.GetOutput()
    steps, key = reader.GetOutputInformation(0), vtkStreamingDemandDrivenPipeline.TIME_STEPS()
    if steps.Has(key) and steps.Length(key) > 1:
        arrays.notes.append("several steps: their solutions are not read")
        data.GetPointData().Initialize()
    return data


def _updated(reader: Any, path: Path, needs_points: bool = True) -> Any:
    """The reader's output after everything it says has been listened to."""
    from vtkmodules.vtkCommonCore import vtkOutputWindow, vtkStringOutputWindow

    said, errors = vtkStringOutputWindow(), []
    vtkOutputWindow.SetInstance(said)
    reader.AddObserver("ErrorEvent", lambda *_: errors.append(1))
    reader.SetFileName(str(path))
    reader.Update()
    words = said.GetOutput()
    if isinstance(words, bytes):  # what was said held letters from the damaged file
        words = words.decode("utf-8", "replace")
    if errors or "ERR|" in words or reader.GetErrorCode():
        text = re.sub(r"\s+", " ", words.split("): ", 1)[-1])[:160] or f"error code {reader.GetErrorCode()}"
        raise LoadError("VTK's reader reports an error", found=text, do="the file may be cut short: write it again")
    data = reader.GetOutput()
    if data is None or (needs_points and (not hasattr(data, "GetPointData") or data.GetNumberOfPoints() == 0)):
        raise LoadError("holds no mesh with points", found="nothing" if data is None else data.GetClassName())
    return data


def _put_grid(arrays: Arrays, data: Any) -> None:
    import pyvista

    grid = pyvista.wrap(data)
    grid = grid if isinstance(grid, pyvista.UnstructuredGrid) else grid.cast_to_unstructured_grid()
    arrays.put("Points", "Points", grid.points)
    arrays.put("Cells", "types", grid.celltypes)
    arrays.put("Cells", "offsets", grid.offset[1:])
    arrays.put("Cells", "connectivity", grid.cell_connectivity)
    for section, source in (
        ("PointData", grid.point_data),
        ("CellData", grid.cell_data),
        ("FieldData", grid.field_data),
    ):
        for name in source:
            arrays.put(section, name, source[name])
