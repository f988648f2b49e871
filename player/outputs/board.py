"""`serial:PORT[@BAUD]`: a board of valves at the other end of a serial line, spoken to by the wire protocol."""

from collections.abc import Callable
from contextlib import suppress

import numpy as np

from composer.faults import Faults
from composer.limits.abilities import Abilities
from composer.rig.model import Rig
from player.engine.clock import Clock
from player.outputs.base import Array, Event, LinkLost, Mark, fibers_of
from player.outputs.serial_line import SerialLine
from player.outputs.serial_ports import ports_found
from player.wire import link
from player.wire.host import Host
from player.wire.line import highest_rate, line_load, line_room, set_frames
from player.wire.messages import QUEUE_FULL, RIG_MISMATCH, SENSES_STRAIN
from player.wire.quality import Quality
from player.wire.values import SHUT, clip, is_valve, to_wire

GREET_S = 6.0
"""Seconds in which a board has to answer a greeting, asked again meanwhile."""

LISTEN_S, LONGEST_LISTEN_S = 0.6, 4.0
"""Seconds of pings before arming, so that the board's clock is known well; as many more as it takes, up to the second."""

ASK_LINE = "is it powered, and is this its port and baud rate?"

AT_REST = 0.25
"""Share of stroke that a fiber without pressure may be sensed at before arming: its sensor may be off by so much."""

FIND_S = 2.0
"""Seconds that a port is listened to in search of a board that was lost."""

TURN_S = 0.002
"""While waiting for a board, its line is looked at this often."""

WATCHDOG_MS = 250
"""After such a silence of the player the board vents by itself."""

STATUS = {link.READY: "idle", link.ARMED: "armed", link.VENTED: "vented", link.FAILED: "fault"}


