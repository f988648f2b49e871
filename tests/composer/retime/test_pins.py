"""Chains between pins that are too close."""

import numpy as np
import pytest

from composer.limits.abilities import abilities_of
from composer.retime.pins import chains_too_long
from composer.retime.stage import stage_of

from .scores import tracks_of


def chains(rig, fibers, pins, give=None):
    pins = np.array(pins)
    give = np.zeros(len(pins)) if give is None else np.array(give)
    stage = stage_of(tracks_of(fibers), abilities_of(rig), pins, give, None, False)
    return chains_too_long(stage.events, stage.rows, pins, give)


def test_pins_with_room_enough_have_no_chain(make_rig):
    assert chains(make_rig(1), [[(0.0, 0.3, "linear"), (0.5, None, "end")]], [0.5]) == []


def test_a_chain_names_its_pins_its_moves_and_what_is_lacking(make_rig):
    track = [(0.0, 0.3, "linear"), (0.6, 0.0, "linear"), (1.2, 0.3, "linear"), (1.4, None, "end")]
    (chain,) = chains(make_rig(1), [track], [0.6, 1.4])
    assert (chain.from_pin, chain.to_pin, chain.from_s, chain.to_s) == (0, 1, 0.6, 1.4)
    assert chain.knots == (1, 2)
    assert chain.short_s == pytest.approx(1.0 + 0.5 - 0.8)


def test_a_chain_may_go_through_several_fibers(make_rig):
    first = [(0.0, 0.3, "linear"), (0.2, None, "end")]
    second = [(0.0, 0.03, "linear"), (0.2, 0.3, "linear"), (0.5, None, "end")]
    (chain,) = chains(make_rig(2), [first, second], [0.5])
    assert chain.knots == (0, 3)
    assert chain.short_s == pytest.approx(0.5 + 0.45 - 0.5)


def test_each_pair_of_pins_tells_its_own_lack(make_rig):
    track = [(0.0, 0.3, "linear"), (0.4, 0.0, "linear"), (1.2, None, "end")]
    found = chains(make_rig(1), [track], [0.4, 1.2])
    assert [round(chain.short_s, 9) for chain in found] == [0.1, 0.2]


def test_give_at_a_pin_is_counted(make_rig):
    track = [(0.0, 0.3, "linear"), (0.4, None, "end")]
    assert chains(make_rig(1), [track], [0.4], [0.1]) == []
    (chain,) = chains(make_rig(1), [track], [0.4], [0.05])
    assert chain.short_s == pytest.approx(0.05)
