"""What modes do, in figures and words: parts whose modes are known, and the samples."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest

from tests.mechanics.models import CLAMP, STEEL, design
from tests.meshes import box_mesh, line_mesh, plate_mesh
from tests.sentences import unfounded
from viewer.errors import InputError
from viewer.insight.character import describe, facing_surfaces, masses_of
from viewer.insight.effective_mass import effective_masses
from viewer.insight.scale import scale_mode
from viewer.mechanics.eigen import solve
from viewer.mechanics.energy import energies
from viewer.model.design import (
    Assignment,
    Design,
    FunctionalPoint,
    LumpedMass,
    Physics,
    Section,
    Selector,
    Spring,
    Strut,
)
from viewer.model.dossier import StatedAmplitude
from viewer.model.mesh import Mesh
from viewer.model.modes import ArrayShapes, ModeSet
from viewer.workspace import Workspace

SAMPLES = Path(__file__).parents[2] / "sample_meshes"

# Words that the mode's own name in the dossier calls for; the boom's modes 3 and 5 sway and twist at once.
SAID = {
    ("fork", "baseline"): [
        "sways",
        "nods",
        "tine right and tine left spread",
        "tine right and tine left move in turn, up and down",
        "sways, 1 still section",
        "tine right and tine left move in turn, up and down",
        "tine right and tine left spread",
        "nods, 1 still section",
    ],
    ("trough", "plain"): [
        "twists",
        "nods",
        "sways",
        "twists and sways, 1 still section",
        "nods, 1 still section",
    ],
    ("trough", "strapped"): ["nods", "sways", "twists", "nods, 1 still section", "twists, 1 still section"],
    ("boom", "baseline"): ["nods", "sways", "twists", "flap moves on its own", "sways", "top and floor bulge"],
}


@pytest.fixture(scope="module")
def samples():
    """The studies of the samples, each read once."""
    place, studies = Workspace(cache=None), {}

    def study(sample, name):
        if (sample, name) not in studies:
            studies[sample, name] = place.open(SAMPLES / sample).study(name)
        return studies[sample, name]

    return study


@pytest.mark.parametrize(("sample", "name"), SAID)
def test_samples_are_described_as_they_are_named(samples, sample, name):
    study = samples(sample, name)
    effective = masses_of(study.design, study.modes)
    facing = facing_surfaces(study.design.mesh)
    for i, words in enumerate(SAID[sample, name]):
        found = describe(
            study.design, study.modes, i + 1, study.energies, study.scale(i), effective=effective, facing=facing
        )
        facts = found.to_dict()
        assert words in facts["suggested_name"], (i + 1, facts["suggested_name"])
        assert found.sentence.startswith(f"Mode {i + 1} ({study.name(i)}): ")
        assert unfounded(found.sentence, facts) == []
        assert json.loads(json.dumps(facts)) == facts


def test_fork_spreads_and_its_tines_go_together(samples):
    study = samples("fork", "baseline")
    spread = describe(study.design, study.modes, 3, study.energies)
    assert "spread apart and close (99% of their motion opens and closes the gap, 183 mm wide)" in spread.sentence
    assert "99% of the kinetic energy moves along y" in spread.sentence
    sway = describe(study.design, study.modes, 1, study.energies)
    assert "tine right and tine left move together (98% of their motion)" in sway.sentence
    assert "shaking the support along y drives 48% of the mass in this mode" in sway.sentence


def test_boom_carries_its_camera(samples):
    """The lens follows the seat; group shares are those of the energies and, with the camera's, add up to one."""
    study = samples("boom", "baseline")
    mode_5 = describe(study.design, study.modes, 5, study.energies).to_dict()
    (lens,) = mode_5["points"]
    assert lens["point"] == "camera lens"
    carried = next(point for point in study.carried if point.name == "camera lens")
    shape = study.modes.shape(4)
    motion = carried.motion(shape)[:3]
    largest = max(np.linalg.norm(shape, axis=1).max(), *(np.linalg.norm(p.motion(shape)[:3]) for p in study.carried))
    assert lens["ratio_to_largest"] == pytest.approx(abs(motion[1]) / largest)
    assert lens["share_of_its_motion"] == pytest.approx(motion[1] ** 2 / (motion @ motion))
    groups = {group["name"]: group["kinetic_share"] for group in mode_5["groups"]}
    rows = study.design.mesh.cell_groups["top"]
    assert groups["top"] == pytest.approx(study.energies.kinetic[4, rows].sum() / study.energies.total_kinetic[4])
    assert sum(groups.values()) + mode_5["lumped_kinetic_share"]["camera"] == pytest.approx(1.0)
    first = describe(study.design, study.modes, 1, study.energies, study.scale(0)).to_dict()
    assert first["points"][0]["along_real_m"] < 1e-7  # 3.9 µm down, next to nothing sideways


