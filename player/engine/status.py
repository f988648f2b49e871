"""What the engine tells of itself: a snapshot after each tick, the lateness of ticks, and how the run ended."""

import math
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from player.engine.source import Source


@dataclass(frozen=True, slots=True)
class Status:
    """The engine after a tick.

    state: as in player.engine.safety; phase: what the score is at; position_s, duration_s: of the score, in s
    cue, next_cue, waiting: names, "" for none; moving, let_down: numbers of fibers
    ticks, late_ticks, past_due: since the start; late_s: the last tick's; links: a word a board
    told: what is new to tell the operator since the last snapshot
    """

    state: str
    phase: str
    position_s: float
    duration_s: float
    cue: str
    next_cue: str
    waiting: str
    moving: int
    let_down: int
    ticks: int
    late_ticks: int
    past_due: int
    late_s: float
    links: tuple[tuple[str, str], ...]
    told: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class RunFault:
    """Something that went wrong in a run: where in the score, on whose board, in which words."""

    position_s: float
    driver: str
    say: str


@dataclass(slots=True)
class Lateness:
    """How late ticks came, in classes of an eighth of an octave from a microsecond on: bounded however long a run is."""

    ticks: int = 0
    late: int = 0
    past_due: int = 0
    slips: int = 0
    slipped_s: float = 0.0
    worst_s: float = 0.0
    classes: np.ndarray = field(default_factory=lambda: np.zeros(256, dtype=np.int64))

    def count(self, late_s: float, tick_s: float = math.inf, ahead_s: float = math.inf) -> None:
        """Count a tick that came `late_s` after its moment: late where by more than a tick, past due by more than `ahead_s`."""
        self.ticks += 1
        self.late += late_s > tick_s
        self.past_due += late_s > ahead_s
        self.worst_s = max(self.worst_s, late_s)
        self.classes[min(255, max(0, int(8.0 * np.log2(max(late_s, 1e-6) * 1e6))))] += 1

    def quantile_s(self, share: float) -> float:
        """Lateness that this share of the ticks did not exceed, to within a class (9 %)."""
        if self.ticks == 0:
            return 0.0
        which = int(np.searchsorted(np.cumsum(self.classes), share * self.ticks))
        return min(self.worst_s, 1e-6 * 2.0 ** ((which + 1) / 8.0)) if which else min(self.worst_s, 1e-6)


def status_of(
    state: str, source: "Source", links: tuple[tuple[str, str], ...], lateness: Lateness, moving: int, late_s: float,
    told: tuple[str, ...],
) -> Status:  # fmt: skip
    """The snapshot of an engine whose source plays."""
    return Status(
        state=state,
        phase=source.phase,
        position_s=source.position_s,
        duration_s=source.duration_s,
        cue=source.cue.name if source.cue else "",
        next_cue=source.next_cue.name if source.next_cue else "",
        waiting=source.waiting.name if source.waiting else "",
        moving=moving,
        let_down=source.let_down,
        ticks=lateness.ticks,
        late_ticks=lateness.late,
        past_due=lateness.past_due,
        late_s=late_s,
        links=links,
        told=told,
    )


@dataclass(frozen=True, slots=True)
class WorstError:
    """The largest distance between strain wanted and sensed: fiber index, when in the run, both strains."""

    error: float
    fiber: int
    position_s: float
    wanted: float
    sensed: float


@dataclass(frozen=True, slots=True)
class Ending:
    """How a run ended: "end" of the score, "stopped", "vented" by the operator, or "fault"; `why` says so in a sentence."""

    how: str
    why: str
    state: str
    position_s: float
    lasted_s: float
    faults: tuple[RunFault, ...]
    more_faults: int

    @property
    def exit_code(self) -> int:
        """0 where the run went as the operator wished, 1 where it was vented, or anything went wrong."""
        return 0 if self.how in ("end", "stopped") and not self.faults else 1
