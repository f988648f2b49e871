"""A simulated board behind a pseudo-terminal: the device's side of the wire on a real clock, over the simulated rig."""

import errno
import gc
import os
import pty
import select
import tty
from collections import deque
from collections.abc import Callable
from contextlib import suppress
from random import Random

from player.engine.clock import SteadyClock
from player.outputs.serial_bench import BenchProcess
from player.wire.device import Applied, Changed, Device, Told
from player.wire.messages import ARMED, FAULTS, IDLE, STATUSES
from player.wire.mishaps import NONSENSE, STRIKES_AFTER_S, Mishap
from player.wire.rules import Build

SPIN_S = 0.0003
"""The last fraction before a due time is spent asking the time: the system wakes a sleeper up to this much too late."""
LOOK_S = 0.05
"""A signal is heeded, and a mishap strikes, at most so long after its time."""
PRIORITY = 10
JUMP_S = 0.1
BACKLOG_BYTES = 65536
"""What nobody reads is dropped beyond this, as a UART would."""

HEADER = "event,host_s,arrival_us,due_us,applied_us,late_us,first,count,note\n"


class SerialBoard:
    """One board; `path` is the terminal that a player opens. `run` lives until `stop` is called, from a signal's handler too.

    log: takes lines of CSV under HEADER; times in µs of the board's clock, host_s the machine's monotonic clock
    """

    def __init__(self, build: Build, bench: BenchProcess, mishap: Mishap, log: Callable[[str], None]):
        self._build, self._bench, self._mishap, self._log = mishap.build(build), bench, mishap, log
        self._clock = SteadyClock()
        self._chance = Random(1)
        self._master, slave = pty.openpty()
        tty.setraw(slave)
        self.path = os.ttyname(slave)
        # Kept open, so that the terminal outlives the players that come and go.
        self._slave = slave
        os.set_blocking(self._master, False)
        self._ends = False
        self._muted = mishap.mute
        self._struck = False
        self._spoils = mishap.garble is not None and not mishap.strike
        self._armed_s: float | None = None
        self._begin_s = self._clock.now()
        self._leaving: deque[tuple[float, bytes]] = deque()
        self._waiting = bytearray()
        log(HEADER)
        self._device = self._make()

    def _make(self) -> Device:
        device = Device(self._build, self._us(), self._bench.set_valves, self._bench.strain, self._bench.supply)
        if self._mishap.room is not None:
            device.room = self._mishap.room
        return device

    def stop(self) -> None:
        """End `run` soon."""
        self._ends = True

    def run(self) -> None:
        """Serve until `stop`; then everything is vented and the terminal is gone."""
        with suppress(OSError, AttributeError):
            # Where the system permits it, other work does not hold a due set up; where not, the log shows what it costs.
            os.sched_setscheduler(0, os.SCHED_FIFO, os.sched_param(PRIORITY))
        gc.collect()
        gc.freeze()
        gc.disable()
        try:
            while not self._ends:
                self._turn()
        finally:
            gc.enable()
            self._bench.set_valves(0, [0] * self._bench.channels)
            self._note("end", "every channel vented")
            os.close(self._slave)
            os.close(self._master)

    def _turn(self) -> None:
        """Wait for bytes or a due time, whichever is first; then do it."""
        now_s = self._clock.now()
        due_s = self._when(self._device.next_us())
        until_s = min(due_s, self._leaving[0][0]) if self._leaving else due_s
        wait_s = min(until_s - now_s - SPIN_S, LOOK_S)
        wants = [self._master] if self._waiting else []
        readable = select.select([self._master], wants, [], max(0.0, wait_s))[0]
        if readable:
            self._receive()
        else:
            if due_s - self._clock.now() <= 2.0 * SPIN_S:
                self._clock.wait_until(due_s)
            self._after(self._device.advance(self._us()))
        self._strike()
        self._send()

    def _receive(self) -> None:
        try:
            data = os.read(self._master, 65536)
        except BlockingIOError:
            return
        except OSError as error:
            if error.errno != errno.EIO:
                raise
            return
        if self._muted and not self._mishap.mute:
            return
        if self._mishap.echoes:
            self._leaving.append((self._clock.now(), data))
        if self._spoils:
            data = self._mishap.garble(data, self._chance)
        self._after(self._device.receive(data, self._us()))

    def _after(self, events: list[Applied | Changed | Told]) -> None:
        """Write down what has happened, and when it truly did."""
        if not events:
            return
        now_s, now_us = self._clock.now(), self._us()
        for event in events:
            if isinstance(event, Applied):
                due = event.due_us or event.arrival_us
                self._log(
                    f"set,{now_s:.6f},{event.arrival_us},{event.due_us},{now_us},{now_us - due},"
                    f"{event.first},{event.count},{'late' if event.late else ''}\n"
                )
            elif isinstance(event, Changed):
                self._note("status", f"{STATUSES[event.was]} to {STATUSES[event.now]}: {event.why}")
                if event.now == ARMED:
                    self._armed_s = now_s
                elif event.now != IDLE or event.was == ARMED:
                    self._armed_s = None
            else:
                self._note("fault", f"{event.code} {FAULTS[event.code]}, channel {event.channel}: {event.text}")

    def _strike(self) -> None:
        """Go wrong, once, some time after arming."""
        what = self._mishap.strike
        if not what or self._struck or self._armed_s is None or self._clock.now() < self._armed_s + STRIKES_AFTER_S:
            return
        self._struck = True
        self._note("mishap", self._mishap.says)
        if what == "mute":
            self._muted = True
        elif what == "reset":
            self._begin_s = self._clock.now()
            self._leaving.clear()
            self._device = self._make()
            self._armed_s = None
        elif what == "jump":
            self._begin_s -= JUMP_S
        elif what == "garble":
            self._spoils = True
        elif what == "misread":
            self._after(self._device.receive(NONSENSE, self._us()))
        elif what == "tell":
            self._after(self._device.fail(*self._mishap.tells, self._us()))
        else:
            self._bench.strike()

    def _send(self) -> None:
        out = self._device.to_send()
        now_s = self._clock.now()
        if out and not self._muted:
            if self._spoils:
                out = self._mishap.garble(out, self._chance)
            self._leaving.append((now_s + self._mishap.answers_after_s, out))
        while self._leaving and self._leaving[0][0] <= now_s:
            self._waiting += self._leaving.popleft()[1]
        if len(self._waiting) > BACKLOG_BYTES:
            self._waiting.clear()
        if self._waiting:
            with suppress(BlockingIOError):
                del self._waiting[: os.write(self._master, self._waiting)]

    def _us(self) -> int:
        return int((self._clock.now() - self._begin_s) * 1e6 * self._mishap.rate)

    def _when(self, us: int) -> float:
        """The machine's time of a reading of the board's clock, the first at which the reading is reached."""
        return self._begin_s + (us + 0.5) / (1e6 * self._mishap.rate)

    def _note(self, event: str, note: str) -> None:
        quoted = note.replace('"', '""')
        self._log(f'{event},{self._clock.now():.6f},,,{self._us()},,,,"{quoted}"\n')
