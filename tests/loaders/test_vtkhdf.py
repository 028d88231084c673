"""``.vtkhdf`` against VTK's own writer and reader: pieces, steps, surfaces, names."""

import h5py
import numpy as np
import pytest
import pyvista
from vtkmodules.util.vtkAlgorithm import VTKPythonAlgorithmBase
from vtkmodules.vtkCommonDataModel import vtkDataObject
from vtkmodules.vtkCommonExecutionModel import vtkStreamingDemandDrivenPipeline
from vtkmodules.vtkIOHDF import vtkHDFReader, vtkHDFWriter

from tests.loaders.samples import cube_rows, grid_points
from viewer.cells import measures
from viewer.errors import LoadError
from viewer.loaders import raw_data, read_mesh, read_modes, write_interchange
from viewer.loaders.file_shapes import FileShapes


def by_vtk(path, data, steps=False):
    writer = vtkHDFWriter()
    writer.SetInputConnection(data.GetOutputPort()) if steps else writer.SetInputData(data)
    writer.SetWriteAllTimeSteps(steps)
    writer.SetFileName(str(path))
    writer.Write()
    return path


def grid():
    found = pyvista.UnstructuredGrid({12: cube_rows()}, grid_points())
    found.point_data["node_id"] = np.arange(16)[::-1] + 1
    return found


class Series(VTKPythonAlgorithmBase):
    """Three steps; the shape is the points times the time."""

    times = (3.0, 4.5, 9.0)

    def __init__(self):
        super().__init__(nInputPorts=0, nOutputPorts=1, outputType="vtkUnstructuredGrid")

    def RequestInformation(self, request, inputs, outputs):
        info = outputs.GetInformationObject(0)
        info.Remove(vtkStreamingDemandDrivenPipeline.TIME_STEPS())
        for time in self.times:
            info.Append(vtkStreamingDemandDrivenPipeline.TIME_STEPS(), time)
        for time in (self.times[0], self.times[-1]):
            info.Append(vtkStreamingDemandDrivenPipeline.TIME_RANGE(), time)
        return 1

    def RequestData(self, request, inputs, outputs):
        info = outputs.GetInformationObject(0)
        time = info.Get(vtkStreamingDemandDrivenPipeline.UPDATE_TIME_STEP())
        step = grid()
        step.point_data["displacement"] = step.points * time
        out = info.Get(vtkDataObject.DATA_OBJECT())
        out.ShallowCopy(step)
        out.GetInformation().Set(vtkDataObject.DATA_TIME_STEP(), time)
        return 1


def test_what_vtk_writes_is_read(tmp_path):
    data = grid()
    for number in (1, 2):
        data.point_data[f"mode_{number:03d}"] = data.points * number
    data.field_data["freq_hz"] = [7.0, 7.0]
    data.cell_data["group_tip"] = np.array([0, 0, 1])
    path = by_vtk(tmp_path / "a.vtkhdf", data)
    mesh = read_mesh(path)
    assert np.array_equal(mesh.points, grid_points())
    assert mesh.blocks[0].nodes.tolist() == cube_rows().tolist()
    assert mesh.node_ids.tolist() == list(range(16, 0, -1))
    assert mesh.cell_groups["tip"].tolist() == [2]
    modes = read_modes(path, mesh)
    assert modes.freq_hz.tolist() == [7, 7]
    assert np.array_equal(modes.shape(1), grid_points() * 2)


def test_what_is_written_vtk_reads(tmp_path, mesh, modes):
    reader = vtkHDFReader()
    reader.SetFileName(str(write_interchange(tmp_path / "a.vtkhdf", mesh, modes)))
    reader.Update()
    seen = pyvista.wrap(reader.GetOutput())
    assert np.array_equal(seen.points, mesh.points)
    assert np.array_equal(seen.point_data["mode_003"], modes.shape(2))
    assert seen.celltypes.tolist() == [12, 12, 9, 12]
    assert np.array_equal(seen.cell_connectivity, np.concatenate([b.nodes.ravel() for b in mesh.blocks]))
    assert seen.cell_data["elem_id"].tolist() == [7, 5, 100, 1]
    assert not any("." in name or "/" in name for name in [*seen.point_data, *seen.cell_data])


def test_steps_as_vtk_writes_them(tmp_path):
    path = by_vtk(tmp_path / "a.vtkhdf", Series(), steps=True)
    mesh = read_mesh(path)
    assert mesh.n_nodes == 16
    assert mesh.n_cells == 3
    modes = read_modes(path, mesh)
    assert modes.freq_hz.tolist() == list(Series.times)
    for index, time in enumerate(Series.times):
        assert np.allclose(modes.shape(index), grid_points() * time, rtol=1e-15)


