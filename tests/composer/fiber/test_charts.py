import numpy as np
import pytest

from composer.fiber import charts, rates
from composer.fiber.charts import chart_of, charts_of, look_up, reach_of
from composer.fiber.modelled import capability
from composer.fiber.path import exhaust_flow, fill_flow

from .makes import CORD, EACH, PLEAT, mounted


def test_what_lies_between_rows_is_on_the_straight_line_of_its_own_table():
    rising = np.column_stack([np.arange(charts.POINTS, dtype=float), np.zeros(charts.POINTS)])
    chart = chart_of([rising, 10_000.0 - rising])
    last = charts.POINTS - 1.0
    share = np.array([0.0, 0.25, 1.0, 0.25, 1.0])
    found = look_up(chart, charts.POINTS * np.array([0, 0, 0, 1, 1]), share)
    assert found[:, 0] == pytest.approx([0.0, 0.25 * last, last, 10_000.0 - 0.25 * last, 10_000.0 - last])


def test_beyond_its_ends_a_table_keeps_their_values():
    rising = np.arange(charts.POINTS, dtype=float)[:, None]
    chart = chart_of([rising, rising + 1e6])
    begins = charts.POINTS * np.array([0, 0, 1, 1])
    found = look_up(chart, begins, np.array([-3.0, 7.0, -3.0, 7.0]))[:, 0]
    assert found.tolist() == [0.0, charts.POINTS - 1.0, 1e6, 1e6 + charts.POINTS - 1.0]


@pytest.mark.parametrize("kind", EACH)
def test_a_chart_says_what_the_physics_says(kind):
    physics = capability(EACH[kind], mounted(load_N=0.5)).physics
    made = charts_of([physics], 400e3)
    begins = np.zeros(40, dtype=np.int64)
    strain = np.linspace(0.02, 0.9, 40) * physics.stroke
    by_strain = look_up(made.by_strain, begins, strain / made.reach[0])
    holds = rates.pressures(physics, strain)
    assert by_strain[:, charts.HOLDS_IN] == pytest.approx(holds[0], rel=2e-3)
    assert by_strain[:, charts.HOLDS_OUT] == pytest.approx(holds[1], rel=2e-3)
    by_pressure = look_up(made.by_pressure, begins, holds[0] / 400e3)
    assert by_pressure[:, charts.IN] == pytest.approx(strain, abs=2e-3 * physics.stroke)
    absolute = holds[0] + physics.ambient
    leaves = exhaust_flow(physics.path, absolute, physics.ambient)
    enters = fill_flow(physics.path, np.full(40, 400e3 + physics.ambient), absolute)
    assert by_pressure[:, charts.LEAVES] == pytest.approx(leaves, rel=0.01, abs=1e-3 * leaves.max())
    assert by_pressure[:, charts.ENTERS + charts.SUPPLIES - 1] == pytest.approx(enters, rel=0.01, abs=1e-3 * enters.max())
    takes = rates.capacity(physics, strain, holds[0], rates.slopes(physics, strain)[0])
    assert by_pressure[3:, charts.TAKES_IN] == pytest.approx(takes[3:], rel=0.02)


def test_at_its_stop_a_fiber_only_takes_what_its_room_takes():
    physics = capability(PLEAT, mounted(load_N=0.0)).physics
    made = charts_of([physics], 400e3)
    row = look_up(made.by_pressure, np.zeros(1, dtype=np.int64), np.array([0.95]))[0]
    room = look_up(made.by_strain, np.zeros(1, dtype=np.int64), np.array([1.0]))[0, charts.ROOM]
    assert row[charts.IN] == pytest.approx(reach_of(physics))
    assert row[charts.TAKES_IN] == pytest.approx(room)


def test_each_make_has_its_own_rows():
    both = [capability(make, mounted(load_N=0.5)).physics for make in (CORD, PLEAT)]
    made, alone = charts_of(both, 400e3), charts_of(both[1:], 400e3)
    share = np.linspace(0.0, 1.0, 9)
    of_both = look_up(made.by_pressure, np.full(9, charts.POINTS), share)
    assert np.array_equal(of_both, look_up(alone.by_pressure, np.zeros(9, dtype=np.int64), share))
