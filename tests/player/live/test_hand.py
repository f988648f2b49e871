"""The layers of all hands together."""

import numpy as np
import pytest

from player.inputs.events import Begin, End, Silent, Wanted
from player.live.hand import MOST_PLAYING, Hand

STROKE = np.array([0.2, 0.4])


def ramp(event):
    """A phrase: a share that rises to 1 in a second, over after two."""
    return lambda gone_s: (np.full(2, min(1.0, gone_s)), gone_s > 2.0)


@pytest.fixture
def hand():
    return Hand(STROKE, ramp)


def wanted(fibers, stroke, how="takes"):
    return Wanted("box", 0.0, fibers, stroke, how)


def test_an_untouched_hand_leaves_the_score_as_it_is(hand):
    assert hand.over(np.array([0.1, 0.2])).tolist() == [0.1, 0.2] and not hand.touched.any()


def test_takes_scales_and_adds_are_laid_over_a_score_in_this_order(hand):
    hand.take(wanted((0,), 0.5))
    hand.take(wanted((0, 1), 0.5, "scales"))
    hand.take(wanted((1,), 0.25, "adds"))
    assert hand.over(np.array([0.2, 0.2])) == pytest.approx([0.05, 0.2])
    assert hand.touched.tolist() == [True, True]


def test_the_newest_hand_counts_and_hands_that_let_go_give_the_score_its_fibers_back(hand):
    hand.take(wanted((0,), 0.5))
    hand.take(wanted((0,), 0.75))
    assert hand.over(np.zeros(2))[0] == pytest.approx(0.15)
    hand.release()
    assert hand.over(np.full(2, 0.1)).tolist() == [0.1, 0.1]


def test_fibers_of_a_silent_source_are_to_rest_until_a_hand_takes_them_again(hand):
    hand.take(wanted((0, 1), 0.5))
    hand.take(Silent("box", 1.0, (0,), "box: gone"))
    assert hand.to_rest.tolist() == [True, False] and hand.over(np.zeros(2))[1] == pytest.approx(0.2)
    hand.tick(2.0, np.zeros(2))
    assert hand.to_rest.tolist() == [True, False]
    hand.take(wanted((0,), 0.1))
    assert not hand.to_rest.any()


def test_a_phrase_begins_at_its_moment_scaled_by_velocity_and_gives_back_when_over(hand):
    hand.take(Begin("box", 5.0, "ramp", (1,), 0.5, ("k",)))
    hand.tick(4.9, np.zeros(2))
    assert hand.over(np.zeros(2)).tolist() == [0.0, 0.0]
    hand.tick(5.0, np.zeros(2))
    hand.tick(5.5, np.zeros(2))
    assert hand.over(np.zeros(2)) == pytest.approx([0.0, 0.5 * 0.5 * 0.4])
    hand.tick(7.1, np.zeros(2))
    assert hand.over(np.full(2, 0.1)).tolist() == [0.1, 0.1] and not hand.touched.any()


def test_a_key_let_go_with_rest_brings_its_fibers_down_and_then_gives_them_back(hand):
    hand.take(Begin("box", 0.0, "ramp", (0, 1), 1.0, ("k",)))
    hand.tick(0.0, np.zeros(2))
    hand.tick(0.5, np.array([0.1, 0.2]))
    hand.take(End("box", 0.5, ("k",), (0, 1), True))
    assert hand.to_rest.all()
    hand.tick(0.6, np.array([0.0, 0.1]))
    assert hand.to_rest.tolist() == [False, True]


def test_a_key_let_go_without_rest_lets_its_phrase_end_by_itself(hand):
    hand.take(Begin("box", 0.0, "ramp", (0,), 1.0, ("k",)))
    hand.tick(0.0, np.zeros(2))
    hand.take(End("box", 0.1, ("k",), (0,), False))
    hand.tick(0.75, np.zeros(2))
    assert hand.over(np.zeros(2))[0] == pytest.approx(0.15)


def test_a_key_let_go_with_rest_before_its_phrase_began_keeps_it_from_beginning(hand):
    hand.take(Begin("box", 5.0, "ramp", (0,), 1.0, ("k",)))
    hand.take(End("box", 1.0, ("k",), (0,), True))
    hand.tick(6.0, np.zeros(2))
    assert not hand.touched.any()


def test_a_fader_takes_fibers_from_a_phrase_and_the_phrase_keeps_the_others(hand):
    hand.take(Begin("box", 0.0, "ramp", (0, 1), 1.0, ("k",)))
    hand.tick(0.0, np.zeros(2))
    hand.take(wanted((0,), 0.9))
    hand.tick(0.5, np.zeros(2))
    assert hand.over(np.zeros(2)) == pytest.approx([0.18, 0.2])


def test_however_many_phrases_are_begun_so_many_play_at_most(hand):
    for number in range(3 * MOST_PLAYING):
        hand.take(Begin("box", 0.0, "ramp", (number % 2,), 1.0, (number,), "adds", bind=number))
        hand.tick(0.01 * number, np.zeros(2))
    assert len(hand.binds_playing) <= MOST_PLAYING
