import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from composer.limits.fills import air_at
from composer.limits.live import live, longest_steps, look
from composer.limits.tables import rates, travel_time_s

STRAIN = np.linspace(0.0, 0.3, 13)
FILL = 2.0 - 5.0 * STRAIN + 0.2 * np.sin(60.0 * STRAIN)
EXHAUST = 0.2 + 4.0 * STRAIN + 0.15 * np.cos(50.0 * STRAIN)
AIR = 0.003 * (STRAIN / 0.3) ** 1.4
UNEVEN = np.array([0.0, 0.01, 0.05, 0.06, 0.2, 0.3])

ways = st.tuples(st.floats(0.0, 0.3), st.sampled_from([0.0005, 0.002, 0.01]))


@pytest.fixture(scope="module")
def curved(make_abilities):
    return make_abilities((STRAIN, FILL, EXHAUST), air_L=[AIR])


@pytest.fixture(scope="module")
def uneven(make_abilities):
    return make_abilities((UNEVEN, 1.0 - UNEVEN, 0.3 + UNEVEN))


@pytest.mark.parametrize("kind", ["curved", "uneven"])
def test_rates_and_air_are_those_of_the_tables(request, kind):
    abilities = request.getfixturevalue(kind)
    tables = live(abilities, 0.01)
    for strain in np.linspace(0.0, 0.3, 97):
        here, fiber = look(tables, np.array([strain])), np.zeros(1, dtype=int)
        at = np.array([strain])
        assert here.fill == pytest.approx(rates(abilities, fiber, at, np.array([True])), rel=1e-12)
        assert here.exhaust == pytest.approx(rates(abilities, fiber, at, np.array([False])), rel=1e-12)
        assert here.air == pytest.approx(air_at(abilities, fiber, at), rel=1e-12, abs=1e-18)


@settings(deadline=None)
@given(ways)
def test_a_longest_step_is_within_the_rates_on_the_whole_way(curved, way):
    strain, dt = way
    here = look(live(curved, 0.01), np.array([strain]))
    up, down = longest_steps(here, dt)
    on_the_way = np.linspace(0.0, 1.0, 50)
    above = np.minimum(strain + up * on_the_way, 0.3)
    below = np.maximum(strain - down * on_the_way, 0.0)
    fiber = np.zeros(50, dtype=int)
    assert np.all(up / dt <= rates(curved, fiber, above, np.full(50, True)) * (1.0 + 1e-9))
    assert np.all(down / dt <= rates(curved, fiber, below, np.full(50, False)) * (1.0 + 1e-9))


def test_where_rates_are_the_same_at_every_strain_the_longest_step_is_rate_times_time(make_abilities):
    here = look(live(make_abilities(([0.0, 0.3], [0.6, 0.6], [0.3, 0.3])), 0.01), np.array([0.1]))
    assert longest_steps(here, 0.005) == (pytest.approx([0.003]), pytest.approx([0.0015]))


def test_a_whole_way_in_straight_steps_takes_longer_than_the_tables_say_by_their_steepest_fall_times_the_tick(curved):
    tables, fiber = live(curved, 0.01), np.zeros(1, dtype=int)
    steepest = -(np.diff(FILL) / np.diff(STRAIN)).min()
    for dt in (0.01, 0.005, 0.0005):
        strain, ticks = np.zeros(1), 0
        while strain[0] < 0.3:
            strain = np.minimum(strain + longest_steps(look(tables, strain), dt)[0], 0.3)
            ticks += 1
        least = travel_time_s(curved, fiber, [0.0], [0.3])[0]
        assert least - 1e-9 <= ticks * dt <= (1.0 + steepest * dt) * least + dt


@settings(deadline=None)
@given(st.floats(0.0, 0.3), st.lists(st.floats(0.0003, 0.01), min_size=1, max_size=5))
def test_the_way_back_never_takes_longer_than_said_but_for_its_last_tick(curved, strain, dts):
    tables = live(curved, 0.01)
    here = look(tables, np.array([strain]))
    said, took, number = here.back[0], 0.0, 0
    now = np.array([strain])
    while now[0] > 0.0:
        dt = dts[number % len(dts)]
        now = np.maximum(now - longest_steps(look(tables, now), dt)[1], 0.0)
        took, number = took + dt, number + 1
    assert took <= said + max(dts) + 1e-12


def test_what_a_step_draws_is_at_most_what_it_is_charged(curved):
    tables = live(curved, 0.01)
    for strain in np.linspace(0.0, 0.29, 60):
        here = look(tables, np.array([strain]))
        up = np.minimum(longest_steps(here, 0.01)[0], 0.3 - strain)
        there = look(tables, strain + up)
        assert there.air - here.air <= up * here.air_up * (1.0 + 1e-9)
        assert there.back - here.back <= up * here.back_up * (1.0 + 1e-9)


def test_a_fiber_with_a_limit_of_acceleration_has_the_least_rate_of_its_table_everywhere(make_abilities):
    abilities = make_abilities((STRAIN, FILL, EXHAUST), accel=20.0)
    here = look(live(abilities, 0.01), np.array([0.02]))
    assert here.fill == pytest.approx([FILL.min()])
    assert here.exhaust == pytest.approx([EXHAUST.min()])
    assert here.fill_falls == 0.0


def test_a_step_down_saves_at_least_what_it_is_credited(curved):
    tables = live(curved, 0.01)
    for strain in np.linspace(0.02, 0.3, 60):
        here = look(tables, np.array([strain]))
        down = np.minimum(longest_steps(here, 0.01)[1], strain)
        there = look(tables, strain - down)
        assert here.back - there.back >= down * here.back_down * (1.0 - 1e-9)


@pytest.mark.parametrize(("fills", "exhausts"), [((0.8, 0.8), (0.4, 0.5)), ((0.8, 0.7), (0.5, 0.5)), ((0.8, 0.8), (0.5, 0.5))])
def test_rates_are_steady_where_none_falls_on_its_way_and_one_that_does_is_enough(make_abilities, fills, exhausts):
    straight, bent = ([0.0, 0.3], [0.6] * 2, [0.6] * 2), ([0.0, 0.3], list(fills), list(exhausts))
    abilities = make_abilities(straight, bent)
    assert live(abilities, 0.01).steady == (len(set(fills)) == len(set(exhausts)) == 1)
