"""What only one of two overlaid designs has: found, named, outlined."""

from __future__ import annotations

from dataclasses import replace
from functools import cache

import numpy as np
import pytest

from tests.mechanics.models import CLAMP, design
from tests.meshes import plate_mesh
from tests.scene.sheets import frame_of
from tests.stage.test_stage import near
from viewer.mechanics.eigen import solve
from viewer.model.mesh import CellBlock, Mesh
from viewer.scene.compose import pair_picture
from viewer.scene.primitives import Text
from viewer.scene.region_marks import NAMED, SAID, region_marks
from viewer.scene.sheet import plan_sheet
from viewer.scene.showing import Showing
from viewer.scene.tokens import THEMES
from viewer.stage import Stage
from viewer.workspace.study import Study, study

MISSING = (0.2, 0.3)  # x of the part of the plate that the notched design lacks, for y above the middle


def named(name: str, mesh: Mesh) -> Study:
    part = design(mesh, thickness=0.002, supports=(CLAMP,)).with_(name=name)
    return study(part, solve(part, 2))


@cache
def whole() -> Study:
    return named("whole", plate_mesh("quad4", (24, 8), (0.3, 0.1)))


@cache
def notched() -> Study:
    mesh = plate_mesh("quad4", (24, 8), (0.3, 0.1))
    (block,) = mesh.blocks
    x, y, _ = mesh.points[block.nodes].mean(axis=1).T
    kept = ~((x > MISSING[0]) & (y > 0.05))
    used, nodes = np.unique(block.nodes[kept], return_inverse=True)
    groups = {"x0": np.flatnonzero(mesh.points[used, 0] < 1e-9)}
    blocks = (CellBlock(block.kind, nodes.reshape(-1, 4), block.ids[kept]),)
    return named("notched", Mesh(mesh.points[used], blocks, mesh.node_ids[used], node_groups=groups))


def overlay(first=notched, second=whole, **look):
    return pair_picture(first(), 1, second(), 1, layout="overlay", **look)


@pytest.mark.parametrize(("first", "second", "owner"), [(notched, whole, 1), (whole, notched, 0)])
def test_the_corner_that_one_design_lacks_is_marked_on_the_other(first, second, owner):
    picture = overlay(first, second)
    body = picture.bodies[owner]
    (mark,) = body.regions
    middle = body.mesh.points[body.mesh.blocks[0].nodes[mark.cells]].mean(axis=1)
    # cells whose nodes lie on the notch's edge are half in both designs
    assert middle[:, 0].min() > MISSING[0] - 0.0126 and middle[:, 1].min() > 0.05 - 0.0126
    area = (0.1 - 0.0125) * (0.05 - 0.0125)
    assert area <= len(mark.cells) * 0.0125**2 * 1.001 <= 0.1 * 0.05 * 1.001
    assert mark.title == "only in whole" and "of its mass" in mark.lines[1]
    assert picture.bodies[1 - owner].regions == ()
    assert SAID in picture.note.drawing


@pytest.mark.parametrize("theme", THEMES)
def test_the_label_stands_in_the_designs_colour(theme):
    picture = overlay(theme=theme)
    sheet = plan_sheet(picture, frame_of(picture)).at(0.0)
    (label,) = [item for item in sheet.fixed if isinstance(item, Text) and item.words == "only in whole"]
    assert label.colour == THEMES[theme].modified


@pytest.mark.parametrize(("first", "second", "role"), [(notched, whole, "modified"), (whole, notched, "baseline")])
def test_the_outline_is_bold_and_solid(first, second, role):
    picture = overlay(first, second, ghost=False)
    bare = picture.with_(bodies=tuple(replace(b, regions=()) for b in picture.bodies))
    colour = getattr(THEMES["light"], role)
    with Stage(picture) as stage, Stage(bare) as other:
        more, fewer = (near(s.image(np.pi / 2), colour, 40).sum() for s in (stage, other))
    assert more > fewer + 300


def test_alike_designs_and_pictures_side_by_side_have_none():
    alike = overlay(whole, whole)
    assert all(body.regions == () for body in alike.bodies) and SAID not in alike.note.drawing
    side = pair_picture(notched(), 1, whole(), 1, layout="side")
    assert all(body.regions == () for body in side.bodies)


def test_a_region_that_is_not_shown_has_no_mark():
    mesh = whole().design.mesh
    mark = overlay().bodies[1].regions[0]
    grouped = mesh.with_(cell_groups={"corner": mark.cells})
    part = whole().design.with_(mesh=grouped)
    shown = study(part, whole().modes)
    picture = pair_picture(notched(), 1, shown, 1, layout="overlay", showing=Showing(hide=("corner",)))
    assert picture.bodies[1].regions == ()


def test_only_the_heaviest_are_named():
    class Region:
        def __init__(self, share):
            self.design, self.cells, self.mass_share, self.place = "whole", np.array([0]), share, "here"

    marks = region_marks([Region(share) for share in (0.01, 0.2, 0.03, 0.04, 0.05, 0.002)], "whole")
    assert [bool(mark.title) for mark in marks] == [False, True, True, True, True, False]
    assert sum(bool(mark.title) for mark in marks) == NAMED
    assert region_marks([Region(0.1)], "other") == ()
