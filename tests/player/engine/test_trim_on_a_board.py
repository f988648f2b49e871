"""`--trim` on a board in C behind a pseudo-terminal, whose fibers need more pressure than the rig's types say."""

import numpy as np
import pytest

from composer.limits.abilities import abilities_of
from player.engine.clock import SteadyClock
from player.engine.loop import Engine
from player.engine.source import Driven
from player.engine.trim import A_SECOND, MOST
from player.outputs.board import Board
from player.outputs.portable_board import PortableBoard, compiled
from player.wire.device_c.plant import plant_text
from player.wire.rules import Build

WEAKER = 1.06
HELD = 0.2 / 0.3


def weaker(text):
    """The plant with every strain held by so much more pressure."""
    lines = text.splitlines()
    for n, line in enumerate(lines):
        parts = line.split()
        if len(parts) == 4 and not line.startswith(("supply", "board")):
            parts[2] = f"{float(parts[2]) * WEAKER:.9g}"
            lines[n] = " ".join(parts)
    return "\n".join(lines) + "\n"


@pytest.fixture
def played(make_rig, make_tracks):
    """A maker of runs of a lift that holds for 3 s: the engine, shares of stroke sensed at the end of the hold, and the
    largest correction applied to each fiber, tick by tick."""
    boards = []

    def play(*options, trims=True):
        rig = make_rig(drive="pressure", max_hold_s=0.0)
        abilities, clock = abilities_of(rig), SteadyClock()
        build = Build("bench", ("pressure",) * 4, senses_strain=True, senses_supply=True, rig=rig.fingerprint)
        device = PortableBoard(compiled(4), weaker(plant_text(rig, abilities, "main", build)), None, options)
        boards.append(device)
        output = Board(rig, abilities, "main", device.path, 2_000_000, clock)
        source = Driven(rig, abilities, make_tracks(4, [(0.0, 1.0, 0.2), (4.0, 5.5, 0.0)]))
        engine = Engine(rig, source, [output], clock, 100.0, abilities=abilities, trims=trims)
        output.open()
        assert all(mark.ok for mark in engine.preflight())
        engine.arm()
        held, by = [], []
        for status in engine.run():
            if 3.6 < status.position_s < 3.9:
                held.append(engine.sensing.last / abilities.stroke)
            if engine.sensing.trim is not None:
                by.append(np.abs(engine.sensing.trim.now).max(axis=1))
        engine.close()
        assert held, engine.ending
        return engine, held[-1], np.array(by)

    yield play
    for device in boards:
        device.stop()
        device.run()


def test_what_boards_lack_is_made_up_gliding_and_within_bounds(played):
    engine, held, by = played()
    assert engine.ending.how == "end" and engine.safety.state == "idle"
    assert (by[-1] > 0.02).all() and (by <= MOST).all()
    assert np.abs(np.diff(by, axis=0)).max() <= A_SECOND * 0.2
    assert np.abs(held - HELD).max() < 0.01


def test_a_fiber_with_an_alarm_is_not_trimmed_and_the_others_are(played):
    engine, _, by = played("--railed-after", "0.3")
    assert engine.ending.faults and "is said to be at full stroke" in engine.ending.faults[0].say
    assert (by[:, 0] == 0.0).all() and (by[-1, 1:] > 0.02).all()


def test_without_being_asked_nothing_is_trimmed(played):
    engine, held, _ = played(trims=False)
    assert engine.sensing.trim is None and (held < HELD - 0.02).all()
