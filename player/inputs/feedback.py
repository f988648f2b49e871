"""What the governor lets through, back to the controllers: motor faders and lights. No port in here."""

from collections.abc import Collection

import numpy as np
from mido import Message
from numpy.typing import NDArray

from player.inputs.model import Bind, Control, Map, Play, Stroke
from player.inputs.schema import KINDS

Array = NDArray[np.float64]

EVERY_S = 0.04
"""Least time between two messages to one control."""

HANDS_OFF_S = 0.5
"""A fader that a hand has moved is left alone for so long: a motor must not fight a hand."""

MOST_A_CALL = 8
"""Messages of one call: a MIDI 1.0 line carries about a thousand a second."""

MOST_LOOKED = 64
"""Controls looked at in one call; the next call looks at those that follow."""

_MOVES = ("cc", "cc14", "bend", "note")


class Feedback:
    """Values in, messages out, each with the part of a port's name that its bind gives ("" for any)."""

    def __init__(self, map_: Map):
        self._rows = [
            (index, bind, bind.control)
            for index, bind in enumerate(map_.binds)
            if bind.control is not None and bind.control.kind in _MOVES and isinstance(bind.deed, Stroke | Play)
        ]
        self._sent: dict[int, int] = {}
        self._sent_s: dict[int, float] = {}
        self._hand_s: dict[int, float] = {}
        self._turn = 0

    def heard(self, bind: int, at_s: float) -> None:
        """A hand has moved the control of a bind."""
        self._hand_s[bind] = at_s
        self._sent.pop(bind, None)

    def again(self) -> None:
        """A controller has been plugged in: all values are sent to it anew."""
        self._sent.clear()

    def messages(self, now_s: float, stroke: Array, playing: Collection[int] = ()) -> list[tuple[str, Message]]:
        """What to send after a tick.

        Args:
            now_s: seconds of the caller's steady clock
            stroke: (F,) what the governor lets through, shares of usable stroke
            playing: binds whose phrase plays now
        """
        out: list[tuple[str, Message]] = []
        for _ in range(min(MOST_LOOKED, len(self._rows))):
            index, bind, control = self._rows[self._turn]
            self._turn = (self._turn + 1) % len(self._rows)
            if now_s - self._hand_s.get(index, -np.inf) < HANDS_OFF_S or now_s - self._sent_s.get(index, -np.inf) < EVERY_S:
                continue
            value = _value(bind, control, stroke, index in playing)
            if self._sent.get(index) == value:
                continue
            self._sent[index], self._sent_s[index] = value, now_s
            out += [(control.port, message) for message in _messages(control, value)]
            if len(out) >= MOST_A_CALL:
                break
        return out


def _value(bind: Bind, control: Control, stroke: Array, playing: bool) -> int:
    full = KINDS[control.kind].full
    if isinstance(bind.deed, Stroke):
        return round(full * bind.deed.value(float(stroke[list(bind.deed.fibers)].mean())))
    return full if playing else 0


def _messages(control: Control, value: int) -> list[Message]:
    """The messages that bring a control to a value in its own numbers."""
    channel = max(control.channel, 1) - 1
    if control.kind == "cc14":
        return [
            Message("control_change", channel=channel, control=control.number, value=value >> 7),
            Message("control_change", channel=channel, control=control.number + 32, value=value & 127),
        ]
    if control.kind == "bend":
        return [Message("pitchwheel", channel=channel, pitch=value - 8192)]
    if control.kind == "note":
        return [Message("note_on", channel=channel, note=control.number, velocity=value)]
    return [Message("control_change", channel=channel, control=control.number, value=value)]
