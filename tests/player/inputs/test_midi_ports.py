import os
import time

import pytest
from mido import Message

from composer.faults import Faults
from player.commands.main import run
from player.inputs.events import Silent, Timing, Wanted
from player.inputs.midi import MidiBinds
from player.inputs.midi_clock import ClockFollower
from player.inputs.midi_ports import NO_MIDI, MidiPorts, midi_ports_found

from .jack import Sender, is_jack_there, server, until


@pytest.fixture(scope="module")
def jack():
    if not is_jack_there():
        pytest.skip("needs jackd (package jackd2)")
    with server(f"drawcord-{os.getpid()}") as name:
        until(lambda: _answers(), lambda: None)
        yield name


def _answers():
    try:
        MidiPorts(time.monotonic).close()
    except Faults:
        return False
    return True


class Desk:
    """What the player does with a port, tick by tick."""

    def __init__(self, map_):
        self.ports = MidiPorts(time.monotonic, hear=["box"], send=["box-in"])
        self.binds = MidiBinds(map_, 4)
        self.events, self.changes, self.types = [], [], []

    def poll(self):
        heard, changes = self.ports.poll()
        for one in heard:
            self.types.append(one.message.type)
            self.events += self.binds.hear(one.source, one.message, one.at_s)
        for change in changes:
            self.changes.append(change.kind)
            if change.kind == "lost":
                self.events += self.binds.lost(change.source, change.at_s, "its port is gone")

    def strokes(self):
        return [event.stroke for event in self.events if isinstance(event, Wanted)]


def test_an_independent_sender_over_jack_moves_fibers_is_followed_is_missed_and_taken_up_again(jack, map_of, capfd):
    map_ = map_of('[[bind]]\nmidi = { cc = 21, channel = 1 }\nfibers = "r.1"\n[[bind]]\nmidi = { cc14 = 3 }\nfibers = "r.2"\n')
    desk = Desk(map_)
    assert "no MIDI port has 'box' in its name" in desk.ports.missing()[0]
    sender = Sender("box")
    try:
        until(lambda: desk.ports.sources, desk.poll)
        assert ("in", "box:faders") in [(port.way, port.name) for port in midi_ports_found()]
        assert run(["ports"]) == 0
        assert "box:faders" in capfd.readouterr().out

        sender.send("B0 15 00 B0 15 40 B0 15 7F B0 03 40 B0 23 01")
        until(lambda: len(desk.strokes()) == 5, desk.poll)
        assert desk.strokes() == pytest.approx([0.0, 64 / 127, 1.0, 64 * 128 / 16383, (64 * 128 + 1) / 16383])

        sender.send("F2 10 00 F1 04 FE F0 7F 7F 01 01 21 02 03 04 F7 E0 00 40 FB")
        until(lambda: desk.types.count("continue") == 1, desk.poll)
        assert desk.types[-6:] == ["songpos", "quarter_frame", "active_sensing", "sysex", "pitchwheel", "continue"]

        follower = ClockFollower()
        sender.send("clock 97 0.0208333")
        until(lambda: desk.types.count("clock") == 97, desk.poll)
        for event in desk.events:
            if isinstance(event, Timing):
                follower.hear(event)
        assert follower.beat(time.monotonic()).place == pytest.approx(8.0, abs=0.1)
        assert follower.backwards == 0
    finally:
        sender.close()
    until(lambda: "lost" in desk.changes, desk.poll)
    silent = [event for event in desk.events if isinstance(event, Silent)]
    assert [event.fibers for event in silent] == [(0, 1)]

    again = Sender("box")
    try:
        until(lambda: "back" in desk.changes, desk.poll)
        before = len(desk.strokes())
        again.send("B0 15 20")
        until(lambda: len(desk.strokes()) == before + 1, desk.poll)
        until(lambda: desk.ports.sinks, desk.poll)
        desk.ports.send(Message("control_change", control=1, value=5), "box")
        desk.ports.send(Message("control_change", control=1, value=6), "another")
        desk.ports.send(Message("clock"))
        assert [again.heard(), again.heard()] == ["B0 01 05", "F8"]
    finally:
        again.close()
        desk.ports.close()
    assert desk.ports.sources == desk.ports.sinks == ()


def test_a_machine_whose_midi_libraries_are_missing_says_the_same(monkeypatch):
    monkeypatch.setattr("player.inputs.midi_ports.rtmidi", None)
    with pytest.raises(Faults, match=NO_MIDI):
        MidiPorts(time.monotonic, hear=["box"])
    assert midi_ports_found() == []


def test_a_machine_without_any_midi_system_says_so_in_a_sentence(monkeypatch, capfd):
    monkeypatch.setenv("JACK_DEFAULT_SERVER", "no-such-server")
    monkeypatch.setattr("player.inputs.midi_ports._client", lambda make, api: None)
    with pytest.raises(Faults, match=NO_MIDI):
        MidiPorts(time.monotonic, hear=["box"])
    assert midi_ports_found() == []
    assert run(["ports"]) == 0
    said = capfd.readouterr()
    assert "No MIDI system answers on this machine" in said.out
    assert said.err == ""