class Board:
    """One board; its clock is known from pings, and every set carries its due time on that clock."""

    must_arm = True

    def __init__(self, rig: Rig, abilities: Abilities, driver: str, port: str, baud: int, clock: Clock):
        self.target, self.drivers = f"serial:{port}@{baud}", (driver,)
        self.queue_sets = 0
        self._clock, self._baud, self._rig = clock, baud, rig
        self._stroke = abilities.stroke
        self._port, self._name = port, ""
        self._line = SerialLine(port, baud)
        self._fibers = fibers_of(rig, self.drivers)
        self._channel = np.array([rig.fibers[i].channel for i in self._fibers], dtype=np.int64)
        self._valve = is_valve([rig.fibers[i].mounting.valve.drive for i in self._fibers])
        channels = int(self._channel.max(initial=0)) + 1
        self._values = np.zeros(channels, dtype=np.uint16)
        self._values[self._channel[self._valve]] = SHUT
        self._fiber_of = np.full(channels, -1, dtype=np.int64)
        self._fiber_of[self._channel] = self._fibers
        self._host = Host(channels, rig.fingerprint, watchdog_ms=WATCHDOG_MS)
        self._place = np.zeros(len(rig.fibers), dtype=np.int64)
        self._place[self._fibers] = np.arange(len(self._fibers))
        self._share = np.full(len(self._fibers), np.nan)
        self._why = ""
        self._supply_kPa: float | None = None
        self._sets = self._dropped = 0
        self._quality = Quality()

    def open(self) -> None:
        """Take hold of the port and greet the board."""
        self._line.open()
        self._host.open(self._clock.now())
        self._flush()

    def preflight(self, rate_Hz: float) -> tuple[Mark, ...]:
        """Greet, configure and listen; then a mark for each thing that must be true before arming."""
        who, host = self.drivers[0], self._host
        channels = len(self._values)
        most = highest_rate(channels, self._baud)
        carries = Mark(
            f"{who}: {self._baud} baud carry {rate_Hz:g} Hz",
            rate_Hz <= most,
            f"{line_load(channels, rate_Hz):.0f} bytes a second are wanted, {line_room(self._baud):.0f} may be sent",
            f"with {channels} channels this line carries up to {most} Hz: play with --rate {most}"
            if most >= 1
            else "this line is too slow for so many channels",
        )
        if not carries.ok:
            return (carries,)
        if host.state not in (link.GREETING, link.CONFIGURING, link.READY):
            host.open(self._clock.now())
        self._until(lambda: host.state in (link.READY, link.FAILED), GREET_S)
        if host.state == link.READY:
            self._until(lambda: host.state == link.FAILED, LISTEN_S)
            self._until(lambda: host.state == link.FAILED or self._bound_us() < 5e5 / rate_Hz, LONGEST_LISTEN_S)
        board, trouble = host.board, host.trouble
        if board is None:
            return (Mark(f"{who}: the board answers", False, self._why, ASK_LINE), carries)
        self.queue_sets = board.queue // set_frames(channels)
        self._name = board.name
        mismatch = trouble is not None and trouble.code == RIG_MISMATCH
        covers = board.channels >= channels
        marks = [
            Mark(f"{who}: the board answers", True, board.name),
            Mark(
                f"{who}: it has the channels that the rig uses",
                covers,
                f"{board.channels}, the rig uses {channels}",
                "connect the board that this rig was made for",
            ),
            Mark(
                f"{who}: it is set up for this rig",
                not mismatch,
                f"fingerprint {self._rig.fingerprint:08x}" if not mismatch else trouble.text,
                "load the rig onto the board again, or play with the rig file that it has",
            ),
            carries,
        ]
        if covers and not mismatch:
            ready = host.state == link.READY
            marks.append(Mark(f"{who}: it is ready to arm", ready, "" if ready else self._why, ASK_LINE))
        if host.state == link.READY:
            bound = self._bound_us()
            marks.append(
                Mark(
                    f"{who}: its clock is known well enough to land within a tick",
                    bound < 1e6 / rate_Hz,
                    f"to {bound / 1e3:.2f} ms; a tick is {1e3 / rate_Hz:g} ms",
                    "the line is slow or disturbed: look at the cable, or play at a lower --rate",
                )
            )
            if board.flags & SENSES_STRAIN:
                marks.append(self._sensors())
            if host.supply_kPa is not None:
                least = self._rig.supply.min_pressure_kPa
                marks.append(
                    Mark(
                        f"{who}: the supply is above its minimum",
                        host.supply_kPa >= least,
                        f"{host.supply_kPa:.0f} kPa, at least {least:.0f}",
                        "let the compressor fill the receiver",
                    )
                )
        return tuple(marks)

    def _sensors(self) -> Mark:
        """Whether every sensor of strain speaks, and says what a fiber at rest would."""
        asked, hint = f"{self.drivers[0]}: its sensors are alive", "look at the sensors' plugs and cables"
        if np.isnan(self._share).any():
            return Mark(asked, False, "nothing is sensed" if np.isnan(self._share).all() else "not all of them speak", hint)
        high = np.flatnonzero(self._share > AT_REST)
        if high.size:
            names = [self._rig.fibers[self._fibers[one]].name for one in high]
            found = ", ".join(f"{name} reads {share:.0%}" for name, share in zip(names[:4], self._share[high], strict=False))
            more = f", and {len(names) - 4} more" if len(names) > 4 else ""
            hint = "these fibers should be at rest: let them come down, or look at the sensor"
            return Mark(asked, False, found.replace("%", " %") + " of stroke" + more, hint)
        return Mark(asked, True, f"{len(self._fibers)} of them")

    def arm(self) -> None:
        """Arm, and wait for the board to say so."""
        host = self._host
        if not host.arm(self._clock.now()):
            raise LinkLost(f"the board is not ready to arm: {self._why or host.state}")
        self._until(lambda: host.state != link.ARMING, GREET_S)
        if host.state != link.ARMED:
            raise LinkLost(f"the board did not arm: {self._why}")
        # Whatever was heard until now is gone: the supply is told anew to whoever listens from here on.
        self._supply_kPa = None

    def send(self, due_s: float, command: Array) -> None:
        """Send a set of all channels that the rig uses; counted as skipped where the board's queue is full."""
        self._values[self._channel] = to_wire(clip(command[self._fibers], self._valve)[0], self._valve)
        self._sets += self._host.set(due_s, 0, self._values.tolist(), self._clock.now())
        self._flush()

    def rest(self, over_s: float) -> None:
        """The board's own way to rest, then disarmed."""
        self._host.rest(over_s, self._clock.now())
        self._flush()

    def vent(self) -> None:
        """Vent, ahead of all that has not left yet."""
        if self._host.vent(self._clock.now()):
            # The zero ends whatever frame was cut short by going first.
            self._line.write(b"\0" + self._host.to_send(), first=True)

    def poll(self) -> list[Event]:
        """Bytes in, bytes out, and what they mean to the engine."""
        now = self._clock.now()
        heard = self._host.receive(self._line.read(), now) + self._host.tick(now)
        self._flush()
        events = [event for told in heard for event in self._meant(told)]
        lost = self._quality.look(now, self._host.bad + self._host.unreadable, self._host.frames)
        if lost is not None:
            say = f"the line garbles what it carries: {lost[0]} of the last {lost[1]} frames could not be read"
            events.append(Event("garbled", self.drivers[0], say))
        if self._host.supply_kPa is not None and self._host.supply_kPa != self._supply_kPa:
            self._supply_kPa = self._host.supply_kPa
            events.append(Event("supply", self.drivers[0], kPa=self._supply_kPa))
        return events

    def reattach(self) -> str:
        """Take hold of the board again: at its own port, or at another where a board of its name serves this rig.

        Raises LinkLost where it is nowhere found.
        """
        self._line.close()
        ports = [self._port, *(port.path for port in ports_found() if port.path != self._port)]
        for port in ports:
            if self._answers_at(port):
                self._port, self.target = port, f"serial:{port}@{self._baud}"
                return port
        raise LinkLost(f"{self._name or self.drivers[0]} is not found on any of the ports {', '.join(ports)}")

    def _answers_at(self, port: str) -> bool:
        """Whether this very board, ready for this rig, is at a port; then it is held."""
        line, host = SerialLine(port, self._baud), Host(len(self._values), self._rig.fingerprint, watchdog_ms=WATCHDOG_MS)
        try:
            line.open()
        except Faults:
            return False
        self._line, self._host = line, host
        self._share[:] = np.nan
        with suppress(LinkLost):
            host.open(self._clock.now())
            self._flush()
            self._until(lambda: host.state in (link.READY, link.FAILED), FIND_S)
            if host.state == link.READY and host.board.name == self._name:
                return True
        line.close()
        return False

    def counters(self) -> dict[str, float]:
        """Sets sent, and what host and board have counted."""
        host = self._host
        counted = {
            "sets": self._sets,
            "skipped": host.skipped,
            "dropped_at_board": self._dropped,
            "late_at_board": host.late,
            "bad_at_board": host.bad,
            "unreadable": host.unreadable,
            "echoes": host.echoes,
        }
        if host.clock.known:
            counted["clock_bound_us"] = round(host.clock.bound_us(self._clock.now()), 1)
            counted["round_trip_us"] = round(host.clock.round_trip_us, 1)
        return counted

    def close(self) -> None:
        """Let go of the port."""
        self._line.close()

    def _bound_us(self) -> float:
        return self._host.clock.bound_us(self._clock.now())

    def _flush(self) -> None:
        self._line.write(self._host.to_send())

    def _until(self, done: Callable[[], bool], seconds: float) -> None:
        """Talk with the board until it is done, or so many seconds have gone."""
        end = self._clock.now() + seconds
        while not done() and self._clock.now() < end:
            self.poll()
            self._clock.wait_until(self._clock.now() + TURN_S)

    def _meant(self, told: link.Event) -> list[Event]:
        driver = self.drivers[0]
        if isinstance(told, link.Moved):
            self._why = told.why
            return [Event("state", driver, told.why, status=STATUS.get(told.now, told.now))]
        if isinstance(told, link.Trouble):
            self._dropped += told.code == QUEUE_FULL
            where = "" if told.channel is None else f"channel {told.channel}"
            return [Event("fault", driver, ", ".join(part for part in (where, told.text) if part), code=told.code)]
        if isinstance(told, link.Silent):
            return [Event("silent", driver, "nothing is heard from the board")]
        if isinstance(told, link.Back):
            return [Event("note", driver, f"the board is heard again after {told.after_s:.2f} s")]
        first = told.first
        fibers = self._fiber_of[first : first + len(told.strain)]
        share = np.array(told.strain[: len(fibers)], dtype=float) / 65535.0
        there = fibers >= 0
        self._share[self._place[fibers[there]]] = share[there]
        strokes = self._stroke[fibers[there]]
        return [Event("sense", driver, time_s=told.at_s, fibers=fibers[there], strain=share[there] * strokes)]
