"""What can go wrong with a board and its line, each a row of one table, for the simulated board to do on purpose.

Nothing here knows of files or clocks: a mishap changes the board's build, its clock, the bytes each way, or strikes at a time
after arming.
"""

import re
from collections.abc import Callable
from dataclasses import dataclass, replace
from random import Random
from typing import Any

from player.wire.frames import frame
from player.wire.messages import OVER_PRESSURE, SENSOR, Set, encode
from player.wire.rules import Build

STRIKES_AFTER_S = 3.0
"""So long after arming strikes what does not go wrong from the start."""

NONSENSE = b"\0" + frame(encode(Set(0, 65535, (0,)), 0))
"""A set of a channel that no board has; whatever was coming in before it is cut off."""

Garble = Callable[[bytes, Random], bytes]


@dataclass(frozen=True, slots=True)
class Mishap:
    """A way to go wrong.

    build: what the board says it is, changed; garble: what happens to the bytes, each way
        (from the strike on, where there is one)
    answers_after_s: how late its bytes leave; rate: how fast its clock runs; echoes: the line also sends back what it carries
    room: sets that its queue really keeps; mute: it never says anything
    strike: what to do to the board at STRIKES_AFTER_S after arming, one of "mute", "reset", "jump", "garble", "misread",
        "tell", "bench"
    tells: for "tell", the code, channel and text of the fault; bench: for "bench", what becomes of the simulated rig
    """

    says: str
    build: Callable[[Build], Build] = lambda build: build
    garble: Garble | None = None
    answers_after_s: float = 0.0
    rate: float = 1.0
    echoes: bool = False
    room: int | None = None
    mute: bool = False
    strike: str = ""
    tells: tuple[int, int, str] = (0, 0, "")
    bench: Callable[[Any], None] = lambda bench: None


def _flipped(share: float) -> Garble:
    """Each byte with a chance of `share` becomes another one."""

    def garble(data: bytes, chance: Random) -> bytes:
        return bytes(byte ^ chance.randrange(1, 256) if chance.random() < share else byte for byte in data)

    return garble


def _lost(share: float) -> Garble:
    """Each byte with a chance of `share` is lost."""

    def garble(data: bytes, chance: Random) -> bytes:
        return bytes(byte for byte in data if chance.random() >= share)

    return garble


def _cut(share: float) -> Garble:
    """Each frame with a chance of `share` is cut off at any of its bytes; every other of these runs into the next frame."""

    def cut(frame: bytes, chance: Random) -> bytes:
        if len(frame) < 2 or chance.random() >= share:
            return frame
        kept = frame[: chance.randrange(len(frame))]
        return kept if chance.random() < 0.5 else kept.rstrip(b"\0") + b"\0"

    def garble(data: bytes, chance: Random) -> bytes:
        return b"".join(cut(frame, chance) for frame in re.findall(rb"[^\0]*\0|[^\0]+", data))

    return garble


def _sticks(bench: Any) -> None:
    bench.stuck[0] = int(bench.numbers[0])


def _rails(bench: Any) -> None:
    bench.railed.add(0)


def _leaks(bench: Any) -> None:
    bench.leaking[0] = 1.0


def _runs_low(bench: Any) -> None:
    bench.low_supply = True


def _other_rig(build: Build) -> Build:
    return replace(build, rig=(build.rig or 0) ^ 0xFFFFFFFF)


MISHAPS: dict[str, Mishap] = {
    "mute": Mishap("hears, and never says a word", mute=True),
    "silent": Mishap("3 s after arming it neither hears nor says anything more", strike="mute"),
    "garbles": Mishap("one byte in a hundred, each way, is another one", garble=_flipped(0.01)),
    "garbles-much": Mishap("one byte in ten, each way, is another one", garble=_flipped(0.1)),
    "garbles-later": Mishap(
        "3 s after arming one byte in ten, each way, becomes another one", garble=_flipped(0.1), strike="garble"
    ),
    "noise-later": Mishap("3 s after arming every byte, each way, becomes another one", garble=_flipped(1.0), strike="garble"),
    "noise": Mishap("every byte, each way, is another one", garble=_flipped(1.0)),
    "loses": Mishap("one byte in a hundred, each way, is lost", garble=_lost(0.01)),
    "cuts": Mishap("one frame in twenty, each way, is cut off anywhere", garble=_cut(0.05)),
    "misreads": Mishap("3 s after arming it hears a command that makes no sense", strike="misread"),
    "echoes": Mishap("the line also sends back whatever it carries", echoes=True),
    "late-answers": Mishap("everything it says leaves 0.7 s late", answers_after_s=0.7),
    "resets": Mishap("3 s after arming it starts anew, vented, its clock at 0", strike="reset"),
    "full-queue": Mishap("says that it keeps 64 sets, and keeps one", room=1),
    "over-pressure": Mishap(
        "3 s after arming it finds channel 0 over its pressure", strike="tell", tells=(OVER_PRESSURE, 0, "over-pressure")
    ),
    "sensor": Mishap("3 s after arming the sensor of channel 0 fails", strike="tell", tells=(SENSOR, 0, "sensor failed")),
    "wrong-rig": Mishap("serves another rig", build=_other_rig),
    "few-channels": Mishap(
        "has one channel less than the rig wants",
        build=lambda build: replace(build, drives=build.drives[:-1] or build.drives),
    ),
    "slow-clock": Mishap("its clock is 1 % slow", rate=0.99),
    "fast-clock": Mishap("its clock is 1 % fast", rate=1.01),
    "jumping-clock": Mishap("3 s after arming its clock jumps ahead by 0.1 s", strike="jump"),
    "stuck-valve": Mishap("3 s after arming the valve of channel 0 no longer moves", strike="bench", bench=_sticks),
    "railed": Mishap("3 s after arming the sensor of channel 0 reads full stroke", strike="bench", bench=_rails),
    "leak": Mishap(
        "3 s after arming the fiber of channel 0 loses half of its strain each second", strike="bench", bench=_leaks
    ),
    "low-supply": Mishap("3 s after arming the supply reads below the rig's least", strike="bench", bench=_runs_low),
}
"""Name of each: what it does. `drawcord device RIG --fault NAME`."""
