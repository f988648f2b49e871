"""The slow half of the work on a text: retiming, what would mend a snag, taking the retiming in, the simulated run."""

from collections.abc import Generator
from typing import TYPE_CHECKING

import numpy as np

from composer.editor.messages import Choice, Doing, Ghost, Hit, Mended, Retimed, Simulated, Superseded, Taking
from composer.editor.motions import same_motion
from composer.editor.rechecking import Known, recheck
from composer.edits import mending, taking
from composer.edits.edit import Refusal
from composer.limits.check import Check, check
from composer.limits.snag import Snag
from composer.load import Loaded
from composer.report.causes import cause_in_words
from composer.report.retime import is_good, sentences
from composer.retime.programme import Unsolved
from composer.retime.proof import causes
from composer.retime.retiming import Retiming
from composer.retime.whole_score import retime_score
from composer.simulate.run import blocks, tail_s
from composer.tracks import Tracks

if TYPE_CHECKING:
    from composer.editor.desk import Desk

LIMIT_S = 20.0
"""How long a retiming may look for the least before the best that is known is shown."""

MOST_MOVES = 60_000
"""Moves of a score up to which a run is simulated without being asked for."""

RUN_HZ = 100.0
KEEP_HZ = 50.0
BLOCK_VALUES = 1 << 13
MOST_KEPT = 1 << 25
"""Values of strain that a run sends at most, 4 bytes each."""


