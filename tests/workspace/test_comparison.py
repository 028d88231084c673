"""Two studies compared: pairs by shape, pairs that the dossier states, and the partner of one mode."""

from __future__ import annotations

import pytest

from tests.integration.small_dossier import FIRST, SECOND, write_small
from tests.sentences import unfounded
from viewer.errors import InputError
from viewer.workspace import Workspace
from viewer.workspace.comparison import BY_SHAPE, STATED, compare, partner


@pytest.fixture(scope="module")
def opened(tmp_path_factory):
    folder = write_small(tmp_path_factory.mktemp("pair"))
    return Workspace(cache=None).open(folder)


@pytest.fixture(scope="module")
def studies(opened):
    return opened.study(FIRST, 3), opened.study(SECOND, 3)


def test_pairs_by_shape(studies):
    found = compare(*studies)
    assert [(p.first, p.second) for p in found.pairing.pairs] == [(1, 1), (2, 2), (3, 3)]
    facts = found.to_dict()
    assert {each["paired_by"] for each in facts["outcomes"]} == {BY_SHAPE}
    for outcome in found.outcomes:
        assert not unfounded(outcome.sentence, outcome.to_dict())
    assert not unfounded(found.sentence, found.pairing.to_dict())
    assert found.pairing.pairs[0].first_hz == pytest.approx(float(studies[0].modes.freq_hz[0]))


def test_stated_pairs_stand_and_what_loses_its_partner_has_none(studies):
    found = compare(*studies, [(1, 2)], explain=False)
    kinds = [(p.kind, p.first, p.second) for p in found.pairing.pairs]
    assert kinds[0] == ("paired", 1, 2)
    assert kinds[1][1:] == (2, None) and kinds[1][0] in ("vanished", "beyond")
    assert kinds[2] == ("paired", 3, 3)
    assert kinds[3][1:] == (None, 1)
    assert [found.paired_by(o) for o in found.outcomes][:3] == [STATED, BY_SHAPE, BY_SHAPE]
    assert found.pairing.pairs[0].mac == pytest.approx(found.pairing.matrix[0, 1])


def test_both_ways_round(studies):
    there, back = compare(*studies, explain=False), compare(*reversed(studies), explain=False)
    assert there.pairing.matrix == pytest.approx(back.pairing.matrix.T, abs=0.02)
    assert [(p.first, p.second) for p in back.pairing.pairs] == [(p.second, p.first) for p in there.pairing.pairs]


def test_the_partner_of_one_mode(opened, studies):
    assert partner(opened, studies[0], 2, studies[1]) == 2
    with pytest.raises(InputError, match="mode 9"):
        partner(opened, studies[0], 9, studies[1])