def steps_on_one_mesh(path, times, shapes):
    """Three steps on a mesh that is stored once, by the published layout; what VTK's reader makes of it is tested."""
    with h5py.File(by_vtk(path, grid()), "a") as file:
        root = file["VTKHDF"]
        n, m = len(times), len(shapes[0])
        root["PointData"]["shape"] = np.concatenate(shapes)
        steps = root.create_group("Steps")
        steps.attrs["NSteps"] = n
        steps["Values"] = np.array(times, float)
        for name in ("PartOffsets", "PointOffsets", "CellOffsets", "ConnectivityIdOffsets"):
            steps[name] = np.zeros(n, np.int64)
        steps["NumberOfParts"] = np.ones(n, np.int64)
        steps.create_group("PointDataOffsets")["shape"] = np.arange(n) * m
        steps["PointDataOffsets"]["node_id"] = np.zeros(n, np.int64)
    return path


def test_steps_of_equal_time_stay_apart_and_in_the_file(tmp_path, monkeypatch):
    monkeypatch.setattr(raw_data, "_READ_AT_ONCE", 0)
    shapes = [grid_points() * k for k in (1, 2, 3)]
    path = steps_on_one_mesh(tmp_path / "a.vtkhdf", [5, 5, 8], shapes)
    modes = read_modes(path, read_mesh(path))
    assert isinstance(modes.shapes, FileShapes)
    assert modes.freq_hz.tolist() == [5, 5, 8]
    assert all(np.array_equal(modes.shape(i), shapes[i]) for i in range(3))
    reader = vtkHDFReader()
    reader.SetFileName(str(path))
    reader.SetStep(2)
    reader.Update()
    assert np.array_equal(pyvista.wrap(reader.GetOutput()).point_data["shape"], shapes[2])


def test_times_that_only_count_are_no_frequencies(tmp_path):
    path = steps_on_one_mesh(tmp_path / "a.vtkhdf", [0, 1, 2], [grid_points()] * 3)
    with pytest.raises(LoadError, match=r"frequencies of the modes are missing.*a_frequencies\.csv"):
        read_modes(path, read_mesh(path))
    (tmp_path / "a_frequencies.csv").write_text("mode,freq_hz\n1,4\n2,5\n3,6\n")
    assert read_modes(path, read_mesh(path)).freq_hz.tolist() == [4, 5, 6]


def test_surface(tmp_path):
    sphere = pyvista.Sphere(radius=0.1)
    mesh = read_mesh(by_vtk(tmp_path / "a.vtkhdf", sphere))
    assert {block.kind for block in mesh.blocks} == {"tri3"}
    assert sum(measures(b.kind, mesh.points[b.nodes]).sum() for b in mesh.blocks) == pytest.approx(sphere.area)


def test_pieces_are_put_together(tmp_path):
    """Two pieces in the published layout: rows count from 0 in each, offsets have one more entry than cells."""
    with h5py.File(tmp_path / "a.vtkhdf", "w") as file:
        root = file.create_group("VTKHDF")
        root.attrs["Version"], root.attrs["Type"] = [2, 0], np.bytes_(b"UnstructuredGrid")
        root["NumberOfPoints"], root["NumberOfCells"], root["NumberOfConnectivityIds"] = [3, 4], [1, 1], [3, 4]
        root["Points"] = np.array(
            [[0, 0, 0], [1, 0, 0], [0, 1, 0], [5, 0, 0], [6, 0, 0], [6, 1, 0], [5, 1, 0]], float
        )
        root["Connectivity"], root["Offsets"] = [0, 1, 2, 0, 1, 2, 3], [0, 3, 0, 4]
        root["Types"] = np.array([5, 9], np.uint8)
    mesh = read_mesh(tmp_path / "a.vtkhdf")
    assert [(b.kind, b.nodes.tolist()) for b in mesh.blocks] == [("tri3", [[0, 1, 2]]), ("quad4", [[3, 4, 5, 6]])]
    reader = vtkHDFReader()
    reader.SetFileName(str(tmp_path / "a.vtkhdf"))
    reader.Update()
    parts = reader.GetOutputDataObject(0)
    seen = [pyvista.wrap(parts.GetPartition(i)) for i in range(parts.GetNumberOfPartitions())]
    assert np.array_equal(np.concatenate([part.points for part in seen]), mesh.points)
    assert [part.cell_connectivity.tolist() for part in seen] == [[0, 1, 2], [0, 1, 2, 3]]