def test_local_modes_are_told_by_where_the_energy_is(samples):
    study = samples("boom", "baseline")
    flap = describe(study.design, study.modes, 4, study.energies).to_dict()
    whole = describe(study.design, study.modes, 1, study.energies).to_dict()
    assert flap["half_of_kinetic_in_mass_share"] < 0.01
    assert whole["half_of_kinetic_in_mass_share"] > 0.2
    assert flap["participation"] < 0.02 < 0.5 < whole["participation"]


def bar(**physics) -> Design:
    return design(box_mesh("hex20", (3, 3, 16), (0.03, 0.04, 0.5)), **physics)


STANDING = bar(supports=(CLAMP.__class__("root", Selector(group="z0")),))


def test_concentration_of_a_cantilever():
    """Half of the kinetic energy of a uniform cantilever's first bending lies beyond 0.8444 of its length; its
    participation (∫φ²)²/∫φ⁴ is 0.4263 (both integrated here from the beam's shape)."""
    beta, sigma = 1.8751040687, 0.7340955138
    x = np.linspace(0, 1, 20001)
    phi = np.cosh(beta * x) - np.cos(beta * x) - sigma * (np.sinh(beta * x) - np.sin(beta * x))
    reached = np.cumsum(phi**2) / (phi**2).sum()
    beyond = 1 - x[np.searchsorted(reached, 0.5)]
    found = describe(STANDING, solve(STANDING, 1), 1).to_dict()
    assert found["half_of_kinetic_in_mass_share"] == pytest.approx(beyond, rel=0.02)
    assert found["participation"] == pytest.approx((phi**2).mean() ** 2 / (phi**4).mean(), rel=0.02)


def test_a_standing_bar_sways_and_twists():
    modes = solve(STANDING, 5)
    said = [describe(STANDING, modes, n + 1).suggested_name for n in range(5)]
    assert said == [
        "whole part sways",
        "whole part sways",
        "whole part sways, 1 still section",
        "whole part sways, 1 still section",
        "whole part twists",
    ]


def test_flat_sheets_by_their_fields():
    """A free rectangular plate: first in four fields (torsion), then three (Leissa's 2-1 and 3-1 node patterns)."""
    plate = design(plate_mesh("quad4", (16, 12), (0.4, 0.3)), thickness=0.002)
    modes = solve(plate, 8)
    facts = [describe(plate, modes, n).to_dict() for n in (7, 8)]
    assert [one["fields"] for one in facts] == [4, 3]
    assert [one["out_of_plane_share"] for one in facts] == pytest.approx([1, 1])
    assert facts[0]["suggested_name"] == "sheet bends in 4 fields"
    slide = describe(plate, modes, 1).to_dict()
    assert slide["flat_sheet"]
    assert slide["fields"] is None
    assert slide["out_of_plane_share"] < 1e-9


