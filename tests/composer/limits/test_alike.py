"""Alike rows against numpy's own unique."""

import numpy as np
from hypothesis import given
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays

from composer.limits.alike import alike


@given(arrays(float, st.tuples(st.integers(0, 30), st.integers(1, 4)), elements=st.sampled_from([0.0, -0.0, 1.0, 2.5])))
def test_kinds_are_those_of_rows_compared_one_by_one(rows):
    first, kind = alike(rows)
    assert len(first) == (len(np.unique(rows, axis=0)) if len(rows) else 0)
    assert np.array_equal(rows[first][kind], rows)


def test_columns_stand_beside_each_other():
    first, _ = alike(np.array([1.0, 1.0, 2.0]), np.array([[3.0], [4.0], [3.0]]))
    assert len(first) == 3
