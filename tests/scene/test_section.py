"""A plane cut: volumes and areas by the divergence theorem and by geometry, closed skins, fields that follow."""

import numpy as np
import pytest

from tests.meshes import box_mesh, plate_mesh
from viewer.errors import InputError
from viewer.model.mesh import CellBlock, Mesh
from viewer.scene.picture import Body
from viewer.scene.section import Plane
from viewer.scene.showing import Showing
from viewer.scene.surface import cross_of, surface_of

SIZE = np.array([3.0, 2.0, 1.0])
SOLIDS = ["hex8", "hex20", "hex27", "tet4", "tet10", "wedge6", "wedge15", "pyramid5", "pyramid13"]


def body(mesh, **changes):
    points = mesh.points
    shape = np.stack([points[:, 1], 2 * points[:, 2] - points[:, 0], 1 + points[:, 0]], axis=1)
    return Body("b", mesh, shape, 1.0, 1.0, **{"density": np.arange(mesh.n_cells, dtype=float), **changes})


def cut(mesh, normal, offset, eye=None):
    """What is kept lies below the plane, unless an eye is given."""
    shown = Showing(plane=Plane(normal, offset))
    return shown.parts([body(mesh)], normal if eye is None else eye)[0]


def volume(points, faces):
    return float(np.einsum("ij,ij->", points[faces[:, 0]], cross_of(points, faces)) / 6)


def closed(faces):
    """Whether every directed edge is met by as many in the other sense, coinciding places taken as one."""
    start, end = faces.ravel(), faces[:, [1, 2, 0]].ravel()
    forward, backward = ({}, {})
    for a, b in zip(start.tolist(), end.tolist(), strict=True):
        forward[a, b] = forward.get((a, b), 0) + 1
        backward[b, a] = backward.get((b, a), 0) + 1
    return forward == backward


@pytest.mark.parametrize("kind", SOLIDS)
@pytest.mark.parametrize(
    ("normal", "offset"), [((1, 0, 0), 1.1), ((0, 0, 1), 0.5), ((1, 2, 3), 1.3), ((-1, 1, 0.3), 0.2)]
)
def test_a_cut_box_keeps_the_right_volume_and_shows_the_right_face(kind, normal, offset):
    normal = np.array(normal, float)
    unit = normal / np.linalg.norm(normal)
    mesh = box_mesh(kind, (3, 2, 2), SIZE)
    shown = cut(mesh, normal, offset)
    points, faces = shown.mesh.points, shown.drawn.faces
    below, area = _box_below(unit, offset)
    assert volume(points, faces) == pytest.approx(below, rel=1e-9)
    on_plane = np.abs(points[faces] @ unit - offset).max(axis=1) < 1e-9
    vectors = cross_of(points, faces[on_plane]) / 2
    assert vectors.sum(axis=0) == pytest.approx(area * unit, rel=1e-9, abs=1e-9)  # faces outward
    assert np.linalg.norm(vectors, axis=1).sum() == pytest.approx(area, rel=1e-9)  # without overlap
    assert (points[np.unique(faces)] @ unit).max() <= offset + 1e-9


def _box_below(unit, offset):
    """Volume below the plane in the box, and the plane's area in it: from the convex hull (Qhull)."""
    from scipy.spatial import ConvexHull

    corners = np.array([[x, y, z] for x in (0, 3.0) for y in (0, 2.0) for z in (0, 1.0)])
    height = corners @ unit - offset
    kept = [corners[height <= 0]]
    pairs = [(a, b) for a in range(8) for b in range(a) if np.count_nonzero(corners[a] != corners[b]) == 1]
    rim = np.array(
        [
            corners[a] + height[a] / (height[a] - height[b]) * (corners[b] - corners[a])
            for a, b in pairs
            if height[a] * height[b] < 0
        ]
    )
    across = np.linalg.svd(unit[None])[2][1:]
    return ConvexHull(np.concatenate([*kept, rim])).volume, ConvexHull(rim @ across.T).volume


@pytest.mark.parametrize("kind", ["hex8", "hex20", "tet4", "tet10", "wedge6", "pyramid5"])
def test_a_cut_through_nodes_leaves_whole_cells_and_a_closed_skin(kind):
    mesh = box_mesh(kind, (3, 2, 2), SIZE)
    shown = cut(mesh, (1, 0, 0), 2.0)  # a plane of the mesh
    assert shown.mesh.n_nodes == mesh.n_nodes
    assert volume(shown.mesh.points, shown.drawn.faces) == pytest.approx(4.0)


def test_neighbouring_cells_share_the_cut_faces_edges():
    # tetrahedra are cut along their own triangles: nothing may gape anywhere
    mesh = box_mesh("tet4", (3, 3, 3), SIZE, distort=0.3)
    assert closed(cut(mesh, (1, 2, 3), 2.1).drawn.faces)
    # in hexahedra the inner edges of the cut face close; only its rim has the skin's diagonals in between
    shown = cut(box_mesh("hex8", (4, 4, 4), SIZE), (1, 0.2, 0.1), 1.7)
    surface = surface_of(shown.mesh, shown.drawn)
    unit = np.array(Plane((1, 0.2, 0.1), 0.0).normal)
    at = shown.mesh.points[surface.nodes] @ unit
    open_edges = surface.edges.nodes[surface.edges.faces[:, 1] < 0]
    on_cut = np.abs(at[open_edges] - at.max()).max(axis=1) < 1e-9
    assert on_cut.all()
    middle = shown.mesh.points[surface.nodes][open_edges].mean(axis=1)
    assert np.min([np.abs(middle[:, 1:]), np.abs(middle[:, 1:] - SIZE[1:])], axis=(0, 2)).max() < 1e-9


