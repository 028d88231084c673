"""A small hammer test in memory, and its files: tables, universal files written by pyuff."""

from __future__ import annotations

import numpy as np
import pyuff

from viewer.model.testset import TestSet

ROOT_HALF = np.sqrt(0.5)


def small_test(is_complex: bool = False, oblique: bool = False) -> TestSet:
    """Five points in a room; shapes with six digits, so that a universal file holds them whole."""
    random = np.random.default_rng(5)
    directions = [[1, 0, 0], [0, -1, 0], [0, 0, 1], [0, 0, -1], [0, 1, 0], [1, 0, 0], [0, 0, 1]]
    if oblique:
        directions[3:5] = [[ROOT_HALF, -ROOT_HALF, 0], [0, 0, -1]]
    sensor = [0, 0, 0, 1, 1, 2, 4]
    shapes = np.round(random.uniform(-1, 1, (3, 7)), 5)
    if is_complex:
        shapes = shapes + 1j * np.round(random.uniform(-0.3, 0.3, (3, 7)), 5)
    return TestSet(
        "small",
        ("1", "2", "30", "4", "77"),
        np.round(random.uniform(0, 2, (5, 3)), 4),
        [[0, 1], [1, 2], [2, 4]],
        sensor,
        directions,
        [12.5, 20.25, 31.0],
        shapes,
        [0.01, 0.02, 0.015],
    )


def as_pyuff(path, test: TestSet, *, nodes: int = 15, length: float = 1000.0, runs=None):
    """The test written by pyuff, in thousandths of a metre; ``runs``: lists of channels, a data set each and mode."""
    labels = [int(label) for label in test.labels]
    zero = np.zeros(len(labels), int)
    x, y, z = (test.points * length).T
    prepare = {15: pyuff.prepare_15, 2411: pyuff.prepare_2411}[nodes]
    sets = [
        pyuff.prepare_164(
            units_code=9, units_description="mm", temp_mode=1, length=length, force=1.0, temp=1.0, temp_offset=0.0
        ),
        prepare(node_nums=labels, def_cs=zero, disp_cs=zero, color=zero, x=x, y=y, z=z),
    ]
    for a, b in test.lines.tolist():
        sets.append(
            pyuff.prepare_82(trace_num=1, n_nodes=2, color=0, id="a line", nodes=np.array([labels[a], labels[b]]))
        )
    for channels in runs or [range(test.n_channels)]:
        sets += [_mode(test, index, labels, list(channels)) for index in range(test.count)]
    file = pyuff.UFF(str(path))
    for number, item in enumerate(sets):
        file.write_sets(item, "overwrite" if number == 0 else "add")
    return path


def _mode(test: TestSet, index: int, labels: list[int], channels: list[int]) -> dict:
    values = np.zeros((len(labels), 3), test.shapes.dtype)
    for channel in channels:
        axis = int(np.abs(test.directions[channel]).argmax())
        values[test.sensor[channel], axis] = test.shapes[index, channel] * test.directions[channel, axis]
    rows = np.unique(test.sensor[channels])
    freq, ratio = float(test.freq_hz[index]), float(test.damping[index])
    omega = 2 * np.pi * freq
    own = (
        {"analysis_type": 3, "eig": complex(-ratio * omega, omega * np.sqrt(1 - ratio**2)), "data_type": 5}
        if test.is_complex
        else {"analysis_type": 2, "freq": freq, "modal_damp_vis": ratio, "data_type": 2}
    )
    return pyuff.prepare_55(
        model_type=1,
        data_ch=2,
        spec_data_type=8,
        load_case=1,
        mode_n=index + 1,
        node_nums=[labels[row] for row in rows],
        r1=values[rows, 0],
        r2=values[rows, 1],
        r3=values[rows, 2],
        n_data_per_node=3,
        **own,
    )


def same(a: TestSet, b: TestSet, tolerance: float = 1e-12) -> None:
    """Both say the same: equal channels up to their order and sign, equal motion."""
    assert a.labels == b.labels
    np.testing.assert_allclose(a.points, b.points, rtol=0, atol=1e-12)
    assert {frozenset(line) for line in a.lines.tolist()} == {frozenset(line) for line in b.lines.tolist()}
    np.testing.assert_allclose(a.freq_hz, b.freq_hz, rtol=max(tolerance, 1e-12))
    np.testing.assert_allclose(a.damping, b.damping, rtol=0, atol=tolerance)
    assert a.is_complex == b.is_complex and a.n_channels == b.n_channels
    for channel in range(a.n_channels):
        along = (b.sensor == a.sensor[channel]) * (b.directions @ a.directions[channel])
        partner = int(np.abs(along).argmax())
        assert abs(along[partner]) > 1 - 1e-9
        other = b.shapes[:, partner] * np.sign(along[partner])
        np.testing.assert_allclose(a.shapes[:, channel], other, rtol=0, atol=tolerance)
