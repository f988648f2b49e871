"""A recording under the operator's hand."""

import numpy as np
import pytest

from composer.limits.abilities import abilities_of
from player.engine.clock import VirtualClock
from player.engine.loop import Engine
from player.engine.playback import Playback
from player.outputs.sim import Sim

DT = 0.005


@pytest.fixture
def play(make_rig, kept):
    """Plays 2 s of a recording that rises to full and stays, and asks for things at ticks."""

    def run(at=None, at_rest=False, drive="strain", commands=None):
        rig = make_rig(2, drive=drive)
        time = np.arange(400) * DT
        if commands is None:
            commands = np.minimum(1.0, time / 1.0)[:, None].repeat(2, axis=1)
        source = Playback(rig, abilities_of(rig), time, commands, at_rest)
        output, sim = kept(), Sim(rig, abilities_of(rig), ("main",))
        engine = Engine(rig, source, [output, sim], VirtualClock())
        engine.preflight()
        engine.arm()
        for status in engine.run():
            for ask in (at or {}).get(status.ticks, ()):
                engine.ask(ask)
        return engine, output, sim

    return run


def test_its_sets_come_at_their_own_times(play):
    engine, output, _ = play()
    assert np.array_equal(output.commands[:400, 0], np.minimum(1.0, np.arange(400) * DT / 1.0))
    assert np.abs(np.diff(output.due) - DT).max() < 1e-9
    assert engine.ending.how == "end"


def test_what_it_leaves_up_is_let_down_at_the_end(play):
    _, output, sim = play()
    down = output.commands[400:, 0]
    assert np.all(np.diff(down) <= 0.0) and down[-1] == 0.0
    assert -np.diff(down).min() / DT * 0.3 <= 0.2 + 1e-6
    assert sim.counters()["strain_left"] == 0.0


def test_one_that_ended_at_rest_is_over_with_its_last_set(play):
    _, output, _ = play(at_rest=True)
    assert len(output.sets) == 400


def test_a_stop_in_mid_way_lets_down_even_one_that_ended_at_rest(play):
    engine, output, sim = play({250: ["stop"]}, at_rest=True)
    assert engine.ending.how == "stopped" and len(output.sets) > 400
    assert output.commands[-1, 0] == 0.0 and sim.counters()["strain_left"] == 0.0


def test_a_pause_holds_set_points(play):
    _, output, _ = play({100: ["pause"], 200: ["go_on"]})
    assert np.all(output.commands[100:200, 0] == output.commands[99, 0])
    assert output.commands[200, 0] == pytest.approx(output.commands[99, 0] + DT)


def test_a_pause_shuts_valves_and_the_way_to_rest_opens_them_to_exhaust(play):
    opened = np.full((400, 2), 0.2)
    _, output, sim = play({100: ["pause"], 200: ["stop"]}, drive="valve", commands=opened)
    assert np.all(output.commands[101:200] == 0.0)
    assert output.commands[250, 0] == pytest.approx(-2.0 / 3.0)
    assert sim.counters()["strain_left"] == 0.0