def test_fields_follow_linearly_and_cells_keep_their_energy():
    mesh = box_mesh("hex8", (3, 2, 2), SIZE)
    shown = cut(mesh, (1, 2, 3), 2.0)
    expected = body(shown.mesh, density=None).shape  # the shape is linear in place
    assert shown.shape == pytest.approx(expected, abs=1e-12)
    unit = np.array([1, 2, 3]) / np.sqrt(14)
    points, faces = shown.mesh.points, shown.drawn.faces
    on_plane = np.abs(points[faces] @ unit - 2.0).max(axis=1) < 1e-9
    centre = points[faces[on_plane]].mean(axis=1)
    owner = np.floor(centre / (SIZE / [3, 2, 2]) - 1e-9).astype(int)
    middles = mesh.points[mesh.blocks[0].nodes].mean(axis=1)
    found = np.floor(middles[shown.drawn.cell[on_plane]] / (SIZE / [3, 2, 2])).astype(int)
    assert np.array_equal(owner, found)


def test_complex_shapes_stay_complex():
    mesh = box_mesh("hex8", (2, 2, 2), SIZE)
    shape = mesh.points * (1 + 2j)
    shown = Showing(plane=Plane((1, 0, 0), 1.0)).parts([Body("b", mesh, shape, 1.0, 1.0)], (1, 0, 0))[0]
    assert shown.shape == pytest.approx(shown.mesh.points * (1 + 2j))


def test_sheets_and_beams_are_cut_through():
    plate = plate_mesh("quad8", (6, 4), (3.0, 2.0))
    shown = cut(plate, (1, 1, 0), 1.7)
    areas = np.linalg.norm(cross_of(shown.mesh.points, shown.drawn.faces), axis=1) / 2
    leg = 1.7 * np.sqrt(2)
    assert areas.sum() == pytest.approx(leg**2 / 2 - (leg - 2.0) ** 2 / 2)
    points = np.array([[0, 0, 0], [1, 0, 0], [2, 0, 0.0]])
    beam = Mesh(points, (CellBlock("line2", np.array([[0, 1], [1, 2]]), np.arange(2)),), np.arange(3))
    shown = cut(beam, (1, 0, 0), 1.25)
    ends = shown.mesh.points[shown.drawn.edges]
    assert np.linalg.norm(ends[:, 1] - ends[:, 0], axis=1).sum() == pytest.approx(1.25)
    assert shown.drawn.edge_cell.tolist() == [0, 1]


def test_the_part_nearer_to_the_eye_is_taken_away():
    mesh = box_mesh("hex8", (3, 2, 2), SIZE)
    for eye, low, high in (((1, 0, 0), 0.0, 1.2), ((-1, 0, 0), 1.2, 3.0)):
        for sign in (1, -1):  # the sense of the normal says nothing
            shown = cut(mesh, (sign, 0, 0), sign * 1.2, eye)
            x = shown.mesh.points[np.unique(shown.drawn.faces), 0]
            assert (x.min(), x.max()) == pytest.approx((low, high))


def test_mesh_lines_run_over_the_cut_face():
    mesh = box_mesh("hex8", (3, 2, 2), SIZE)
    shown = cut(mesh, (1, 0, 0), 1.2)
    ends = shown.mesh.points[shown.drawn.outline]
    on_cut = np.abs(ends[:, :, 0] - 1.2).max(axis=1) < 1e-9
    assert np.linalg.norm(ends[on_cut, 1] - ends[on_cut, 0], axis=1).sum() == pytest.approx(3 * 2.0 + 3 * 1.0)


def test_words():
    assert Plane((1, 0, 0), 0.12).words == "cut at x = 120\u00a0mm"
    assert Plane((0, 0, -2), 0.0505).words == "cut at z = −50.5\u00a0mm"
    assert Plane((0, 3, 0), 1e-20).words == "cut at y = 0\u00a0mm"
    assert Plane((1, 0, 1), 0.25).words == "cut across (0.71, 0, 0.71) at 250\u00a0mm"


def test_a_plane_without_a_normal_is_refused():
    for normal, offset in (((0, 0, 0), 1.0), ((1, np.nan, 0), 1.0), ((1, 0, 0), np.inf), ((1, 0), 0.0)):
        with pytest.raises(InputError):
            Plane(normal, offset)


@pytest.mark.parametrize("offset", [-1.0, 3.0, 4.0])
def test_a_cut_that_misses_says_where_the_body_is(offset):
    with pytest.raises(InputError, match=r"misses the body.*between 0.* and 3\.000.m"):
        cut(box_mesh("hex8", (2, 2, 2), SIZE), (1, 0, 0), offset)


def test_a_cut_that_leaves_nothing_of_a_group_says_so():
    mesh = box_mesh("hex8", (3, 2, 2), SIZE)
    high = np.flatnonzero(mesh.points[mesh.blocks[0].nodes].mean(axis=1)[:, 0] > 2)
    shown = Showing(only=("high",), plane=Plane((1, 0, 0), 1.5))
    with pytest.raises(InputError, match="nothing of 'b' is left"):
        shown.parts([body(mesh.with_(cell_groups={"high": high}))], (1, 0, 0))
