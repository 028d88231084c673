"""The truths of the collection hold against theory, and the score sees what it must."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from tests.collection import statics, truth
from tests.collection.parts import line_across
from tests.collection.registry import GROUPS, parts_of
from tests.collection.scoring import named, score_mode
from tests.collection.sheets import STEEL, Patch, Sheet, build
from tests.collection.solved import solved
from viewer.insight.hinges import find_hinges

PARTS = {p.name: p for group in GROUPS for p in parts_of(group)}


def _plate(depth=0.3, width=0.004, h=0.004):
    size = (0.3, 0.2)
    band = line_across(size, 0.12, width, 0.0)
    return Sheet(size, h, 0.02, (Patch(band.box, depth * h),), (band,), clamp=((0, 0, 0, 0.2),)), band


@pytest.mark.parametrize(("kind", "off"), [("quad4", 0.01), ("quad8", 0.01), ("tri3", 0.02)])
def test_static_stiffness_of_a_shell_groove_is_that_of_a_plate_strip(kind, off):
    # Between two rigid lines a wide strip bends into a cylinder: k = D b / w with D = E h³ / 12 (1 − ν²).
    # Timoshenko S., Woinowsky-Krieger S., Theory of Plates and Shells, 2nd ed. 1959, ch. 1.
    sheet, band = _plate()
    h, width = 0.3 * sheet.thickness, band.sides[1] - band.sides[0]
    plain = STEEL.youngs_modulus * h**3 / 12 / (1 - STEEL.poisson**2) * sheet.size[1] / width
    assert statics.stiffness(build("strip", sheet, kind), band) == pytest.approx(plain, rel=off)


def test_a_settled_stiffness_is_that_of_finer_cells_and_of_other_cells():
    # A groove from one face of a solid: bricks and tetrahedra must settle to the same.
    sheet, band = _plate(width=0.006)
    sheet = replace(sheet, size=(0.2, 0.03), bands=(), patches=())
    band = line_across(sheet.size, 0.1, 0.006, 0.006)
    sheet = replace(
        sheet,
        patches=(Patch(band.box, 0.0014),),
        bands=(band,),
        cell=0.01,
        clamp=((0, 0, 0, 0.03),),
        layers=2,
        least=4,
    )
    found = {kind: statics.settled("strip", sheet, kind)[0] for kind in ("hex20", "tet10", "quad8")}
    assert all(abs(s.change) <= statics.SETTLED and s.value > 0 for s in found.values())
    assert found["tet10"].value == pytest.approx(found["hex20"].value, rel=statics.SETTLED)
    own = statics.stiffness(build("strip", sheet, "quad8"), band)
    assert own == pytest.approx(found["quad8"].value, rel=0.01)


def test_a_stiffness_that_does_not_settle_is_none():
    assert statics.agree([3.0, 2.9]) and not statics.agree([3.0]) and not statics.agree([3.0, 2.8])
    assert statics.agree([3.0, 2.7, 2.6])


def test_parts_without_bands_have_no_narrow_weak_place():
    # Any strip across the part, as narrow as a strong hinge may be, along either side: none is what a band must be.
    for name in ("waffle-1-quad4", "comb-0-quad4", "pocket-1-quad4", "doubler-0-quad4", "ladder-0-quad4"):
        ready = solved(PARTS[name])
        for j in range(ready.first, ready.modes.count):
            strain, whole = ready.energies.strain[j], ready.energies.total_strain[j]
            for on in _strips(ready.built):
                share, volumes = strain[on].sum() / whole, ready.energies.volumes
                contrast = strain[on].sum() / volumes[on].sum() / (strain[~on].sum() / volumes[~on].sum())
                assert share < truth.STRONG_SHARE or contrast < truth.STRONG_CONTRAST, (name, j)


def _strips(built):
    for axis in (0, 1):
        width = truth.STRONG_WIDTH * built.sheet.size[1 - axis]
        for start in np.unique(built.middle[:, axis].round(7)):
            yield (built.middle[:, axis] >= start - 1e-7) & (built.middle[:, axis] <= start + width)


def test_turn_of_a_band_is_what_rigid_sides_make_it():
    # Both sides move as rigid bodies, the far one turned by a given vector more: solids and shells must read it.
    sheet, band = _plate()
    given = np.array([0.02, 0.7, -0.1])
    for kind in ("quad4", "hex20", "tet10"):
        built = build("rigid", sheet, kind)
        far = built.where[:, 0] > sum(band.sides) / 2
        arm = built.mesh.points - built.line(band)[0]
        moved = np.cross(np.array([0.1, 0.2, 0.3]) + given * far[:, None], arm)
        turned = np.array([0.1, 0.2, 0.3]) + given * far[:, None]
        turn, evenness, aligned = truth.fold(built, band, moved, None if built.solid else turned)
        assert turn == pytest.approx(given, abs=1e-9)
        assert evenness == pytest.approx(1)
        assert aligned == pytest.approx(given[1] / np.linalg.norm(given))


def test_modes_and_static_solutions_agree_on_the_stiffness_of_strong_shell_grooves():
    for name in ("groove-2-tri3", "root_groove-0-quad4", "two_grooves-0-quad4"):
        ready = solved(PARTS[name])
        strong = [(j, t) for j, ts in enumerate(ready.truths) for t in ts if t.level == "strong" and t.one_angle]
        assert strong
        for j, t in strong:
            whole = ready.energies.total_strain[ready.first + j]
            assert 2 * t.share * whole / (t.turn @ t.turn) == pytest.approx(ready.stiffness[t.band], rel=0.05)


def test_a_denser_mesh_has_the_same_bands():
    for part in PARTS.values():
        if part.kind in ("quad4", "tri3"):
            coarse, fine = (build(part.name, part.sheet, part.kind, density) for density in (1, 2))
            assert fine.mesh.n_cells == 4 * coarse.mesh.n_cells
            for band in part.sheet.bands:
                assert fine.cells(band.box).sum() == 4 * coarse.cells(band.box).sum() > 0
                for side in band.sides:
                    assert len(truth.edge(coarse, band, side)[0]) >= 2


def test_the_score_sees_what_is_missed_and_what_is_false():
    ready = solved(PARTS["groove-0-quad4"])
    level = [ts[0].level for ts in ready.truths]
    strong, none = level.index("strong"), level.index("none")
    (right,) = named(find_hinges(ready.built.design, ready.modes, ready.first + strong + 1, ready.energies))
    off = replace(right, position=right.position + np.array([0.1, 0, 0]) * ready.built.mesh.diagonal)
    askew = replace(right, direction=np.array([np.sin(0.5), np.cos(0.5), 0]))

    def row(mode, *hinges):
        return score_mode(ready, mode, hinges)[0]

    assert row(strong, right).hit and not row(strong, right).false
    assert not row(strong).hit
    assert not row(strong, off).hit and row(strong, off).false == 1
    assert not row(strong, askew).hit and row(strong, askew).direction == pytest.approx(np.degrees(0.5), abs=0.1)
    assert row(none, off).free and row(none, off).false == 1 and row(none, right).idle == 1
