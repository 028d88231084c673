"""Close modes mixed as a test shows them."""

import pickle

import numpy as np
import pytest

from tests.scene.hammered import FACTOR, analysis, hammered, placed, plate, rows
from viewer.insight.correlate import mac
from viewer.insight.hammer_pairing import correlate_test
from viewer.scene.hammer_picture import over_picture
from viewer.scene.motion import displacement
from viewer.workspace.mixed import mixed

ANALYSIS = np.array([analysis(mode) for mode in range(1, 5)])
TURN = np.array([[0.6, 0.8], [-0.8, 0.6]])  # of modes 2 and 3 of the plate, taken as equal in frequency
HZ = plate().modes.freq_hz[[0, 1, 1, 3]]


def shown(**changes):
    """The plate's test, its modes 2 and 3 another mixture of the plate's."""
    shapes = FACTOR * ANALYSIS.astype(complex)
    shapes[1:3] = FACTOR * TURN @ ANALYSIS[1:3]
    return hammered(shapes=shapes, **changes)


@pytest.fixture(scope="module")
def pairs():
    found = correlate_test(shown(), ANALYSIS, HZ, design="plate").paired
    assert [len(pair.mixture) for pair in found] == [1, 2, 2, 1]
    return found


def test_the_mixture_moves_as_the_test_does(pairs):
    pair = pairs[1]
    study, along = mixed(plate(), pair.analysis, pair.mixture, ANALYSIS)
    assert mac(shown().shapes[1], along)[0, 0] == pytest.approx(1, abs=1e-9)
    assert mac(shown().shapes[1], ANALYSIS[pair.analysis - 1])[0, 0] < 0.95  # the partner alone does not
    picture = over_picture(study, pair.analysis, placed(shapes=shown().shapes), 2, along)
    (body,) = picture.bodies
    drawn = displacement(body.traces[0].motion, body.factor, 0.0)
    assert drawn == pytest.approx(body.factor * body.shape[list(rows())], abs=1e-9)
    assert "analysis modes 2 and 3 mixed as the test shows them" in picture.note.condition
    assert body.standing


def test_a_mode_alone_and_the_other_modes_stay_as_they_are(pairs):
    study, along = mixed(plate(), 1, pairs[0].mixture, ANALYSIS)
    assert study is plate()
    assert np.array_equal(along, ANALYSIS[0])
    study, _ = mixed(plate(), 2, pairs[1].mixture, ANALYSIS)
    assert np.array_equal(study.modes.shape(0), plate().modes.shape(0))
    assert not np.allclose(study.modes.shape(1), plate().modes.shape(1))
    assert study.energies is None
    assert study.modal_mass(1) is None


def test_what_is_drawn_can_be_sent_to_another_process(pairs):
    study, _ = mixed(plate(), 2, pairs[1].mixture, ANALYSIS)
    again = pickle.loads(pickle.dumps(study.modes))
    assert np.array_equal(again.shape(1), study.modes.shape(1))
