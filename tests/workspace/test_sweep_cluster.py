"""The same sweep through a cluster's executor as through processes of this machine (extra ``sweep``)."""

from __future__ import annotations

import numpy as np
import pytest

from tests.mechanics.models import CLAMP, design
from tests.meshes import plate_mesh
from viewer.model.variation import Variation
from viewer.workspace import Workspace
from viewer.workspace.store import Cache
from viewer.workspace.sweep import sweep

distributed = pytest.importorskip("distributed", reason="needs the extra sweep: pip install hingelight[sweep]")

VALUES = (0.001, 0.002, 0.003)


def test_a_local_cluster_solves_what_this_machine_solves(tmp_path):
    model = design(plate_mesh("quad4", (8, 4), (0.3, 0.1)), thickness=0.002, supports=(CLAMP,))
    variation = Variation("thickness", "*")
    here = sweep(Workspace(cache=None), model, variation, VALUES, 4)
    cluster = distributed.LocalCluster(
        n_workers=1, threads_per_worker=1, dashboard_address=None, local_directory=str(tmp_path / "scratch")
    )
    workspace = Workspace(Cache(tmp_path / "cache"))
    with cluster, distributed.Client(cluster) as client:
        there = sweep(workspace, model, variation, VALUES, 4, executor=client.get_executor())
    for one, two in zip(here.modes, there.modes, strict=True):
        assert two.freq_hz == pytest.approx(one.freq_hz, rel=1e-9)
    assert [line.modes for line in there.lineage.lines] == [line.modes for line in here.lineage.lines]
    assert len(list((tmp_path / "cache").rglob("*.npz"))) == len(
        VALUES
    )  # the parent has kept what the cluster solved
    again = sweep(workspace, model, variation, VALUES, 4)  # without the cluster: from the cache
    assert np.array_equal(again.modes[0].shape(0), there.modes[0].shape(0))
