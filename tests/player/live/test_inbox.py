"""All inputs together, over a real socket."""

import socket

import numpy as np
import pytest
from pythonosc.osc_message_builder import OscMessageBuilder

from player.engine.clock import SteadyClock
from player.inputs.model import NO_MAP, Bind, Control, Map, Stroke
from player.inputs.osc import Known
from player.inputs.osc_port import OscPort
from player.live.inbox import Inbox

NAMES = ("r.1", "r.2")


@pytest.fixture
def make_inbox():
    made = []

    def make(map_=NO_MAP):
        port = OscPort("127.0.0.1", 0)
        clock = SteadyClock()
        inbox = Inbox(map_, Known({"r.1": 0, "r.2": 1}, {"all": (0, 1)}), NAMES, clock.now, lambda: 1e9, None, port)
        made.append(inbox)
        return inbox, clock

    yield make
    for inbox in made:
        inbox.close()


def sent(inbox, address, value):
    builder = OscMessageBuilder(address)
    builder.add_arg(value, "f")
    with socket.socket(socket.AF_INET, socket.SOCK_DGRAM) as out:
        out.sendto(builder.build().dgram, inbox.osc.address)


def polled(inbox, clock):
    """Poll until something comes; loopback takes a moment."""
    for _ in range(200):
        events = inbox.poll(clock.now(), np.zeros(2), None)
        if events or inbox.refused:
            return events
        clock.wait_until(clock.now() + 0.005)
    raise AssertionError("nothing came")


def test_a_packet_becomes_an_event_and_its_source_is_seen_with_its_last_value(make_inbox):
    inbox, clock = make_inbox()
    sent(inbox, "/drawcord/group/all", 0.25)
    (event,) = polled(inbox, clock)
    assert event.fibers == (0, 1) and event.stroke == 0.25
    assert [(seen.name, seen.last, seen.count) for seen in inbox.seen] == [("osc", "all 0.25", 1)]
    assert [(one.source, one.control, one.value) for one in inbox.inputs] == [("osc", "all", 0.25)]


def test_what_is_refused_is_counted_by_reason(make_inbox):
    inbox, clock = make_inbox()
    sent(inbox, "/drawcord/group/all", float("nan"))
    assert polled(inbox, clock) == [] and inbox.refused == {"osc value": 1}


def test_fibers_that_osc_moves_are_no_faders_any_more(make_inbox):
    control = Control("cc", 21, 1)
    map_ = Map("m", 0.0, (Bind(control, "", Stroke((0,), pickup=True), 1),))
    inbox, clock = make_inbox(map_)
    from mido import Message

    def moved(value):
        return inbox.midi_binds.hear("BOX", Message("control_change", channel=0, control=21, value=value), clock.now())

    assert moved(0) and moved(30)
    sent(inbox, "/drawcord/fiber/r.1", 1.0)
    polled(inbox, clock)
    inbox.midi_binds.present = np.array([1.0, 0.0])
    assert moved(40) == [] and moved(127)
