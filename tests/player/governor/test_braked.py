import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from player.governor.braked import NEARLY_STILL, braked, brakes_of

A, FILL, EXHAUST, DT = 20.0, 0.6, 0.3, 0.005


def stops_at(strain, rate, accel):
    return strain + rate * abs(rate) / (2.0 * accel)


def step(strain, rate, wanted, dt=DT, accel=A):
    values = [np.array([x], dtype=float) for x in (strain, rate, stops_at(strain, rate, accel), wanted)]
    at, speed = braked(*values, brakes_of(np.array([accel]), dt), np.array([FILL]), np.array([EXHAUST]))
    return float(at[0]), float(speed[0])


def way(strain, wanted, dt=DT, accel=A, rate=0.0):
    """All ticks until it is there, as (strain, rate)."""
    ticks = [(strain, rate)]
    while ticks[-1] != (wanted, 0.0):
        ticks.append(step(*ticks[-1], wanted, dt, accel))
        assert len(ticks) < 100_000
    return ticks


def test_from_a_stand_it_gathers_speed_at_its_limit_up_to_its_rate():
    ticks = way(0.0, 0.3)
    assert [rate for _, rate in ticks[:8]] == pytest.approx([0.0, 0.1, 0.2, 0.3, 0.4, 0.5, 0.6, 0.6])
    assert ticks[6][0] == pytest.approx(0.6**2 / (2.0 * A))


def test_a_way_takes_as_long_as_the_trapezoid_of_its_speed_to_within_two_ticks():
    for distance in (0.3, 0.02, 0.001):
        least = distance / FILL + FILL / A if distance >= FILL**2 / A else 2.0 * np.sqrt(distance / A)
        took = (len(way(0.0, distance)) - 1) * DT
        assert least - 1e-9 <= took <= least + 2.0 * DT


def test_it_never_passes_its_place():
    assert max(strain for strain, _ in way(0.0, 0.2)) == 0.2
    assert min(strain for strain, _ in way(0.3, 0.1)) == 0.1


def test_one_that_goes_the_wrong_way_brakes_first_and_stands_for_the_rest_of_that_tick():
    assert step(0.2, 0.05, 0.0) == (pytest.approx(0.2 + 0.05**2 / (2.0 * A)), 0.0)
    assert step(0.2, 0.4, 0.0)[1] == pytest.approx(0.4 - A * DT)


def test_one_that_passes_its_place_at_speed_is_not_there():
    strain, rate = step(0.1, -0.3, 0.1 - 0.0015 + 0.5 * A * DT**2)
    assert rate == pytest.approx(-0.2)
    assert strain == pytest.approx(0.1 - 0.25 * DT)


@given(
    st.floats(0.0, 0.3),
    st.floats(-1.0, 1.0),
    st.lists(st.floats(0.0, 0.3), min_size=1, max_size=30),
    st.sampled_from([0.5, 20.0, 1e3, 1e6]),
    st.lists(st.floats(0.0005, 0.01), min_size=1, max_size=4),
)
def test_whatever_is_wanted_it_keeps_its_limits_and_can_stop_within_the_stroke(strain, share, wanted, accel, dts):
    most = min(FILL, np.sqrt(2.0 * accel * (0.3 - strain))) if share > 0.0 else min(EXHAUST, np.sqrt(2.0 * accel * strain))
    rate = share * most
    for number, place in enumerate(wanted):
        dt = dts[number % len(dts)]
        strain_was, rate_was = strain, rate
        strain, rate = step(strain, rate, place, dt, accel)
        assert abs(rate - rate_was) <= accel * dt * (1.0 + 1e-6)
        assert -EXHAUST - 1e-12 <= rate <= FILL + 1e-12
        assert -1e-12 <= stops_at(strain, rate, accel) <= 0.3 + 1e-12
        fastest = max(abs(rate), abs(rate_was), NEARLY_STILL * accel * dt)
        assert abs(strain - strain_was) <= fastest * dt + 1e-12
