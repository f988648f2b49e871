"""From strain wanted to what is sent."""

import numpy as np
import pytest

from composer.drive.inverse import commands, lead_s, vented
from composer.limits.abilities import abilities_of


def sent(rig, strain, rate):
    return commands(rig, abilities_of(rig), np.array(strain), np.array(rate)).tolist()


@pytest.mark.parametrize("drive", ["pressure", "strain"])
def test_a_set_point_is_the_share_of_the_stroke(make_rig, drive):
    assert sent(make_rig(2, drive=drive), [0.15, 0.3], [9.0, -9.0]) == [0.5, 1.0]


def test_an_opening_is_the_share_of_the_fastest_rate_in_its_direction(make_rig):
    assert sent(make_rig(3, drive="valve"), [0.1, 0.1, 0.1], [0.3, -0.3, 0.0]) == [0.5, -1.0, 0.0]


def test_what_a_drive_cannot_take_is_sent_as_its_end(make_rig):
    assert sent(make_rig(2), [-0.1, 0.4], [0.0, 0.0]) == [0.0, 1.0]
    assert sent(make_rig(2, drive="valve"), [0.1, 0.1], [5.0, -5.0]) == [1.0, -1.0]


def test_a_grid_of_times_gives_what_each_time_gives_alone(make_rig):
    rig = make_rig(3, drive="valve")
    strain, rate = np.random.default_rng(1).uniform(0, 0.3, (2, 3, 5))
    grid = commands(rig, abilities_of(rig), strain, rate)
    alone = [commands(rig, abilities_of(rig), strain[:, n], rate[:, n]) for n in range(5)]
    assert grid.tolist() == np.array(alone).T.tolist()


def test_commands_lead_by_the_valves_response_unless_the_lead_is_off(make_rig):
    rig = make_rig(2)
    assert lead_s(rig, abilities_of(rig)).tolist() == [0.008, 0.008]
    assert lead_s(rig, abilities_of(rig), on=False).tolist() == [0.0, 0.0]


def test_to_vent_is_no_pressure_or_an_exhaust_fully_open(make_rig):
    assert vented(make_rig(2)).tolist() == [0.0, 0.0]
    assert vented(make_rig(2, drive="valve")).tolist() == [-1.0, -1.0]
