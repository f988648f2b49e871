"""From strain wanted to what is sent."""

from importlib.resources import files

import numpy as np
import pytest

from composer.drive.inverse import Inverse, standing, vented
from composer.limits.abilities import abilities_of
from composer.load import load_rig


def sent(rig, before, strain, tick_s=0.005):
    inverse = Inverse(rig, abilities_of(rig))
    inverse.reset(np.array(before))
    wanted = np.array(strain)[:, None]
    return inverse.commands(wanted, wanted, wanted, tick_s)[:, 0].tolist()


@pytest.mark.parametrize("drive", ["pressure", "strain"])
def test_a_set_point_is_the_share_of_the_stroke(make_rig, drive):
    assert sent(make_rig(2, drive=drive), [0.0, 0.0], [0.15, 0.3]) == [0.5, 1.0]


def test_an_opening_is_the_share_of_the_fastest_rate_in_its_direction(make_rig):
    opening = sent(make_rig(3, drive="valve"), [0.1, 0.1, 0.1], [0.1015, 0.0985, 0.1])
    assert opening == pytest.approx([0.5, -1.0, 0.0])


def test_what_a_drive_cannot_take_is_sent_as_its_end(make_rig):
    assert sent(make_rig(2), [0.0, 0.0], [-0.1, 0.4]) == [0.0, 1.0]
    assert sent(make_rig(2, drive="valve"), [0.1, 0.1], [0.2, 0.0]) == [1.0, -1.0]


def test_many_ticks_at_once_give_what_each_alone_gives(make_rig):
    rig = make_rig(3, drive="valve")
    strain = np.random.default_rng(1).uniform(0, 0.3, (3, 5))
    grid = Inverse(rig, abilities_of(rig)).commands(strain, strain, strain, 0.1)
    one = Inverse(rig, abilities_of(rig))
    alone = [one.commands(*[strain[:, n : n + 1]] * 3, 0.1)[:, 0] for n in range(5)]
    assert grid.tolist() == np.array(alone).T.tolist()


def test_commands_lead_by_the_valves_response_unless_the_lead_is_off(make_rig):
    rig = make_rig(2)
    assert Inverse(rig, abilities_of(rig)).lead_s.tolist() == [0.008, 0.008]
    assert Inverse(rig, abilities_of(rig), on=False).lead_s.tolist() == [0.0, 0.0]


def test_to_vent_is_no_pressure_or_an_exhaust_fully_open(make_rig):
    assert vented(make_rig(2)).tolist() == [0.0, 0.0]
    assert vented(make_rig(2, drive="valve")).tolist() == [-1.0, -1.0]


def test_set_points_at_which_fibers_stand_are_those_of_a_slow_rise():
    """Of modelled fibers whose drives take a pressure or a strain."""
    rig = load_rig(str(files("scores_demo") / "gannet.rig.toml"))
    abilities = abilities_of(rig)
    found = standing(rig, abilities, 5)
    slow = np.outer(abilities.stroke, np.linspace(0.0, 1.0, 4001))
    sent = Inverse(rig, abilities).commands(slow, slow, slow, 0.05)
    assert found[:, 1:] == pytest.approx(sent[:, 1000::1000], abs=5e-3)
    assert (np.diff(found, axis=1) > 0.0).all() and not found[:, 0].any()
