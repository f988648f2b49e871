"""What the window knows of the text: the last good picture and what goes with it, as the workers have told."""

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from composer.editor.messages import Checked, Lanes, Picture, Retimed, RigRead, Simulated
from composer.editor.motions import same_motion
from composer.limits.abilities import Abilities
from composer.picture.bands import Band, bands_of
from composer.picture.bars import Bars, RetimedBars
from composer.picture.cloth.weave import Weave, stretches
from composer.picture.scene import CueMark
from composer.rig.model import Rig
from composer.tracks import Tracks
from composer.warp import UNWARPED, Warp

Array = NDArray[np.float64]


class Run:
    """A simulated run as far as it has come: strain at even steps of time."""

    def __init__(self, fibers: int, first: Simulated):
        self.retimed, self.step_s = first.retimed, first.step_s
        self._strain = np.empty((fibers, 1024), dtype=np.float32)
        self._time = np.empty(1024)
        self.count = 0
        self.share = 0.0
        self.add(first)

    def add(self, more: Simulated) -> None:
        """The next stretch."""
        n = more.strain.shape[1]
        if self.count + n > self._strain.shape[1]:
            room = max(2 * self._strain.shape[1], self.count + n)
            strain, time = np.empty((self._strain.shape[0], room), dtype=np.float32), np.empty(room)
            strain[:, : self.count], time[: self.count] = self._strain[:, : self.count], self._time[: self.count]
            self._strain, self._time = strain, time
        self._strain[:, self.count : self.count + n], self._time[self.count : self.count + n] = more.strain, more.time_s
        self.count += n
        self.share = more.share

    def of(self, fiber: int) -> tuple[Array, Array]:
        """Instants in s and strains of one fiber, (N,) each."""
        return self._time[: self.count], self._strain[fiber, : self.count].astype(float)

    def at(self, at_s: float) -> Array | None:
        """Strain of every fiber at an instant, (F,); None where the run has not come so far."""
        if not self.count or at_s > self._time[self.count - 1]:
            return None
        place = int(np.searchsorted(self._time[: self.count], at_s))
        return self._strain[:, min(place, self.count - 1)].astype(float)


class Known:
    """The newest of everything. A picture stays until a later text can be read; what belongs to an older one goes with it."""

    def __init__(self) -> None:
        self.rig: Rig | None = None
        self.rig_number = 0
        self.abilities: Abilities | None = None
        self.bands: tuple[Band, ...] = ()
        self.names: tuple[str, ...] = ()
        self.picture: Picture | None = None
        self.weave: Weave | None = None
        self.checked: Checked | None = None
        self.retimed: Retimed | None = None
        self.run: Run | None = None

    def forget(self) -> None:
        """Another score: nothing is known of it yet, but the rig stays until another is told."""
        self.picture = self.weave = self.checked = self.retimed = self.run = None

    def take_rig(self, told: RigRead) -> None:
        """A rig."""
        self.rig, self.abilities, self.rig_number = told.rig, told.abilities, told.number
        self.bands, self.names = bands_of(told.rig), tuple(fiber.name for fiber in told.rig.fibers)

    def take_picture(self, told: Picture) -> Weave | None:
        """A picture. Snags of before stay until the new check has come, a retiming and a run of the same motion too."""
        if told.rig != self.rig_number or self.abilities is None:
            return None
        before = self.weave
        lanes = before.lanes if before is not None else ()
        snags = before.snags if before is not None and before.names == self.names else ()
        as_before = before is not None and before.abilities is self.abilities and same_motion(before.tracks, told.tracks)
        self.picture = told
        cues = tuple(CueMark(cue.name, cue.seconds, cue.wait) for cue in told.cues)
        self.weave = Weave(
            told.tracks, self.abilities, self.bands, self.names, told.tempo, snags, tuple(told.pins_s.tolist()), cues, lanes
        )
        self.checked = None
        if not as_before:
            self.retimed = self.run = None
        return self.weave

    def take_check(self, told: Checked) -> Weave | None:
        """A check of the picture shown."""
        if self.picture is None or told.version != self.picture.version or self.weave is None:
            return None
        self.checked = told
        self.weave = replace(self.weave, snags=stretches(told.check.snags))
        return self.weave

    def take_lanes(self, told: Lanes) -> Weave | None:
        """The lanes of the picture shown."""
        if self.picture is None or told.version != self.picture.version or self.weave is None:
            return None
        self.weave = replace(self.weave, lanes=told.lanes)
        return self.weave

    def take_retimed(self, told: Retimed) -> bool:
        """A retiming of the picture shown."""
        if self.picture is None or told.version != self.picture.version:
            return False
        self.retimed = told
        return True

    def take_run(self, told: Simulated) -> bool:
        """A stretch of a run of the picture shown."""
        if self.picture is None or told.version != self.picture.version:
            return False
        begins = not len(told.time_s) or told.time_s[0] < 1e-9
        if self.run is None or self.run.retimed != told.retimed or begins:
            self.run = Run(self.picture.tracks.fibers, told)
        else:
            self.run.add(told)
        return True

    def warp(self, as_retimed: bool) -> Warp:
        """From written instants to those that are played."""
        if as_retimed and self.retimed is not None and self.retimed.known and len(self.retimed.was_s):
            return Warp(self.retimed.was_s, self.retimed.now_s)
        return UNWARPED

    def played(self, as_retimed: bool) -> tuple[Tracks, Bars] | None:
        """The tracks that are played, and their bars."""
        if self.picture is None:
            return None
        warp = self.warp(as_retimed)
        if warp is UNWARPED or self.retimed is None:
            return self.picture.tracks, self.picture.tempo
        return self.retimed.tracks, RetimedBars(self.picture.tempo, warp.was_s, warp.now_s)
