"""The collection is as large as it promises, and fifteen parts score as committed."""

from __future__ import annotations

from dataclasses import asdict

import pytest

from tests.collection import score, statics
from tests.collection.parts import SEED, VERSION
from tests.collection.registry import GROUPS, SCORED, parts_of
from tests.collection.scoring import score as score_part
from tests.collection.solved import solved

# Small, of every kind of cell that solves fast, most of them without hinges in most of their modes.
FIXED = (
    "even-0-quad4", "even_angle-0-quad4", "stepped-0-quad4", "groove-0-quad4", "groove-2-tri3", "root_groove-0-quad4",
    "arc_groove-0-quad4", "square_neck-0-quad4", "groove-3-hex8", "even_taper-2-quad4", "even_cone-0-quad4",
    "even_saddle-0-quad4", "doubler-1-hex8", "saddle_groove-1-quad4", "twisted-0-quad4",
)  # fmt: skip
# Parts of the scored half whose stiffness is not judged. Curved bands have no static solution at all.
UNSETTLED = {"louvre-2-hex20": "its groove begins in the bend; the last halving of the cells still moves it by 5.4 %"}
PARTS = {p.name: p for group in GROUPS for p in parts_of(group)}


def test_the_committed_table_is_of_this_generator_and_large_enough():
    first, rows = score.read_table()
    assert first == f"# seed {SEED}, generator version {VERSION}"
    assert {r["part"] for r in rows} == set(PARTS) and len(PARTS) >= 60
    free = {(r["part"], r["mode"]) for r in rows if r["free"] == "1" and r["density"] == "1"}
    assert len(free) >= 150
    scored = {p.name for group in SCORED for p in parts_of(group)}
    coarse = [r for r in rows if r["density"] == "1" and r["part"] in scored and r["kind"] != "joint"]
    assert sum(r["level"] == "strong" for r in coarse) >= 40
    assert len([f for f in free if f[0] in scored]) >= 100
    assert len({f for f in free if f[0] in FIXED}) >= 40


def test_every_stiffness_of_the_scored_half_is_judged_against_a_settled_truth():
    scored = {p.name for group in SCORED for p in parts_of(group)}
    rows = [r for r in score.read_table()[1] if r["density"] == "1" and r["part"] in scored]
    unsettled = set()
    for row in rows:
        if row["level"] == "strong" and row["kind"] == "line":
            assert row["settled"] != ""
            if abs(float(row["settled"])) > statics.SETTLED:
                unsettled.add(row["part"])
            else:
                # The mesh of the modes itself is about as near: what is judged is the search, not the mesh.
                assert abs(float(row["mesh"])) <= 1.1 * statics.SETTLED
    assert unsettled == set(UNSETTLED)


@pytest.mark.parametrize("name", FIXED)
def test_parts_score_as_committed(name):
    rows = score.read_table()[1]
    committed = [r for r in rows if r["part"] == name and r["density"] == "1"]
    fresh = [{k: str(score.cell(v)) for k, v in asdict(row).items()} for row in score_part(solved(PARTS[name]))]
    assert len(fresh) == len(committed) > 0
    for new, old in zip(fresh, committed, strict=True):
        for key in ("mode", "band", "kind", "level", "found", "hit", "free", "false", "idle"):
            assert new[key] == old[key], f"{key} of mode {new['mode']}, band {new['band']}"
        # Solvers differ in the last digits from one machine to the next; bounds of position and angle are absolute.
        for key, bound in (
            ("position", 1e-3),
            ("direction", 0.2),
            ("axis", 0.2),
            ("fold", 0.01),
            ("stiffness", 0.01),
        ):
            assert (new[key] == "") == (old[key] == ""), key
            assert new[key] == "" or abs(float(new[key]) - float(old[key])) <= bound, key
        for key in ("freq_hz", "share", "contrast"):
            assert new[key] == old[key] or float(new[key]) == pytest.approx(float(old[key]), rel=0.01, abs=1e-4), key
