from itertools import pairwise

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from composer.score.layers import BEZIER
from composer.tracks import HOLD, MOVE, STEP

from .playing import played, thread


@given(st.lists(st.floats(-3, 3), min_size=6, max_size=6), st.floats(0, 1))
def test_powers_of_a_bezier_curve_give_what_de_casteljau_gives(points, u):
    curve = np.array(points) @ BEZIER
    while len(points) > 1:
        points = [p + (q - p) * u for p, q in pairwise(points)]
    assert abs(np.polyval(curve[::-1], u) - points[0]) < 1e-12


def test_jumps_at_one_instant_are_one_jump(make_rig):
    text = "phrase p\n  1 0.4 step\nphrase q\n  0 full\n  1 rest\nsection a at 1:1\n  r.1 p\n  r.1 q after 1\n"
    one = thread(played(text, make_rig()), 0)
    assert one.time_s == [0.0, 1.0, 1.0, 2.0] and one.manner == [HOLD, STEP, MOVE, HOLD]
    assert one.start[1] == 0.0 and one.end[1] == 0.3 and one.line[1] == 8


def test_jumps_at_one_instant_that_cancel_are_none(make_rig):
    text = "phrase p\n  0 rest\n  1 full step\nsection a at 1:1\n  r.1 p times 3\n"
    one = thread(played(text, make_rig()), 0)
    assert one.time_s == [0.0, 3.0, 3.0] and one.manner == [HOLD, STEP, HOLD]
