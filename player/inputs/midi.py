"""MIDI messages into events: every bind of a map, for any number of controllers. No port and no clock in here.

Each port is a source by its name. Nothing that comes in can make this hold more than one entry for each control there is.
"""

from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np
from mido import Message
from numpy.typing import NDArray

from player.inputs.beat import Beat
from player.inputs.events import Ask, Back, Begin, End, Event, HoldToRun, Silent, Timing, Wanted
from player.inputs.model import Bind, Control, Does, Map, Play, Stroke
from player.inputs.schema import KINDS

Array = NDArray[np.float64]

SENSING_S = 0.33
"""A source that once sent active sensing is gone after so long without a byte: the standard's 300 ms and a tenth."""

PAIR_S = 0.02
"""A coarse part of a 14-bit control without a fine part within this time, before or after, stands for fine 0."""

_SOUND_OFF, _RESET_CONTROLS, _NOTES_OFF = 120, 121, 123
_CLOCKS = {"clock", "start", "continue", "stop"}
_FULL_FRAME = (0x7F, 0x01, 0x01)


@dataclass(slots=True)
class _Fine:
    """The two halves of a 14-bit control; `open`: the coarse part waits for a fine one."""

    coarse: int = 0
    fine: int = 0
    coarse_s: float = -np.inf
    fine_s: float = -np.inf
    open: bool = False


@dataclass(slots=True)
class _Port:
    """What is known of a source."""

    heard_s: float
    senses: bool = False
    silent: bool = False
    fine: dict[tuple[int, int], _Fine] = field(default_factory=dict)
    held: dict[tuple[int, int, int], tuple[tuple[object, ...], Play]] = field(default_factory=dict)
    pressed: set[tuple[int, int, int]] = field(default_factory=set)
    last: dict[int, float] = field(default_factory=dict)
    number: int = 0


