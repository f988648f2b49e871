"""MIDI ports through python-rtmidi: opened by part of their name, watched for coming and going. No MIDI is understood here."""

import os
import threading
from collections import deque
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager, suppress
from dataclasses import dataclass
from typing import Any

from mido import Message

from composer.faults import fault, nearest
from player.inputs.midi_stream import REFUSED, MidiStream
from player.inputs.stamps import Stamps

try:
    import rtmidi
except ImportError:  # its libraries of ALSA or JACK are not there: that is a machine without MIDI
    rtmidi = None

CLIENT = "drawcord"
LOOK_S = 1.0
"""How often it is looked whether ports have come or gone."""

MOST_KEPT = 16384
"""Messages of a port that wait to be read, and changes of ports; further ones are dropped."""

MOST_A_POLL = 1024

_ERRORS: tuple[type[Exception], ...] = (rtmidi.RtMidiError,) if rtmidi else ()

NO_MIDI = "no MIDI system answers on this machine: neither ALSA nor a running JACK server"


@dataclass(frozen=True, slots=True)
class Found:
    """A port: its name, "in" for one that is heard, "out" for one that is sent to, and the system that has it."""

    name: str
    way: str
    system: str


@dataclass(frozen=True, slots=True)
class Heard:
    """A message of a port at a moment of the steady clock."""

    source: str
    message: Message
    at_s: float


@dataclass(frozen=True, slots=True)
class Change:
    """A port is "lost" or "back"."""

    source: str
    kind: str
    at_s: float


def midi_ports_found() -> list[Found]:
    """Every MIDI port of this machine; none where no MIDI system answers."""
    found = []
    for api, system in _systems():
        for way, make in (("in", rtmidi.MidiIn), ("out", rtmidi.MidiOut)):
            scout = _client(make, api)
            if scout is not None:
                found += [Found(name, way, system) for name in _names(scout)]
                scout.delete()
    return found


def is_midi_there() -> bool:
    """Whether any MIDI system answers."""
    for api, _ in _systems():
        scout = _client(rtmidi.MidiIn, api)
        if scout is not None:
            scout.delete()
            return True
    return False


class MidiPorts:
    """Ports to hear and to send to, each named by part of its name; "" means every one there is.

    A named port that is not there yet is waited for: `poll` takes it up when it comes, and again when it comes back.
    """

    def __init__(self, now: Callable[[], float], hear: Sequence[str] = (), send: Sequence[str] = ()):
        """now: the steady clock. Raises `Faults` where no MIDI system answers."""
        self._now = now
        self._hear, self._send = tuple(hear), tuple(send)
        self._ins: dict[str, _In] = {}
        self._outs: dict[str, Any] = {}
        self._changes: deque[Change] = deque(maxlen=MOST_KEPT)
        self._were: set[str] = set()
        self._failed: set[str] = set()
        self._refused = dict.fromkeys(REFUSED, 0)
        self._scouts = [(api, _client(rtmidi.MidiIn, api), _client(rtmidi.MidiOut, api)) for api, _ in _systems()]
        if not any(scout for _, scout, _ in self._scouts):
            raise fault("MIDI", NO_MIDI, hint="'drawcord ports' lists what there is")
        # Ports are opened and closed by a thread of its own: that takes tens of milliseconds, and holds no lock meanwhile.
        self._lock = threading.Lock()
        self._looking: threading.Thread | None = None
        self._looked_s = now()
        self._look()

    @property
    def sources(self) -> tuple[str, ...]:
        """The ports that are heard now."""
        return tuple(self._ins)

    @property
    def sinks(self) -> tuple[str, ...]:
        """The ports that can be sent to now."""
        return tuple(self._outs)

    @property
    def refused(self) -> dict[str, int]:
        """What was refused of all that came, by reason."""
        with self._lock:
            total = dict(self._refused)
            for port in self._ins.values():
                for why, count in port.stream.refused.items():
                    total[why] += count
        return total

    def missing(self) -> list[str]:
        """Sentences on named ports that are not there now."""
        there = [*self._ins, *self._outs]
        said = []
        for name in (*self._hear, *self._send):
            if not any(name in port for port in there):
                hint = nearest(name, there) or ("there are " + ", ".join(there) if there else "no port is there at all")
                said.append(f"no MIDI port has '{name}' in its name; it is taken up when it comes ({hint})")
        return said

    def poll(self) -> tuple[list[Heard], list[Change]]:
        """What has come in since the last time, in order of its moments, and which ports have come or gone."""
        now_s = self._now()
        if now_s - self._looked_s >= LOOK_S and (self._looking is None or not self._looking.is_alive()):
            self._looked_s = now_s
            self._looking = threading.Thread(target=self._look, name="midi ports", daemon=True)
            self._looking.start()
        heard: list[Heard] = []
        with self._lock:
            for source, port in self._ins.items():
                heard += [Heard(source, message, at_s) for at_s, message in port.taken(MOST_A_POLL)]
            changes = list(self._changes)
            self._changes.clear()
        heard.sort(key=lambda one: one.at_s)
        return heard, changes

    def send(self, message: Message, port: str = "") -> None:
        """Send to every open port with `port` in its name; one that fails is let go, and taken up again when it is back."""
        with self._lock:
            for name, out in self._outs.items():
                if port in name:
                    try:
                        out.send_message(message.bytes())
                    except (*_ERRORS, ValueError):
                        self._failed.add(name)

    def close(self) -> None:
        """Let go of all ports."""
        if self._looking is not None:
            self._looking.join()
        for name in list(self._ins):
            self._close_in(name)
        for name in list(self._outs):
            self._close_out(name)
        for _, *scouts in self._scouts:
            for scout in scouts:
                if scout is not None:
                    scout.delete()
        self._scouts = []

    def _look(self) -> None:
        """Open what has come, close what has gone."""
        there: dict[str, tuple[int, int]] = {}
        sinks: dict[str, tuple[int, int]] = {}
        for api, hears, sends in self._scouts:
            there |= {name: (api, index) for index, name in enumerate(_names(hears)) if not name.startswith(CLIENT)}
            sinks |= {name: (api, index) for index, name in enumerate(_names(sends)) if not name.startswith(CLIENT)}
        for name in [name for name in self._ins if name not in there]:
            self._close_in(name)
            self._tell(name, "lost")
        for name in [name for name in self._outs if name not in sinks or name in self._failed]:
            self._close_out(name)
        for name, (api, index) in there.items():
            if name not in self._ins and any(wanted in name for wanted in self._hear):
                self._open_in(name, api, index)
        for name, (api, index) in sinks.items():
            if name not in self._outs and any(wanted in name for wanted in self._send):
                with suppress(*_ERRORS):
                    out = rtmidi.MidiOut(api, CLIENT)
                    out.open_port(index, "out")
                    with self._lock:
                        self._outs[name] = out

    def _tell(self, name: str, kind: str) -> None:
        with self._lock:
            self._changes.append(Change(name, kind, self._now()))

    def _open_in(self, name: str, api: int, index: int) -> None:
        try:
            port = _In(api, index, self._now)
        except _ERRORS:
            return
        with self._lock:
            self._ins[name] = port
        if name in self._were:
            self._tell(name, "back")
        self._were.add(name)

    def _close_in(self, name: str) -> None:
        with self._lock:
            port = self._ins.pop(name)
            for why, count in port.stream.refused.items():
                self._refused[why] += count
        port.close()

    def _close_out(self, name: str) -> None:
        with self._lock:
            out = self._outs.pop(name)
            self._failed.discard(name)
        with suppress(*_ERRORS):
            out.close_port()
        out.delete()


