"""What inputs cost: each as a share of a tick of 5 ms, and ratios within one run. `python tests/bench/inputs.py`."""

import struct
import sys
import time
from collections.abc import Callable

import numpy as np
from mido import Message
from pythonosc.osc_message_builder import OscMessageBuilder

from player.inputs.beat import Beat
from player.inputs.events import Timing
from player.inputs.feedback import Feedback
from player.inputs.midi import MidiBinds
from player.inputs.midi_clock import ClockFollower
from player.inputs.midi_stream import MidiStream
from player.inputs.model import Bind, Control, Map, Stroke
from player.inputs.osc import Known, OscBinds
from player.inputs.send_clock import ClockSender

TICK_S = 0.005
FIBERS = 48


def each(deed: Callable[[], object], times: int) -> float:
    """Seconds of one, the best of five runs."""
    best, times = float("inf"), times // 20 if "--small" in sys.argv else times
    for _ in range(5):
        begin = time.perf_counter()
        for _ in range(times):
            deed()
        best = min(best, (time.perf_counter() - begin) / times)
    return best


def told(what: str, seconds: float) -> None:
    """One line."""
    print(f"{what:<58} {seconds / TICK_S:8.3%} of a tick, {TICK_S / seconds:10.0f} in one")


def main() -> None:
    """All of it."""
    deed = Stroke(tuple(range(36)), 0.0, 0.8, "gentle", True)
    hand = Map("m", 1.0, tuple(Bind(Control("cc", n, 1), "/reeds" if n == 0 else "", deed, 1) for n in range(100)))
    binds, stream = MidiBinds(hand, FIBERS), MidiStream()
    data, message = bytes.fromhex("B01540"), Message("control_change", control=21, value=64)
    told("bytes of a controller into a message", each(lambda: stream.feed(data), 2000))
    told("a controller with pickup, of 100 binds", each(lambda: binds.hear("box", message, 0.0), 2000))
    told("a controller that nothing is bound to", each(lambda: binds.hear("box", message.copy(control=110), 0.0), 2000))
    told("binds, a tick without anything", each(lambda: binds.tick(0.0), 2000))

    follower, number = ClockFollower(), 0

    def clock() -> None:
        nonlocal number
        follower.hear(Timing("seq", number / 48, "clock"))
        number += 1

    told("a tick of MIDI clock heard", each(clock, 2000))

    def asked() -> None:
        clock()
        follower.beat(number / 48)

    told("a tick of MIDI clock heard, and the tempo asked for", each(asked, 1000))
    sender, beat = ClockSender(), Beat(0.0, 0.0, 2.0)
    told("a tick of ours with a clock sent", each(lambda: sender.until(beat, 0.0, 0.0), 2000))

    builder = OscMessageBuilder("/drawcord/group/reeds")
    builder.add_arg(0.5)
    packet = builder.build().dgram
    osc, now = OscBinds(hand, Known({}, {"reeds": deed.fibers})), [0.0]

    def heard() -> None:
        now[0] += 0.001
        osc.hear(packet, now[0], 1.7e9)

    good = each(heard, 2000)
    told("an OSC packet", good)
    deep = b"/a\0\0"
    for _ in range(400):
        deep = b"#bundle\0" + struct.pack(">Qi", 1, len(deep)) + deep
    bad = osc.refused["deep"]

    def hostile() -> None:
        now[0] += 0.001
        osc.hear(deep, now[0], 1.7e9)

    told("bundles 400 deep, refused", each(hostile, 2000))
    flood = each(lambda: osc.hear(packet, 0.0, 1.7e9), 20000)
    told("an OSC packet of a flood, refused", flood)
    refused = osc.refused["deep"] - bad
    print(f"a packet refused in a flood costs {flood / good:.2f} of one that is taken; {refused} refused as deep")

    feedback, stroke = Feedback(hand), np.zeros(FIBERS)

    def moved() -> None:
        now[0] += TICK_S
        stroke[:] = now[0] % 1.0
        feedback.messages(now[0], stroke)

    told("feedback to 100 faders that all move", each(moved, 500))


if __name__ == "__main__":
    main()
