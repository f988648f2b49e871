"""What a run shows of itself, tick by tick, in shared memory."""

from collections import deque
from collections.abc import Callable, Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from composer.limits.coil import coils_of
from composer.rig.model import Rig
from player.engine.loop import Engine
from player.engine.process.layout import LINE, LINES, NAME, STATE_NAMES, WORD, Writer, text
from player.engine.status import Status

Array = NDArray[np.float64]

EVERY_S = 0.008
"""Not more often than this: no screen is quicker, and the loop has better things to do."""

STILL = 1e-9


class Duties:
    """How much of what each coil may be on at a stretch is used up, (F,) shares, from what is sent."""

    def __init__(self, rig: Rig):
        self._coils = coils_of(rig)
        self._limited = self._coils.duty < 1.0
        self._spent_s = np.zeros(len(rig.fibers))
        self._was = np.zeros(len(rig.fibers))

    def tick(self, strain: Array | None, dt_s: float) -> None:
        """A tick has passed, at the end of which these strains (F,) are wanted."""
        if strain is None or not self._limited.any():
            return
        on = (np.abs(strain - self._was) > STILL) | (self._coils.holding & (strain > STILL))
        self._spent_s = np.maximum(self._spent_s + dt_s * (on - self._coils.duty), 0.0)
        self._was = strain

    @property
    def shares(self) -> Array:
        """(F,) shares; nan for coils that may be on for ever."""
        return np.where(self._limited, self._spent_s / self._coils.burst_s, np.nan)


class Show:
    """Fills the shared memory of a run. drivers: the boards' names, in the order of the layout's boards."""

    def __init__(self, memory: Writer, engine: Engine, rig: Rig, say_place: Callable[[float], str]):
        self._memory, self._engine, self._say_place = memory, engine, say_place
        self._drivers = [driver.name for driver in rig.drivers]
        self._duties = Duties(rig)
        self._lines: deque[str] = deque(maxlen=LINES)
        self._told = 0
        self._shown_s = float("-inf")
        self._ticks = 0
        memory.slot["cut"], memory.slot["held"] = 0, 1

    def tick(self, status: Status, view: Any | None, commanded: bool, attached: int) -> None:
        """After every tick, and while nothing is played; `view`: `player.live.source.View` where a hand plays."""
        engine = self._engine
        if status.ticks != self._ticks:
            self._duties.tick(engine.source.strain, (status.ticks - self._ticks) / engine.rate_Hz)
            self._ticks = status.ticks
        for line in status.told:
            self._lines.append(line)
        self._told += len(status.told)
        now = engine.clock.now()
        changed = STATE_NAMES[int(self._memory.slot["state"])] != status.state
        if now - self._shown_s < EVERY_S and not (changed or status.told):
            return
        self._shown_s = now
        self._fill(status, view, commanded, attached, now)
        self._memory.show()

    def _fill(self, status: Status, view: Any | None, commanded: bool, attached: int, now: float) -> None:
        slot, source, sensing = self._memory.slot, self._engine.source, self._engine.sensing
        slot["at_s"], slot["state"], slot["phase"] = now, STATE_NAMES.index(status.state), text(status.phase, WORD)
        slot["position_s"], slot["duration_s"] = status.position_s, status.duration_s
        slot["place"] = text(self._say_place(status.position_s), WORD)
        for name in ("cue", "next_cue", "waiting"):
            slot[name] = text(getattr(status, name), NAME)
        slot["next_cue_s"] = source.next_cue.at_s if source.next_cue is not None else np.nan
        slot["moving"], slot["let_down"] = status.moving, status.let_down
        slot["ticks"], slot["late_ticks"], slot["past_due"] = status.ticks, status.late_ticks, status.past_due
        slot["late_s"], slot["worst_late_s"] = status.late_s, self._engine.lateness.worst_s
        slot["commanded"], slot["watching"] = commanded, attached
        slot["sent"], slot["sensed"], slot["duty"] = source.command, sensing.sensed, self._duties.shares
        if view is None:
            slot["wanted"] = slot["allowed"] = np.nan if source.strain is None else source.strain
        else:
            slot["wanted"], slot["allowed"], slot["cut"], slot["by"] = view.wanted, view.allowed, view.cut, view.by
            slot["touched"], slot["held"], slot["counts_a_minute"] = view.touched, view.held, view.counts_a_minute
            slot["air_left"], slot["air_share"] = view.air_left, view.air_share
        self._boards(slot["link"], slot["supply_kPa"], sensing.supply_kPa)
        slot["lines_told"] = self._told
        slot["lines"] = [b""] * (LINES - len(self._lines)) + [text(line, LINE) for line in self._lines]

    def _boards(self, link: np.ndarray, supply: np.ndarray, kPa: dict[str, float]) -> None:
        states = {driver: state for drivers, state in self._engine.boards.links for driver in drivers.split("+")}
        for number, driver in enumerate(self._drivers):
            link[number] = text(states.get(driver, "closed"), WORD)
            supply[number] = kPa.get(driver, np.nan)


def boards_of(rig: Rig) -> Sequence[str]:
    """The boards of a rig's runs, in the layout's order: the names of its drivers."""
    return [driver.name for driver in rig.drivers]
