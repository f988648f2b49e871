"""Token buckets against the enumeration of all spans, a discrete count, and the closed form of network calculus."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from composer.limits.buckets import level, overdraws

steps = st.lists(st.tuples(st.floats(0.0, 5.0), st.floats(0.0, 5.0)), min_size=1, max_size=20)


def _curve(asked):
    time, demand = (np.concatenate([[0.0], np.cumsum(x)]) for x in zip(*asked, strict=True))
    return time, demand


@given(steps, st.floats(0.0, 3.0))
def test_what_is_missing_is_the_worst_over_all_spans_that_end_there(asked, refill):
    time, demand = _curve(asked)
    now = level(time, demand, refill)
    for k in range(len(time)):
        worst = max(demand[k] - demand[s] - refill * (time[k] - time[s]) for s in range(k + 1))
        assert now.missing[k] == pytest.approx(worst, abs=1e-9)
        s = now.since[k]
        assert demand[k] - demand[s] - refill * (time[k] - time[s]) == pytest.approx(worst, abs=1e-9)


@given(steps, st.floats(0.0, 3.0), st.floats(0.1, 5.0))
def test_a_span_is_found_exactly_where_some_span_overdraws(asked, refill, store):
    time, demand = _curve(asked)
    found = overdraws(time, demand, store, refill)
    spans = [demand[k] - demand[s] - store - refill * (time[k] - time[s]) for k in range(len(time)) for s in range(k + 1)]
    if max(spans) > 1e-9:
        assert np.max(found.asked - found.bears) == pytest.approx(max(spans), abs=1e-9)
    elif max(spans) < -1e-9:
        assert len(found.start) == 0


smooth_steps = st.lists(st.tuples(st.floats(0.1, 5.0), st.floats(0.0, 5.0)), min_size=1, max_size=10)


@settings(deadline=None)
@given(smooth_steps, st.floats(0.1, 3.0))
def test_a_bucket_counted_down_tick_by_tick_falls_as_far(asked, refill):
    missing, lowest = 0.0, 0.0
    for seconds, amount in asked:
        for _ in range(64):
            missing = max(0.0, missing + (amount - refill * seconds) / 64)
            lowest = max(lowest, missing)
    assert level(*_curve(asked), refill).missing.max() == pytest.approx(lowest, abs=1e-9)


def test_a_burst_at_peak_rate_lasts_as_long_as_network_calculus_says(outside):
    # From a full bucket a source at peak rate p > rho keeps within (sigma, rho) for sigma / (p - rho) and no longer.
    sigma, rho, peak = (outside["token_bucket"][k] for k in ("sigma", "rho", "peak"))
    lasts = outside["token_bucket"]["longest_burst"]
    just, over = ((np.array([0.0, t]), np.array([0.0, peak * t])) for t in (lasts, lasts * 1.001))
    assert len(overdraws(*just, sigma, rho, 1e-9).start) == 0
    assert len(overdraws(*over, sigma, rho, 1e-9).start) == 1


def test_a_bucket_that_has_been_full_again_begins_a_new_span():
    time = np.array([0.0, 1.0, 11.0, 12.0])
    found = overdraws(time, np.array([0.0, 5.0, 5.0, 10.0]), 3.0, 1.0)
    assert (found.start.tolist(), found.end.tolist()) == ([0, 2], [1, 3])
    assert (found.asked.tolist(), found.bears.tolist()) == ([5.0, 5.0], [4.0, 4.0])
