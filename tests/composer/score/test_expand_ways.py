import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from composer.limits.abilities import abilities_of
from composer.score.expand_ways import affine_scan

from .playing import faster_when_full, played, thread


@given(st.lists(st.tuples(st.sampled_from([0.0, 1.0, 0.5, 0.123, 1e-3]), st.floats(-2, 2)), min_size=1, max_size=300))
def test_the_scan_is_what_a_loop_gives(steps):
    alpha, beta = np.array(steps).T.copy()
    alpha[0] = 0.0
    value, expected = 0.0, []
    for a, b in zip(alpha, beta, strict=True):
        value = a * value + b
        expected.append(value)
    np.testing.assert_allclose(affine_scan(alpha, beta), expected, atol=1e-12)


def test_a_value_is_held_through_any_number_of_holds_to_the_last_bit():
    alpha, beta = np.ones(10_001), np.zeros(10_001)
    alpha[0], beta[0] = 0.0, 0.1
    assert np.all(affine_scan(alpha, beta) == 0.1)


@pytest.mark.parametrize("every", ["0.00001s", "0.001s", "0.02s"])
def test_a_long_row_of_sudden_moves_that_hang_on_one_another_settles_in_a_few_rounds(make_rig, monkeypatch, every):
    rounds = []
    monkeypatch.setattr("composer.score.expand_ways.affine_scan", lambda *way: rounds.append(1) or affine_scan(*way))
    rig = make_rig(1)
    text = f"phrase p\n  0.05 full sudden\n  0.1 rest sudden\nsection a at 1:1\n  r.1 p times 5000 every {every}\n"
    one = thread(played(text, rig, faster_when_full(abilities_of(rig))), 0)
    assert len(rounds) < 20
    assert np.abs(np.array(one.end[:-1]) - one.start[1:]).max() < 1e-11
