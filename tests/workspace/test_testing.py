"""A test beside a design, from the dossier: what is found, what is accepted, what is refused."""

from __future__ import annotations

import numpy as np
import pytest

from tests.integration.tested_dossier import FLIPPED, MEASURED, WORKSHOP, write_square, write_tested
from tests.sentences import unfounded
from viewer.errors import InputError, RefusedError
from viewer.loaders import write_test_changes
from viewer.workspace import Workspace
from viewer.workspace.testing import with_accepted


@pytest.fixture(scope="module")
def path(tmp_path_factory):
    return write_tested(tmp_path_factory.mktemp("tested"))


@pytest.fixture(scope="module")
def study(path):
    return Workspace(cache=None).open(path).test("hammer")


def test_the_test_is_laid_where_it_was_made(study):
    found = study.registration
    assert found.settled and found.used.all() and not found.far
    np.testing.assert_allclose(found.placement.rotation, WORKSHOP.rotation, atol=1e-3)
    np.testing.assert_allclose(found.placement.shift, WORKSHOP.shift, atol=1e-3)


def test_the_true_pairs_are_found(study):
    pairs = [(p.test, p.analysis) for p in study.correlation().paired]
    assert pairs == [(n, n) for n in range(1, MEASURED + 1)]
    changes = [p.to_dict()["change_percent"] for p in study.correlation().paired]
    np.testing.assert_allclose(changes, 100 * (1 / 0.97 - 1), rtol=1e-3)
    assert study.study.count == 2 * MEASURED


def test_the_flipped_channel_is_proposed_and_once_accepted_recorded(path, study, tmp_path):
    (proposal,) = study.faults().proposals
    assert (proposal.correction.kind, proposal.correction.point) == ("flip", FLIPPED)
    copy = tmp_path / "dossier.toml"
    for file in path.parent.iterdir():
        (tmp_path / file.name).write_bytes(file.read_bytes())
    write_test_changes(copy, "hammer", corrections=with_accepted(study, [1]))
    again = Workspace(cache=None).open(copy).test("hammer")
    assert again.corrected == (f"point {FLIPPED}, +Z: sign flipped",)
    assert "corrected as the dossier says" in " ".join(again.cautions)
    assert not again.faults().proposals
    assert min(p.mac for p in again.correlation().paired) > max(0.97, min(p.mac for p in study.correlation().paired))
    with pytest.raises(InputError, match="no correction 1 is proposed"):
        with_accepted(again, [1])


def test_every_sentence_has_its_numbers(study):
    told = study.explain()
    assert set(told.findings) == {"correlation", "registration", "faults", "points", "expansion"}, told.refused
    for finding in told.findings.values():
        assert not unfounded(finding.sentence, finding.to_dict()), finding.sentence


def test_the_expanded_shape_is_the_mode(study):
    spread = study.expansion().modes
    for index in range(MEASURED):
        true, got = study.study.modes.shape(index).ravel(), spread.shape(index).ravel()
        assert abs(true @ got) ** 2 / (true @ true) / (got @ got) > 0.98
    hinges = study.expanded().hinges(0)
    assert any("expanded" in words for words in hinges.to_dict()["cautions"])


def test_modes_of_a_tested_design_are_those_of_an_untested_one(path, tmp_path):
    """Solving for more modes at once changes nothing about the first ones."""
    plain = tmp_path / "dossier.toml"
    (tmp_path / "channel.vtu").write_bytes((path.parent / "channel.vtu").read_bytes())
    plain.write_text(path.read_text().partition("[[tests]]")[0])
    with_test, without = (Workspace(cache=None).open(p).modes("channel") for p in (path, plain))
    assert with_test.count == without.count == 4
    np.testing.assert_allclose(with_test.freq_hz, without.freq_hz, rtol=1e-8)
    for index in range(4):
        scale = np.abs(without.shape(index)).max()
        np.testing.assert_allclose(with_test.shape(index), without.shape(index), atol=1e-6 * scale)


def test_an_open_placement_is_refused_with_lines_that_settle_it(tmp_path):
    path = write_square(tmp_path / "square")
    found = Workspace(cache=None).open(path).test("hammer")
    assert len(found.registration.alternatives) == 7
    with pytest.raises(RefusedError, match="placement = ") as refused:
        found.correlation()
    line = refused.value.do.split("[3] ")[1].split(": ", 1)[1].split(";")[0]
    path.write_text(path.read_text() + line + "\n")
    again = Workspace(cache=None).open(path).test("hammer")
    assert again.registration.how == "stated placement" and again.registration.settled
    third = found.registration.alternatives[1].placement
    np.testing.assert_allclose(again.registration.placement.rotation, third.rotation, atol=1e-8)
    np.testing.assert_allclose(again.registration.placement.shift, third.shift, atol=1e-6)
    assert len(again.correlation().pairs) >= MEASURED


def test_a_test_that_is_not_there(path):
    with pytest.raises(InputError, match="no test named 'anvil'"):
        Workspace(cache=None).open(path).test("anvil")
