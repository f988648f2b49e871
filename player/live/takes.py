"""Takes of a session: recorded while playing, each an unbroken stretch, and written as scores at the end."""

import os
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.faults import Faults, fault
from composer.files import check_writable, replacing
from composer.rig.model import Rig
from player.takes.cores import Cores
from player.takes.file import TakeFile
from player.takes.fitting import Each, one_by_one
from player.takes.making import Made, make_score

Array = NDArray[np.float64]

MOVED = 0.005
"""Share of stroke by which fibers may differ where recording goes on after a stand; more, and it is another take."""

LEAP_S = 0.1
"""A place that goes on further than this at once has been jumped to: another take."""

FEWEST = 10
"""Samples of a take that is worth a score."""

SUFFIX = ".take"


@dataclass(frozen=True, slots=True)
class Written:
    """A take and the score that was made of it; `why` where none was made; good: nothing went wrong, and it checks clean."""

    take: str
    score: str
    made: Made | None
    good: bool
    why: str = ""


class Takes:
    """Records a session; `recording` may be switched off and on, which begins another take."""

    def __init__(self, out: str, rig: Rig, stroke: Array, score: str, rate_Hz: float, date: str, tell: Callable[[str], None]):
        """out: the score of the first take; further ones have a number. Raises Faults where it cannot be written."""
        check_writable(out)
        self._stem, self._ending = os.path.splitext(out)
        if os.path.exists(self._stem + SUFFIX):
            found = "there is a take already, and a take is never written over another"
            raise fault(self._stem + SUFFIX, found, hint="name another score, or make one of that take with 'drawcord take'")
        self.recording = True
        self._rig, self._stroke, self._score, self._rate_Hz, self._date, self._tell = rig, stroke, score, rate_Hz, date, tell
        self._file: TakeFile | None = None
        self._last_s, self._last = -1.0, np.zeros(len(stroke))
        self._stood = False
        self._samples = 0
        self._number = 0
        self._each: Each = one_by_one
        self._takes: list[tuple[str, str, int]] = []

    @property
    def says(self) -> str:
        """What a screen shows of it: the score that is being played, and for how long."""
        if not self.recording:
            return "not recording"
        if self._file is None:
            return "recording begins as it plays"
        return f"recording {os.path.basename(self._file.path)}"

    def turn(self) -> None:
        """Recording off or on."""
        self.recording = not self.recording
        if not self.recording:
            self._close()
        self._tell(self.says)

    def tick(self, position_s: float, plays: bool, wanted: Array, allowed: Array) -> None:
        """A tick: strains (F,) as asked for and as let through; `plays`: whether it belongs into a take."""
        if not self.recording:
            return
        if not plays or position_s == self._last_s:
            self._stood = True
            return
        if self._file is not None and self._breaks(position_s, allowed):
            self._close()
        if self._file is None:
            self._begin()
        if self._file is not None:
            self._samples += self._file.sample(position_s, wanted, allowed)
            if self._file.broken:
                self._tell(f"the take could not be written any further: {self._file.broken}")
                self._close()
                self.recording = False
        self._stood, self._last_s, self._last = False, position_s, allowed

    def input(self, position_s: float, source: str, control: str, value: float) -> None:
        """Something that came in."""
        if self._file is not None:
            self._file.input(position_s, source, control, value)

    def close(self) -> None:
        """The session is over: what was recorded is on the disk."""
        self._close()

    def written(self) -> list[Written]:
        """The scores of all takes, written now."""
        with Cores() as self._each:
            return [self._write(take, score, samples) for take, score, samples in self._takes]

    def _breaks(self, position_s: float, allowed: Array) -> bool:
        if position_s < self._last_s or position_s > self._last_s + LEAP_S:
            return True
        return self._stood and bool(np.max(np.abs(allowed - self._last) / self._stroke, initial=0.0) > MOVED)

    def _begin(self) -> None:
        take, score = self._free()
        try:
            self._file = TakeFile(take, self._rig, self._score, self._rate_Hz, self._date)
        except Faults as wrong:
            self._tell(f"no further take: {wrong}")
            self.recording = False
            return
        self._takes.append((take, score, 0))
        self._samples = 0

    def _free(self) -> tuple[str, str]:
        """The next take's names: numbers of files that are there are left out, but the first score is the one asked for."""
        while True:
            self._number += 1
            stem = self._stem if self._number == 1 else f"{self._stem}-{self._number}"
            if self._number == 1 or not (os.path.exists(stem + SUFFIX) or os.path.exists(stem + self._ending)):
                return stem + SUFFIX, stem + self._ending

    def _close(self) -> None:
        if self._file is None:
            return
        self._file.close()
        take, score, _ = self._takes[-1]
        self._takes[-1] = (take, score, self._samples)
        self._file = None

    def _write(self, take: str, score: str, samples: int) -> Written:
        if samples < FEWEST:
            return Written(take, score, None, True, f"only {samples} ticks were recorded, too few for a score")
        try:
            made = make_score(take, score, each=self._each)
            if not made.fibers:
                return Written(take, score, None, True, "nothing moved in it")
            with replacing(score) as file:
                file.write(made.text)
        except Faults as wrong:
            return Written(take, score, None, False, str(wrong))
        return Written(take, score, made, made.checked.ok)