def test_rigid_modes_of_a_free_body_at_zero_hertz():
    free = bar()
    modes = solve(free, 7)
    assert modes.freq_hz[:6].max() < 1e-3 * modes.freq_hz[6]
    for n in range(1, 7):
        facts = describe(free, modes, n).to_dict()
        assert facts["rigid_share"] == pytest.approx(1, abs=1e-6)
        assert "moves as one piece" in describe(free, modes, n).sentence
        assert all(share["kinetic_share"] is not None for share in facts["groups"])
    elastic = describe(free, modes, 7)
    assert elastic.to_dict()["rigid_share"] < 1e-6
    assert elastic.suggested_name == "whole part sways, 2 still sections"


def test_on_springs_the_body_moves_as_one_piece_and_springs_hold_the_energy():
    feet = Spring("feet", Selector(group="z0"), stiffness=np.array([1e3] * 3 + [0] * 3))
    soft = bar(springs=(feet,))
    facts = describe(soft, solve(soft, 3), 3).to_dict()
    assert facts["springs_strain_share"]["feet"] > 0.99
    assert facts["effective_share"]["z"] == pytest.approx(1, abs=1e-3)
    assert facts["suggested_name"] == "whole part moves up and down"


def test_without_materials_shares_are_those_of_one_material():
    """Named, marked, and equal to what the true model of one material says; no figure in kg."""
    modes = solve(STANDING, 4)
    bare = Design("bare", STANDING.mesh)
    for n in (1, 4):
        told, true = describe(bare, modes, n).to_dict(), describe(STANDING, modes, n).to_dict()
        assert told["assumed"] == "one uniform material"
        assert told["effective"] is None
        assert told["modal_mass"] is None
        assert told["suggested_name"] == true["suggested_name"]
        assert told["kinetic_share"] == pytest.approx(true["kinetic_share"], abs=1e-9)
        assert told["long_axis"]["bending_share"] == pytest.approx(true["long_axis"]["bending_share"], abs=1e-9)
        assert any("one uniform material assumed" in words for words in told["cautions"])
    assert "shares assume one uniform material" in describe(bare, modes, 1).sentence


def test_sheets_and_lines_without_sizes():
    """A thickness is assumed too; strain energy is then left alone. Not so where solids stand beside sheets."""
    plate = design(plate_mesh("quad4", (8, 6), (0.4, 0.3)), thickness=0.002, supports=(CLAMP,))
    modes = solve(plate, 2).with_(origin="imported", normalisation="unknown")
    told = describe(Design("bare", plate.mesh), modes, 2).to_dict()
    assert told["assumed"] == "one uniform material and one thickness"
    assert told["kinetic_share"]["z"] == pytest.approx(1, abs=1e-3)
    assert told["fields"] == 2
    assert all(group["strain_share"] is None for group in told["groups"])
    mesh = line_mesh(np.outer(np.linspace(0, 1, 20), [0, 0.6, 0.8]))
    section = Section("round", diameter=0.02)
    rod = Design(
        "rod",
        mesh,
        Physics({"steel": STEEL}, (Assignment("*", "steel", section=section, orientation=(1, 0, 0)),), (CLAMP,)),
    )
    shapes = solve(rod, 1).with_(origin="imported")
    told = describe(Design("bare", mesh), shapes, 1).to_dict()
    assert told["assumed"] == "one uniform material and one section"
    assert told["half_of_kinetic_in_mass_share"] < 0.25


def test_points_alone_tell_of_the_functional_point():
    points = Mesh(np.eye(3), (), np.arange(1, 4))
    tip = FunctionalPoint("tip", Selector(nodes=[2]), [0, 1, 0], effect="blur", direction_word="sideways")
    modes = ModeSet(points.node_ids, [5.0], ArrayShapes([[[0, 0, 0], [0, 3.0, 4.0], [0, 0, 10.0]]]))
    found = describe(Design("points", points, points=(tip,)), modes, 1)
    assert found.sentence == "Mode 1: the tip moves sideways, 0.3 of the largest motion."
    assert found.to_dict()["points"][0]["share_of_its_motion"] == pytest.approx(9 / 25)
    assert found.to_dict()["cautions"]
    silent = describe(Design("points", points), modes, 1)
    assert "cannot be said in figures" in silent.sentence
    assert silent.suggested_name is None


