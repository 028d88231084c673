"""The cache: keys follow content, entries are plain, damage counts as missing, the cap holds."""

from __future__ import annotations

import os
from dataclasses import replace

import numpy as np
import pytest

from tests.meshes import plate_mesh
from viewer.model.design import Assignment, Design, Material, Physics, Selector, Support
from viewer.model.modes import ArrayShapes, ModeSet
from viewer.workspace import Cache, Workspace
from viewer.workspace.keys import design_key
from viewer.workspace.store import read_modes_npz, write_modes_npz

STEEL = Material("steel", 210e9, 0.3, 7850.0)


def design() -> Design:
    physics = Physics({"steel": STEEL}, (Assignment("*", "steel", 2e-3),), (Support("root", Selector(group="x0")),))
    return Design("plate", plate_mesh("quad4", (6, 3), (0.3, 0.1)), physics)


def mode_set(count: int = 3) -> ModeSet:
    rng = np.random.default_rng(1)
    return ModeSet(
        np.arange(10, 15),
        np.array([1.0, 2.0, 2.0])[:count],
        ArrayShapes(rng.normal(size=(count, 5, 3)), rng.normal(size=(count, 5, 3))),
        np.full(count, 0.01),
        "mass",
        "computed",
        "somewhere",
    )


def test_key_follows_what_decides_the_solution():
    base = design()
    key = design_key(base, 6)
    assert key == design_key(design(), 6)
    assert key == design_key(base.with_(name="other", note="x", mode_names={1: "nods"}), 6)
    moved = base.mesh.points.copy()
    moved[3, 2] += 1e-9
    physics = base.physics
    others = [
        design_key(base, 7),
        design_key(base.with_(mesh=base.mesh.with_(points=moved)), 6),
        design_key(base.with_(physics=replace(physics, materials={"steel": replace(STEEL, density=7851.0)})), 6),
        design_key(base.with_(physics=replace(physics, assignments=(Assignment("*", "steel", 2.1e-3),))), 6),
        design_key(base.with_(physics=replace(physics, supports=(Support("r", Selector(group="x0"), ("uz",)),))), 6),
        design_key(base.with_(physics=replace(physics, supports=())), 6),
    ]
    assert len({key, *others}) == len(others) + 1


def test_round_trip_keeps_everything(tmp_path):
    modes = mode_set()
    again = read_modes_npz(write_modes_npz(tmp_path / "a.npz", modes))
    assert (again.freq_hz == modes.freq_hz).all() and (again.damping == modes.damping).all()
    assert (again.node_ids == modes.node_ids).all()
    for i in range(3):
        assert (again.shape(i) == modes.shape(i)).all() and (again.rotations(i) == modes.rotations(i)).all()
    assert (again.normalisation, again.origin, again.source) == ("mass", "computed", "somewhere")


def test_damaged_entry_counts_as_missing(tmp_path):
    cache = Cache(tmp_path)
    write_modes_npz(cache.path("k"), mode_set())
    whole = cache.path("k").read_bytes()
    for cut in (0, 10, len(whole) // 2, len(whole) - 5):
        cache.path("k").write_bytes(whole[:cut])
        assert cache.get("k") is None
        assert not cache.path("k").exists()


def test_cap_drops_the_least_recently_used(tmp_path):
    cache = Cache(tmp_path)
    for age, key in enumerate("abc"):
        write_modes_npz(cache.path(key), mode_set())
        os.utime(cache.path(key), (1e9 - age, 1e9 - age))
    size = cache.path("a").stat().st_size
    Cache(tmp_path, size_cap=2 * size + 1).trim()
    assert sorted(p.stem for p in tmp_path.glob("*.npz")) == ["a", "b"]


def test_second_workspace_takes_the_solution_from_disk(tmp_path, monkeypatch):
    first = Workspace(Cache(tmp_path)).solve(design(), 4)
    import viewer.workspace.workspace as module

    def never(*_):
        pytest.fail("solved again")

    monkeypatch.setattr(module, "solve", never)
    second = Workspace(Cache(tmp_path)).solve(design(), 4)
    assert all((first.shape(i) == second.shape(i)).all() for i in range(4))
