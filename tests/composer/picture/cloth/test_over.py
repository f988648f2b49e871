"""What lies over the threads."""

from itertools import pairwise

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from composer.picture.cloth.over import _joined, marks_of
from composer.picture.scene import Stretch


@given(spans=st.lists(st.tuples(st.floats(0.0, 100.0), st.floats(0.0, 10.0)), max_size=60))
def test_joined_spans_cover_what_the_single_ones_did_and_lie_apart(spans):
    left = np.array([a for a, _ in spans])
    right = np.array([a + b for a, b in spans])
    joined = _joined(left, right)
    assert all(any(a <= x and y <= b for a, b in joined) for x, y in zip(left, right, strict=True))
    assert all(before[1] < after[0] for before, after in pairwise(joined))
    assert {a for a, _ in joined} <= set(left.tolist())
    assert {b for _, b in joined} <= set(right.tolist())


def test_snags_as_arrays_say_whose_they_are():
    fiber, begin, end = marks_of((Stretch(3, 1.0, 2.0), Stretch(None, 0.5, 4.0)))
    assert (fiber.tolist(), begin.tolist(), end.tolist()) == ([3, -1], [1.0, 0.5], [2.0, 4.0])
    assert all(len(part) == 0 for part in marks_of(()))