class MidiBinds:
    """The binds of a map under the hands of whoever plays.

    present: (F,) the stroke that every fiber is wanted at now, for controls with pickup; the caller keeps it up to date
    beat: the running tempo for quantised starts; None: they start at once
    """

    def __init__(self, map_: Map, fibers: int):
        self.present: Array = np.zeros(fibers)
        self.beat: Beat | None = None
        self._map = map_
        self._ports: dict[str, _Port] = {}
        self._played = 0
        # The source and bind that moved each fiber last, as one number: what picks a control up, or lets it go again.
        self._mover = np.full(fibers, -1, dtype=np.int64)
        self._binds: dict[tuple[str, int], list[tuple[int, Bind, Control]]] = {}
        for index, bind in enumerate(map_.binds):
            if bind.control is not None:
                key = (bind.control.kind, bind.control.number)
                self._binds.setdefault(key, []).append((index, bind, bind.control))

    @property
    def sources(self) -> tuple[str, ...]:
        """The sources heard so far."""
        return tuple(self._ports)

    def hear(self, source: str, message: Message, at_s: float) -> list[Event]:
        """The events of a message that came from a source at a moment."""
        port = self._ports.get(source)
        if port is None:
            port = self._ports[source] = _Port(at_s, number=len(self._ports))
        port.heard_s = at_s
        events: list[Event] = []
        if port.silent:
            port.silent = False
            events.append(Back(source, at_s))
        reader = _READERS.get(message.type)
        if reader is not None:
            reader(self, events, _Here(source, at_s, port), message)
        return events

    def tick(self, now_s: float) -> list[Event]:
        """What follows from time alone: sources that have fallen silent, coarse parts that stay alone."""
        events: list[Event] = []
        for source, port in self._ports.items():
            here = _Here(source, now_s, port)
            for (channel, number), pair in port.fine.items():
                if pair.open and now_s - pair.coarse_s > PAIR_S:
                    pair.open = False
                    if pair.fine:
                        pair.fine = 0
                        self._move(events, here, "cc14", number, channel, pair.coarse << 7)
            if port.silent:
                continue
            gone_s = now_s - port.heard_s
            if port.senses and gone_s > SENSING_S:
                self._falls_silent(events, here, f"{source}: no sign of life for {gone_s:.2f} s")
            elif 0.0 < self._map.silence_s < gone_s:
                self._falls_silent(events, here, f"{source}: nothing came for {gone_s:.1f} s")
        return events

    def lost(self, source: str, at_s: float, why: str) -> list[Event]:
        """The events of a source whose port has vanished."""
        events: list[Event] = []
        port = self._ports.get(source)
        if port is not None and not port.silent:
            self._falls_silent(events, _Here(source, at_s, port), f"{source}: {why}")
        elif port is None:
            events.append(Silent(source, at_s, (), f"{source}: {why}"))
        return events

    def let_go(self, fibers: tuple[int, ...]) -> None:
        """Something else moves these fibers now: no source here drives them, and controls with pickup must pass anew."""
        self._mover[list(fibers)] = -1

    def _falls_silent(self, events: list[Event], here: "_Here", why: str) -> None:
        port = here.port
        for index, channel, number in sorted(port.pressed):
            # The way to rest of what strokes moved is the governor's: it takes the fibers of `Silent` down at their safe rate.
            if not isinstance(self._map.binds[index].deed, Stroke):
                self._lift(events, here, index, channel, number)
        port.pressed.clear()
        driven = np.flatnonzero((self._mover >= 0) & (self._mover // (len(self._map.binds) + 1) == port.number))
        events.append(Silent(here.source, here.at_s, tuple(int(fiber) for fiber in driven), why))
        self._mover[driven] = -1
        port.fine.clear()
        port.last.clear()
        port.silent, port.senses = True, False

    def _found(self, kind: str, number: int, channel: int, source: str) -> list[tuple[int, Bind, Control]]:
        return [
            row
            for row in self._binds.get((kind, number), ())
            if row[2].channel in (0, channel) and (not row[2].port or row[2].port in source)
        ]

    def _move(self, events: list[Event], here: "_Here", kind: str, number: int, channel: int, raw: int) -> None:
        """A control has a new value, in its own numbers."""
        value = raw / KINDS[kind].full
        for index, bind, _ in self._found(kind, number, channel, here.source):
            deed = bind.deed
            if isinstance(deed, Stroke):
                self._want(events, here, index, deed, value)
            elif value >= 0.5 and (index, channel, number) not in here.port.pressed:
                self._press(events, here, index, channel, number, value)
            elif value < 0.5:
                self._lift(events, here, index, channel, number)

    def _want(self, events: list[Event], here: "_Here", index: int, deed: Stroke, value: float) -> None:
        stroke = deed.stroke(value)
        fibers = list(deed.fibers)
        code = self._code(here.port, index)
        last, here.port.last[index] = here.port.last.get(index), stroke
        if deed.pickup and not (self._mover[fibers] == code).all() and not self._passes(deed, fibers, last, stroke):
            return
        self._mover[fibers] = code
        events.append(Wanted(here.source, here.at_s, deed.fibers, stroke, deed.how, index))

    def _code(self, port: _Port, index: int) -> int:
        return port.number * (len(self._map.binds) + 1) + index

    def _passes(self, deed: Stroke, fibers: list[int], last: float | None, stroke: float) -> bool:
        """Whether a control that went from `last` to `stroke` met the present value, or as near to it as it can go."""
        low, high = min(deed.low, deed.high), max(deed.low, deed.high)
        present = min(high, max(low, float(self.present[fibers].mean())))
        # The width of one step of a 7-bit control at the middle of its curve.
        return abs(stroke - present) <= (high - low) / 127.0 or (
            last is not None and (last - present) * (stroke - present) <= 0.0
        )

    def _press(self, events: list[Event], here: "_Here", index: int, channel: int, number: int, value: float) -> None:
        """A key or pedal has gone down."""
        deed = self._map.binds[index].deed
        key = (index, channel, number)
        here.port.pressed.add(key)
        if isinstance(deed, Does):
            held = deed.what == "hold_to_run"
            events.append(HoldToRun(here.source, here.at_s, True) if held else Ask(here.source, here.at_s, deed.what))
        elif isinstance(deed, Play):
            self._release(events, here, lambda held: held == key, retrigger=True)
            self._played += 1
            name = (here.source, index, channel, number, self._played)
            at_s = here.at_s if deed.quantise is None or self.beat is None else self.beat.next_s(here.at_s, deed.quantise)
            here.port.held[key] = (name, deed)
            self._mover[list(deed.fibers)] = self._code(here.port, index)
            events.append(Begin(here.source, at_s, deed.phrase, deed.fibers, value, name, deed.how, index))

    def _lift(self, events: list[Event], here: "_Here", index: int, channel: int, number: int) -> None:
        """A key or pedal has come up."""
        key = (index, channel, number)
        if key not in here.port.pressed:
            return
        here.port.pressed.discard(key)
        deed = self._map.binds[index].deed
        if isinstance(deed, Stroke):
            self._want(events, here, index, deed, 0.0)
        elif isinstance(deed, Does) and deed.what == "hold_to_run":
            events.append(HoldToRun(here.source, here.at_s, False))
        self._release(events, here, lambda held: held == key)

    def _release(
        self, events: list[Event], here: "_Here", which: Callable[[tuple[int, int, int]], bool], retrigger: bool = False
    ) -> None:
        """Let go of the phrases that are held; one that is struck again is not brought to rest first."""
        for key in [key for key in here.port.held if which(key)]:
            name, deed = here.port.held.pop(key)
            events.append(End(here.source, here.at_s, name, deed.fibers, deed.rest and not retrigger))

    def _control(self, events: list[Event], here: "_Here", message: Message) -> None:
        channel, number, value = message.channel + 1, message.control, message.value
        if number == _SOUND_OFF or number >= _NOTES_OFF:
            self._all_up(events, here, channel, ("note",))
        elif number == _RESET_CONTROLS:
            self._all_up(events, here, channel, ("cc", "cc14", "bend", "pressure", "poly_pressure"))
        else:
            self._move(events, here, "cc", number, channel, value)
            if number < 64:
                self._fourteen(events, here, number % 32, channel, number >= 32, value)

    def _fourteen(self, events: list[Event], here: "_Here", number: int, channel: int, fine: bool, value: int) -> None:
        if not self._found("cc14", number, channel, here.source):
            return
        pair = here.port.fine.setdefault((channel, number), _Fine())
        if fine:
            pair.fine, pair.fine_s, pair.open = value, here.at_s, False
        else:
            pair.coarse, pair.coarse_s, pair.open = value, here.at_s, here.at_s - pair.fine_s > PAIR_S
        self._move(events, here, "cc14", number, channel, pair.coarse << 7 | pair.fine)

    def _all_up(self, events: list[Event], here: "_Here", channel: int, kinds: tuple[str, ...]) -> None:
        """All keys, or all controllers, of a channel (0: of all) are let go."""
        for index, its_channel, number in sorted(here.port.pressed):
            control = self._map.binds[index].control
            if control is not None and control.kind in kinds and channel in (0, its_channel):
                self._lift(events, here, index, its_channel, number)

    def _note_on(self, events: list[Event], here: "_Here", message: Message) -> None:
        if message.velocity == 0:
            self._note_off(events, here, message)
            return
        channel = message.channel + 1
        for index, bind, _ in self._found("note", message.note, channel, here.source):
            if isinstance(bind.deed, Stroke):
                here.port.pressed.add((index, channel, message.note))
                self._want(events, here, index, bind.deed, message.velocity / 127.0)
            else:
                self._press(events, here, index, channel, message.note, message.velocity / 127.0)

    def _note_off(self, events: list[Event], here: "_Here", message: Message) -> None:
        channel = message.channel + 1
        for index, _, _ in self._found("note", message.note, channel, here.source):
            self._lift(events, here, index, channel, message.note)

    def _bend(self, events: list[Event], here: "_Here", message: Message) -> None:
        self._move(events, here, "bend", 0, message.channel + 1, message.pitch + 8192)

    def _pressure(self, events: list[Event], here: "_Here", message: Message) -> None:
        self._move(events, here, "pressure", 0, message.channel + 1, message.value)

    def _poly_pressure(self, events: list[Event], here: "_Here", message: Message) -> None:
        self._move(events, here, "poly_pressure", message.note, message.channel + 1, message.value)

    def _sensing(self, events: list[Event], here: "_Here", message: Message) -> None:
        here.port.senses = True

    def _reset(self, events: list[Event], here: "_Here", message: Message) -> None:
        self._all_up(events, here, 0, tuple(KINDS))
        here.port.senses = False

    def _clock(self, events: list[Event], here: "_Here", message: Message) -> None:
        events.append(Timing(here.source, here.at_s, message.type))

    def _songpos(self, events: list[Event], here: "_Here", message: Message) -> None:
        events.append(Timing(here.source, here.at_s, "songpos", message.pos))

    def _quarter_frame(self, events: list[Event], here: "_Here", message: Message) -> None:
        events.append(Timing(here.source, here.at_s, "quarter_frame", message.frame_type << 4 | message.frame_value))

    def _sysex(self, events: list[Event], here: "_Here", message: Message) -> None:
        data = tuple(message.data)
        if len(data) == 8 and (data[0], *data[2:4]) == _FULL_FRAME:
            value = int.from_bytes(bytes(data[4:8]), "big")
            events.append(Timing(here.source, here.at_s, "full_frame", value))


@dataclass(frozen=True, slots=True)
class _Here:
    """Where and when a message came in."""

    source: str
    at_s: float
    port: _Port


_READERS: dict[str, Callable[[MidiBinds, list[Event], _Here, Message], None]] = {
    "control_change": MidiBinds._control,
    "note_on": MidiBinds._note_on,
    "note_off": MidiBinds._note_off,
    "pitchwheel": MidiBinds._bend,
    "aftertouch": MidiBinds._pressure,
    "polytouch": MidiBinds._poly_pressure,
    "active_sensing": MidiBinds._sensing,
    "reset": MidiBinds._reset,
    "songpos": MidiBinds._songpos,
    "quarter_frame": MidiBinds._quarter_frame,
    "sysex": MidiBinds._sysex,
    **dict.fromkeys(_CLOCKS, MidiBinds._clock),
}
"""What is done with each type of message; types that are not here mean nothing."""
