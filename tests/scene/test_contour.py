"""Contour edges: features and silhouettes."""

import numpy as np
import pytest

from tests.meshes import box_mesh, plate_mesh
from tests.scene.test_surface import tube
from viewer.scene.contour import contour, median_length, silhouettes
from viewer.scene.surface import surface_of


def seen(mesh, toward_eye):
    surface = surface_of(mesh)
    return surface, surface.face_normals(mesh.points[surface.nodes]), np.asarray(toward_eye, float)


def test_plate_shows_its_rim_only():
    mesh = plate_mesh("quad8", (5, 4), (1.0, 1.0))
    surface, normals, eye = seen(mesh, (0, 0, 1))
    assert not silhouettes(surface.edges, normals, eye).any()
    assert len(contour(surface.edges, normals, eye)) == 2 * 2 * (5 + 4)  # two halves of each side


def test_tube_from_the_side_shows_two_generators():
    mesh = tube(36, along=5)
    surface, normals, eye = seen(mesh, (np.cos(0.03), np.sin(0.03), 0))
    edges = surface.edges.nodes[silhouettes(surface.edges, normals, eye)]
    ends = mesh.points[surface.nodes][edges]
    assert len(edges) == 2 * 5
    assert ends[:, 0, :2] == pytest.approx(ends[:, 1, :2])  # each runs along the tube
    assert np.abs(ends[..., 1]).min() > np.cos(np.radians(10))  # at the left and right limb


def test_tube_from_its_end_shows_none():
    surface, normals, eye = seen(tube(36), (0.001, 0.002, 1))
    limb = silhouettes(surface.edges, normals, eye)
    pairs = surface.edges.nodes[limb]
    assert len(contour(surface.edges, normals, eye)) == 2 * 36 + len(pairs)


def test_box_silhouette_is_the_hexagon_of_its_edges():
    mesh = box_mesh("hex8", (3, 3, 3), (1.0, 1.0, 1.0))
    surface, normals, eye = seen(mesh, (1, 1, 1))
    limb = silhouettes(surface.edges, normals, eye)
    assert limb.sum() == 6 * 3
    assert surface.edges.feature[limb].all()
    assert len(contour(surface.edges, normals, eye)) == 12 * 3


def test_median_length():
    mesh = plate_mesh("quad4", (4, 2), (1.0, 1.0))
    surface = surface_of(mesh)
    assert median_length(mesh.points[surface.nodes], surface.outline) == pytest.approx(0.25)
    assert median_length(np.zeros((0, 3)), np.zeros((0, 2), int)) == 0.0