def test_real_motion_needs_a_scale():
    tip = FunctionalPoint("tip", Selector(group="z1"), [1, 0, 0])
    told = STANDING.with_(points=(tip,))
    modes = solve(told, 1)
    stated = StatedAmplitude("test", 1, 2e-3, np.array([1.0, 0, 0]), "tip")
    bare = describe(told, modes, 1)
    assert bare.to_dict()["points"][0]["along_real_m"] is None
    scaled = bare.with_scale(scale_mode(told, modes.shape(0), 1, stated))
    assert scaled.to_dict()["points"][0]["along_real_m"] == pytest.approx(2e-3)
    assert "2 mm real" in scaled.sentence
    assert unfounded(scaled.sentence, scaled.to_dict()) == []


def test_the_users_name_wins():
    modes = solve(STANDING, 1)
    bare = describe(STANDING, modes, 1)
    assert bare.sentence.startswith("Mode 1 (suggested name: whole part sways): ")
    named = describe(STANDING.with_(mode_names={1: "mast leans"}), modes, 1)
    assert named.sentence.startswith("Mode 1 (mast leans): ")
    assert named.to_dict()["suggested_name"] == "whole part sways"
    assert bare.with_name("mast leans").sentence == named.sentence


def test_complex_shapes_and_turned_phases():
    modes = solve(STANDING, 4)
    turned = modes.with_(shapes=ArrayShapes(np.stack([modes.shape(i) for i in range(4)]) * np.exp(0.6j)))
    for n in (1, 4):
        told, plain = describe(STANDING, turned, n).to_dict(), describe(STANDING, modes, n).to_dict()
        assert told["suggested_name"] == plain["suggested_name"]
        assert told["kinetic_share"] == pytest.approx(plain["kinetic_share"], abs=1e-9)
        assert told["long_axis"]["still_at"] == pytest.approx(plain["long_axis"]["still_at"], abs=1e-9)


def test_a_heavy_lumped_mass_is_told():
    lump = LumpedMass("block", Selector(group="z1"), 20.0)
    heavy = STANDING.with_(
        physics=Physics(
            STANDING.physics.materials, STANDING.physics.assignments, STANDING.physics.supports, masses=(lump,)
        )
    )
    found = describe(heavy, solve(heavy, 1), 1)
    share = found.to_dict()["lumped_kinetic_share"]["block"]
    assert share > 0.9
    assert f"the block carries {share:.0%} of the kinetic energy" in found.sentence


def test_a_struts_mass_is_part_of_it():
    """Half of a strut at either end; the modes' motion weighs it where it is."""
    strut = Strut("rod", Selector(group="z0"), Selector(group="z1"), 1.0, mass=4.0)
    braced = bar(struts=(strut,))
    modes = solve(braced, 7)
    facts = describe(braced, modes, 7).to_dict()
    bare = STEEL.density * 0.03 * 0.04 * 0.5
    assert effective_masses(braced, modes).whole[0] == pytest.approx(bare + 4.0, rel=1e-9)
    assert facts["lumped_kinetic_share"]["rod"] == pytest.approx(
        energies(braced, modes, [6]).masses.sum() / energies(braced, modes, [6]).total_kinetic[0]
    )
    assert facts["long_axis"]["bending_share"] > 0.99


def test_energies_of_a_set_are_taken_by_mode():
    """Energies of modes 3 and 2, in that order, serve modes 2 and 3 and no other."""
    modes = solve(STANDING, 3)
    some = energies(STANDING, modes, [2, 1])
    for n in (1, 2, 3):
        told, own = describe(STANDING, modes, n, some).to_dict(), describe(STANDING, modes, n).to_dict()
        assert told["participation"] == pytest.approx(own["participation"], rel=1e-9)


def test_a_mode_that_is_not_there():
    modes = solve(STANDING, 1)
    for number in (0, 2):
        with pytest.raises(InputError, match="has no mode"):
            describe(STANDING, modes, number)
