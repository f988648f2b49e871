import numpy as np
import pytest

from player.governor import ADDS, ALONE, SCALES, TAKES, mixed

SCORE, STROKE = np.array([0.1, 0.2]), np.array([0.3, 0.4])


def mix(hand, way):
    return mixed(SCORE, np.array(hand), np.full(2, way, dtype=np.int8), STROKE)


def test_a_hand_that_takes_stands_in_the_scores_place_as_a_share_of_stroke():
    assert mix([0.5, 1.0], TAKES) == pytest.approx([0.15, 0.4])


def test_a_hand_that_adds_adds_a_share_of_stroke():
    assert mix([0.5, -0.25], ADDS) == pytest.approx([0.25, 0.1])


def test_a_hand_that_scales_is_a_factor():
    assert mix([0.5, 2.0], SCALES) == pytest.approx([0.05, 0.4])


def test_a_fiber_without_a_hand_follows_the_score():
    assert mix([0.5, 0.5], ALONE) == pytest.approx(SCORE)


@pytest.mark.parametrize("way", [TAKES, ADDS, SCALES])
def test_a_hand_that_has_said_nothing_leaves_the_score_alone(way):
    assert mix([np.nan, np.nan], way) == pytest.approx(SCORE)


def test_each_fiber_has_its_own_way():
    way = np.array([ADDS, SCALES], dtype=np.int8)
    assert mixed(SCORE, np.array([0.5, 0.5]), way, STROKE) == pytest.approx([0.25, 0.1])
