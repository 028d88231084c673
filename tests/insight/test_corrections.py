"""Corrections of a test: what they do to its readings, and what they refuse."""

from __future__ import annotations

import numpy as np
import pytest

from viewer.errors import InputError
from viewer.insight.corrections import apply_corrections, correction_words, fault_words
from viewer.model.testset import Correction, TestSet


def small(**changes) -> TestSet:
    """Point a along +X, +Y, −Z; b along +X, +Y, +Z; c along −Z only; d without a channel. Each reads its number."""
    given = {
        "name": "small",
        "labels": ("a", "b", "c", "d"),
        "points": np.arange(12.0).reshape(4, 3),
        "lines": [[0, 1]],
        "sensor": [0, 0, 0, 1, 1, 1, 2],
        "directions": [[1, 0, 0], [0, 1, 0], [0, 0, -1], [1, 0, 0], [0, 1, 0], [0, 0, 1], [0, 0, -1]],
        "freq_hz": [10.0, 20.0],
        "shapes": np.arange(7.0)[None] + np.array([[1.0], [11.0]]),
    }
    return TestSet(**{**given, **changes})


def readings(*corrections: Correction, test: TestSet | None = None) -> list[float]:
    made = apply_corrections(test or small(), corrections)
    assert made.corrections == corrections
    return made.shapes[0].tolist()


def test_a_flip_turns_one_channel_or_all_of_a_point():
    assert readings(Correction("flip", "a", "z")) == [1, 2, -3, 4, 5, 6, 7]
    assert readings(Correction("flip", "b")) == [1, 2, 3, -4, -5, -6, 7]


def test_axes_of_one_point_change_places():
    assert readings(Correction("swap axes", "b", "x", "z")) == [1, 2, 3, 6, 5, 4, 7]


def test_two_points_exchange_what_was_read_along_the_nearest_directions():
    assert readings(Correction("move", "a", other="b")) == [4, 5, 6, 1, 2, 3, 7]


def test_a_channel_without_counterpart_goes_along_with_its_direction():
    made = apply_corrections(small(), [Correction("move", "a", other="c")])
    assert made.shapes[0].tolist() == [1, 2, 7, 4, 5, 6, 3]
    assert made.sensor.tolist() == [2, 2, 0, 1, 1, 1, 2]
    assert made.directions.tolist() == small().directions.tolist()


def test_a_point_goes_to_a_place_and_its_readings_stay_its_own():
    made = apply_corrections(small(), [Correction("move", "c", position=(9.0, 8.0, 7.0))])
    assert made.points[2].tolist() == [9, 8, 7] and made.points[0].tolist() == [0, 1, 2]
    assert made.shapes.tolist() == small().shapes.tolist()


def test_what_is_left_out_loses_its_channels_and_the_point_stays():
    made = apply_corrections(small(), [Correction("leave out", "a", "y"), Correction("leave out", "b")])
    assert made.shapes[0].tolist() == [1, 3, 7] and made.sensor.tolist() == [0, 0, 2]
    assert made.labels == small().labels


def test_corrections_are_made_in_their_order_and_undo_themselves():
    both = (Correction("swap axes", "a", "x", "y"), Correction("flip", "a", "x"))
    assert readings(*both) == [-2, 1, 3, 4, 5, 6, 7]
    assert readings(*both[::-1]) == [2, -1, 3, 4, 5, 6, 7]
    for one in (both[0], both[1], Correction("move", "a", other="b"), Correction("move", "a", other="c")):
        again = apply_corrections(small(), [one, one])
        assert again.shapes.tolist() == small().shapes.tolist() and again.sensor.tolist() == small().sensor.tolist()


def test_the_test_given_is_left_as_it_was():
    test, before = small(), small().shapes.tolist()
    apply_corrections(test, [Correction("flip", "a")])
    assert test.shapes.tolist() == before and test.corrections == ()


def test_complex_readings_stay_complex():
    made = apply_corrections(small(shapes=(1 + 2j) * small().shapes), [Correction("flip", "a", "x")])
    assert made.shapes[0, 0] == -1 - 2j and made.shapes[0, 1] == 2 + 4j


@pytest.mark.parametrize(
    ("wrong", "said"),
    [
        (Correction("flip", "e"), "point e"),
        (Correction("flip", "c", "x"), "along 'x'"),
        (Correction("flip", "d"), "no channel on this point"),
        (Correction("leave out", "c", "y"), "along 'y'"),
        (Correction("swap axes", "a", "x", "x"), "with itself"),
        (Correction("swap axes", "a", "x"), "3 channels"),
        (Correction("swap axes", "c", "z", "x"), "along 'x'"),
        (Correction("move", "a", other="a"), "with itself"),
        (Correction("move", "a", other="e"), "point e"),
        (Correction("move", "a"), "not said where"),
        (Correction("move", "a", position=(0.0, float("nan"), 0.0)), "not said where"),
    ],
)
def test_points_and_axes_that_are_not_there_are_refused(wrong, said):
    with pytest.raises(InputError, match="test 'small'") as refused:
        apply_corrections(small(), [wrong])
    assert said in str(refused.value)


def test_words_name_the_channel_as_it_was_measured():
    test = small()
    assert correction_words(Correction("flip", "a", "z"), test) == "point a, −Z: sign flipped"
    assert correction_words(Correction("flip", "a", "z")) == "point a, Z: sign flipped"
    assert correction_words(Correction("flip", "a"), test) == "point a: sign flipped"
    assert correction_words(Correction("swap axes", "b", "x", "z"), test) == "point b, +X and +Z: axes exchanged"
    assert correction_words(Correction("move", "a", other="b"), test) == "points a and b: readings exchanged"
    assert correction_words(Correction("move", "a", position=(1.0, 2.0, 3.0)), test) == "point a: in the wrong place"
    assert correction_words(Correction("leave out", "c"), test) == "point c: left out"
    assert fault_words(Correction("leave out", "c"), test) == "point c: reads nothing"
    assert fault_words(Correction("flip", "a", "z"), test) == "point a, −Z: sign flipped"