class Solver:
    """What the solver keeps from one text to the next."""

    def __init__(self, desk: "Desk"):
        self.desk = desk
        self.retiming: Retiming | None = None
        self._of: Loaded | None = None
        self._rig = 0
        self.simulating = False
        self._ran: tuple[bool, Tracks] | None = None
        self._known: Known | None = None

    def idle_or_simulating(self, idle: bool) -> bool:
        """Whether a run of what is shown may begin: there is a text that can be read, and nothing else is in hand."""
        return self.desk.made_version == self.desk.version and (idle or self.simulating)

    def forget(self) -> None:
        """Another score."""
        self.retiming = self._of = self._known = self._ran = None

    def work(self) -> Generator[None, None, None]:
        """Retime the text at hand, tell of it, then simulate it."""
        desk, made = self.desk, self.desk.made
        assert made is not None
        self.simulating = False
        yield
        desk.say(Doing(desk.version, "retiming"))
        before, self._of = self.retiming, None
        try:
            retiming = self._retimed(made, before)
        except Unsolved as failed:
            nothing = np.zeros(0)
            says = (f"The solver gave up, and nothing is retimed: {failed}.",)
            desk.say(Retimed(desk.version, made.tracks, nothing, nothing, (), says, False, 0.0, False))
            return
        self.retiming, self._of, self._rig = retiming, made, desk.leaning.number
        yield
        checked, self._known = yield from recheck(retiming.tracks, made.rig, made.abilities, self._known)
        desk.say(self._told(made, retiming, checked))
        yield
        yield from self.simulate()

    def simulate(self) -> Generator[None, None, None]:
        """The run on the simulated rig, of what is shown, sent as far as it is known."""
        desk, made = self.desk, self.desk.made
        assert made is not None
        retimed = desk.retimed_mode and self.retiming is not None and self._of is made
        tracks = self.retiming.tracks if retimed and self.retiming is not None else made.tracks
        if tracks.moves > MOST_MOVES or (
            self._ran is not None and self._ran[0] == retimed and same_motion(self._ran[1], tracks)
        ):
            return
        self._ran = None
        self.simulating = True
        desk.say(Doing(desk.version, "simulating"))
        whole = max(tracks.duration_s, 1e-3) + tail_s(made.abilities)
        keep_Hz = min(KEEP_HZ, MOST_KEPT / max(1.0, tracks.fibers * whole))
        every = max(1, round(RUN_HZ / keep_Hz))
        number = 0
        for block in blocks(tracks, made.rig, made.abilities, RUN_HZ, values=BLOCK_VALUES):
            pick = np.flatnonzero((np.arange(len(block.time_s)) + number) % every == 0)
            number += len(block.time_s)
            desk.say(
                Simulated(
                    desk.version,
                    block.time_s[pick],
                    block.strain[:, pick].astype(np.float32),
                    block.supply_kPa[pick],
                    block.duty[pick],
                    min(1.0, float(block.time_s[-1]) / whole),
                    every / RUN_HZ,
                    retimed,
                )
            )
            yield
        self.simulating, self._ran = False, (retimed, tracks)

    def mended(self, snag: Snag) -> Mended | Refusal:
        """What would mend a snag, each choice with its edit and what comes of it."""
        desk, made = self.desk, self.desk.made
        assert made is not None
        desk.say(Doing(desk.version, "looking for what would mend it"))
        if desk.check is None:
            desk.check = check(made.tracks, made.rig, made.abilities)
        same = [one for one in desk.check.snags if _alike(one, snag)]
        if not same:
            return Refusal("This snag is gone already.")
        found = mending.mends(
            desk.made_text, made, same[0], desk.check, self._remake, self.retiming if self._of is made else None
        )
        choices = tuple(Choice(each.way, each.say, each.edit, Ghost(each.ghost), each.snags_left) for each in found.choices)
        return Mended(choices, dict(found.not_these))

    def taken(self, from_s: float, to_s: float) -> Taking | Refusal:
        """The edit that takes the retiming into the text, for what lies between two written instants."""
        desk, made = self.desk, self.desk.made
        assert made is not None
        if self.retiming is None or self._of is not made:
            self.retiming, self._of = self._retimed(made, self.retiming), made
            self._rig = desk.leaning.number
        desk.say(Doing(desk.version, "taking the retiming in"))
        found = taking.take(desk.made_text, made, self.retiming, self._remake, from_s, to_s)
        if isinstance(found, Refusal):
            return found
        return Taking(found.edit, Ghost(found.after.tracks), found.off_s, found.notes)

    def printed(self, lines: tuple[tuple[str, str, str], ...], paper: str) -> bytes | None:
        """Cloth and snags of the text at hand as the pages of a PDF file; the list as the window has it."""
        from composer.picture.bands import bands_of
        from composer.picture.cloth.pages import Line, print_pages
        from composer.picture.cloth.print_plan import sections_of
        from composer.picture.cloth.weave import Weave, lanes_of, stretches
        from composer.picture.scene import CueMark

        desk, made = self.desk, self.desk.made
        assert made is not None
        snags = check(made.tracks, made.rig, made.abilities).snags
        weave = Weave(
            made.tracks,
            made.abilities,
            bands_of(made.rig),
            tuple(fiber.name for fiber in made.rig.fibers),
            made.tempo,
            stretches(snags),
            tuple(made.pins_s.tolist()),
            tuple(CueMark(cue.name, cue.seconds, cue.wait) for cue in made.cues),
            lanes_of(made.rig, made.abilities, made.tracks),
        )
        title = made.score.title or made.score.file.rpartition("/")[2]
        return print_pages(
            weave,
            title,
            [Line(*line) for line in lines],
            sections_of(made.score, made.tempo),
            paper,
            progress=lambda share: desk.say(Doing(desk.version, f"printing {100 * share:.0f} %")),
        )

    def _remake(self, text: str) -> Loaded:
        if self.desk.newer():
            raise Superseded
        return self.desk.remake(text)

    def _retimed(self, made: Loaded, before: Retiming | None) -> Retiming:
        desk = self.desk

        def look() -> None:
            if desk.newer():
                raise Superseded

        def clock() -> float:
            look()
            return desk.clock()

        before = before if self._rig == desk.leaning.number else None
        return retime_score(made, clock=clock, limit_s=LIMIT_S, tell=lambda _: look(), after=before)

    def _told(self, made: Loaded, retiming: Retiming, checked: Check) -> Retimed:
        names = [fiber.name for fiber in made.rig.fibers]
        held = causes(retiming.proof) if retiming.proof is not None else []
        hits = tuple(
            Hit(hit.was_s, hit.now_s, cause_in_words(cause, names, made.tempo), hit.line, hit.fibers)
            for hit, cause in zip(retiming.hits_moved, held, strict=False)
        )
        return Retimed(
            self.desk.version,
            retiming.tracks,
            retiming.warp_was_s,
            retiming.warp_now_s,
            hits,
            tuple(sentences(retiming, checked, made.rig, made.tempo)),
            is_good(retiming, checked),
            float(np.nan_to_num(retiming.cost)),
            True,
        )


def _alike(one: Snag, other: Snag) -> bool:
    return (one.kind, one.fiber, one.line) == (other.kind, other.fiber, other.line) and abs(one.from_s - other.from_s) < 1e-6