class _In:
    """An open port. What comes is kept by the backend until it is read.

    No callback: one would have the backend's thread wait for Python's lock, and a JACK client that is late loses messages.
    """

    def __init__(self, api: int, index: int, now: Callable[[], float]):
        self.stream = MidiStream()
        self._now = now
        self._stamps = Stamps()
        self._read_s = now()
        self._port = rtmidi.MidiIn(api, CLIENT, queue_size_limit=MOST_KEPT)
        self._port.ignore_types(sysex=False, timing=False, active_sense=False)
        try:
            self._port.open_port(index, "in")
        except _ERRORS:
            self._port.delete()
            raise

    def taken(self, most: int) -> list[tuple[float, Message]]:
        """What waits, at most so many."""
        out: list[tuple[float, Message]] = []
        now_s = self._now()
        waited_s, self._read_s = now_s - self._read_s, now_s
        while len(out) < most and (event := self._port.get_message()) is not None:
            data, interval_s = event
            at_s = self._stamps.at(now_s, interval_s, waited_s)
            out += [(at_s, message) for message in self.stream.feed(bytes(data))]
        return out

    def close(self) -> None:
        """Let go of it."""
        with suppress(*_ERRORS):
            self._port.close_port()
        self._port.delete()


def _systems() -> list[tuple[int, str]]:
    """The MIDI systems that python-rtmidi was built for, but not the one that does nothing."""
    if rtmidi is None:
        return []
    apis = [api for api in rtmidi.get_compiled_api() if api != rtmidi.API_RTMIDI_DUMMY]
    return [(api, rtmidi.get_api_display_name(api)) for api in apis]


def _client(make: Callable[..., Any], api: int) -> Any | None:
    """A client of a system, None where that system does not answer."""
    try:
        with _hushed():
            return make(api, CLIENT)
    except _ERRORS:
        return None


def _names(scout: Any | None) -> list[str]:
    """The names of a scout's ports, made unlike one another where two have the same."""
    if scout is None:
        return []
    try:
        names = scout.get_ports()
    except _ERRORS:
        return []
    seen: dict[str, int] = {}
    out = []
    for name in names:
        seen[name] = seen.get(name, 0) + 1
        out.append(name if seen[name] == 1 else f"{name} ({seen[name]})")
    return out


@contextmanager
def _hushed() -> Iterator[None]:
    """The C libraries of ALSA and JACK write to stderr that they found nothing, which the caller says in a sentence."""
    # A JACK server is not to be started by asking for its ports.
    os.environ.setdefault("JACK_NO_START_SERVER", "1")
    try:
        kept, null = os.dup(2), os.open(os.devnull, os.O_WRONLY)
    except OSError:
        yield
        return
    try:
        os.dup2(null, 2)
        yield
    finally:
        os.dup2(kept, 2)
        os.close(kept)
        os.close(null)
