"""Groups hidden or shown alone: cells vanish, everything else about the picture stays."""

import numpy as np
import pytest

from tests.meshes import box_mesh
from viewer.errors import InputError
from viewer.scene.picture import Body, MassMark, PointMark, SupportMark
from viewer.scene.section import Plane
from viewer.scene.showing import Showing


def body(**changes):
    mesh = box_mesh("hex8", (4, 2, 2), (4.0, 1.0, 1.0))
    middle = mesh.points[mesh.blocks[0].nodes].mean(axis=1)[:, 0]
    groups = {"left": np.nonzero(middle < 2)[0], "right": np.nonzero(middle > 2)[0], "tip": np.nonzero(middle > 3)[0]}
    mesh = mesh.with_(cell_groups=groups)
    x = mesh.points[:, 0]
    foot = np.nonzero(x > 3.5)[0]
    return Body(
        "b",
        mesh,
        np.zeros((mesh.n_nodes, 3)),
        1.0,
        1.0,
        np.arange(mesh.n_cells, dtype=float),
        (SupportMark("root", np.nonzero(x == 0)[0]),),
        (MassMark("m", 1.0, np.array([5.0, 0, 0]), foot, np.zeros(6)),),
        (PointMark("p", np.array([5.0, 0, 0]), np.array([0, 0, 1.0]), np.zeros(6), foot),),
        **changes,
    )


def reach(shown):
    x = shown.mesh.points[np.unique(shown.drawn.faces), 0]
    return float(x.min()), float(x.max())


def test_hidden_groups_vanish_and_open_what_lies_behind():
    (shown,) = Showing(hide=("right",)).parts([body()], (1, 0, 0))
    assert reach(shown) == (0.0, 2.0)
    assert set(shown.drawn.cell) <= set(shown.mesh.cell_groups["left"])
    ends = shown.mesh.points[shown.drawn.faces][:, :, 0]
    assert (ends == 2.0).all(axis=1).sum() == 2 * 4  # the face between, four squares of two triangles


def test_only_shows_these_and_hide_wins():
    assert reach(Showing(only=("left", "tip")).parts([body()], (1, 0, 0))[0]) == (0.0, 4.0)
    assert reach(Showing(only=("right",)).parts([body()], (1, 0, 0))[0]) == (2.0, 4.0)
    assert reach(Showing(only=("right",), hide=("tip",)).parts([body()], (1, 0, 0))[0]) == (2.0, 3.0)


def test_size_and_energies_stay_those_of_the_whole():
    whole = body()
    (shown,) = Showing(hide=("right",)).parts([whole], (1, 0, 0))
    assert shown.mesh is whole.mesh
    assert shown.density is whole.density
    assert shown.factor == whole.factor


def test_marks_go_with_what_holds_them():
    (shown,) = Showing(hide=("right",)).parts([body()], (1, 0, 0))
    assert [len(marks) for marks in (shown.supports, shown.masses, shown.points)] == [1, 0, 0]
    (shown,) = Showing(plane=Plane((1, 0, 0), 1.0)).parts([body()], (-1, 0, 0))
    assert [len(marks) for marks in (shown.supports, shown.masses, shown.points)] == [0, 1, 1]


def test_nothing_asked_nothing_changed():
    whole = body()
    assert Showing().parts([whole], (1, 0, 0)) == (whole,)
    assert Showing().words == ()


def test_words():
    assert Showing(hide="top").words == ("hidden: top",)
    assert Showing(("a", "b"), ("c",), Plane((1, 0, 0), 0.12)).words == (
        "shown: only c",
        "hidden: a, b",
        "cut at x = 120\u00a0mm",
    )


def test_a_group_need_be_in_one_of_two_bodies_only():
    other = body()
    other = Body("c", other.mesh.with_(cell_groups={"all": np.arange(other.mesh.n_cells)}), other.shape, 1.0, 1.0)
    first, second = Showing(hide=("tip",)).parts([body(), other], (1, 0, 0))
    assert reach(first) == (0.0, 3.0)
    assert reach(second) == (0.0, 4.0)


@pytest.mark.parametrize("showing", [Showing(hide=("lid",)), Showing(only=("lid",))])
def test_an_unknown_group_is_named_with_those_there_are(showing):
    with pytest.raises(InputError, match=r"'lid'.*left, right, tip"):
        showing.parts([body()], (1, 0, 0))


def test_hiding_everything_says_so():
    with pytest.raises(InputError, match="nothing of 'b' is left"):
        Showing(hide=("left", "right")).parts([body()], (1, 0, 0))
