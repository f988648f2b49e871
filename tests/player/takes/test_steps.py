"""Takes that were played in steps."""

import numpy as np

from composer.shapes import NAMES
from player.takes.fewest import Path
from player.takes.steps import tolerance_for_steps


def path(ways, lasts_s, shape="smooth"):
    share = np.concatenate([[0.0], np.cumsum(ways)])
    time_s = np.concatenate([[0.0], np.cumsum(np.full(len(ways), lasts_s))])
    return Path(np.arange(len(share)), time_s, share, np.full(len(ways), NAMES.index(shape), dtype=np.int8))


def test_quick_moves_and_sudden_ones_are_steps_and_a_little_more_than_half_of_one_is_the_tolerance():
    stairs = [0.05] * 10
    assert tolerance_for_steps([path(stairs, 0.02)]) == 0.03
    assert tolerance_for_steps([path(stairs, 0.4, "sudden")]) == 0.03


def test_moves_of_a_hand_are_no_steps_nor_are_a_few_quick_ones_among_them():
    hand, flicks = path([0.05, -0.05] * 20, 0.5), path([0.5, -0.5] * 5, 0.1)
    assert tolerance_for_steps([hand]) is None
    assert tolerance_for_steps([hand, flicks]) is None
    assert tolerance_for_steps([path([0.3] * 3, 0.1)]) is None
    assert tolerance_for_steps([]) is None
