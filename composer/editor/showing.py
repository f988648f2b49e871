"""From what the workers tell to what is seen: one place that keeps cloth, strand, hanging fibers, transport and lists alike."""

from collections.abc import Sequence
from dataclasses import replace
from typing import Any

import numpy as np
from PySide6.QtCore import QObject, QTimer, Signal

from composer.editor.known import Known
from composer.editor.messages import Checked, Choice, Lanes, Picture, Retimed, RigRead, Simulated, Told
from composer.editor.retimed_panel import RetimedPanel
from composer.editor.snags_panel import SnagsPanel
from composer.editor.stage import HANG, RIG, Stage
from composer.faults import Fault
from composer.picture.cloth.sampling import Sampler
from composer.picture.palette import DARK, Theme
from composer.picture.scene import Stretch
from composer.picture.strand.curve import worded
from composer.picture.strand.strand_view import StrandView
from composer.rig.model import Rig
from composer.tracks import Tracks

MOST_LIT = 4000
"""Stretches that are lit at once."""

MOST_EARLY = 400
"""Messages that are kept for a picture that has not come yet."""

MOST_OUTLINED = 12
"""Hanging fibers that are outlined at once; more would hide what they do."""

RUN_MS = 600
"""How often a simulated run that grows is drawn anew."""


class Showing(QObject):
    """What is shown. faults: of the newest text; fiber_changed: another strand is shown; redrawn: a new picture is up."""

    faults = Signal(object)
    fiber_changed = Signal(int)
    redrawn = Signal()

    def __init__(
        self, stage: Stage, strand: StrandView, snags: SnagsPanel, retimed: RetimedPanel, parent: QObject | None = None
    ):
        super().__init__(parent)
        self.known = Known()
        self.stage, self.strand, self.snags, self.retimed_panel = stage, strand, snags, retimed
        self.beside = True
        self.as_retimed = False
        self.hang: Any = None
        self.rig_page: Any = None
        self._theme = DARK
        self._fiber: int | None = None
        self._sampler: Sampler | None = None
        self._played: Tracks | None = None
        self._ghost_said: Tracks | None = None
        self._reached_for: Retimed | None = None
        self._reached_s = 0.0
        self._early: list[Any] = []
        self._hung: Rig | None = None
        self._paged: Rig | None = None
        self._rig_faults: tuple[Fault, ...] = ()
        self._carried: Tracks | None = None
        self._grow = QTimer(self)
        self._grow.setSingleShot(True)
        self._grow.setInterval(RUN_MS)
        self._grow.timeout.connect(self._run_grown)
        stage.transport.moved.connect(self._head_moved)
        stage.cloth.head_moved.connect(self._head_put)
        strand.head_moved.connect(self._head_put)
        stage.cloth.stretch_changed.connect(strand.show_stretch)
        strand.stretch_changed.connect(stage.cloth.show_stretch)
        stage.leaves.currentChanged.connect(lambda _: self._leaf_opened())

    # ---- what the workers tell ------------------------------------------------------------------------------------------

    def hear(self, message: Any) -> None:
        """Take in what a worker says, and show it."""
        known = self.known
        if isinstance(message, (Retimed, Simulated)) and self._is_early(message):
            return
        match message:
            case Told():
                self.faults.emit(message)
            case RigRead():
                known.take_rig(message)
                self._show_rig()
            case Picture():
                if known.take_picture(message) is not None:
                    self._show_picture()
                    early, self._early = self._early, []
                    for told in early:
                        self.hear(told)
            case Checked():
                weave = known.take_check(message)
                if weave is not None:
                    self._set_weave(weave)
                    self.snags.show_rows(message.rows, message.notes, message.more)
                    self._show_strand()
            case Lanes():
                weave = known.take_lanes(message)
                if weave is not None:
                    self._set_weave(weave)
            case Retimed():
                if known.take_retimed(message) and known.picture is not None:
                    places = [known.picture.tempo.say_place(hit.was_s) for hit in message.hits]
                    self.retimed_panel.show_retimed(message, places)
                    self._show_ghost()
                    self._show_strand()
                    if self.as_retimed:
                        self._set_piece()
            case Simulated():
                if known.take_run(message) and not self._grow.isActive():
                    self._grow.start()

    def _is_early(self, message: Retimed | Simulated) -> bool:
        """Whether it is of a text whose picture has not come yet; it is kept until then."""
        picture = self.known.picture
        if picture is not None and message.version <= picture.version:
            return False
        self._early = [one for one in self._early if one.version == message.version]
        if len(self._early) < MOST_EARLY:
            self._early.append(message)
        return True

    def forget(self) -> None:
        """Another score: nothing of the one before is shown any more."""
        self.known.forget()
        self._fiber = self._sampler = self._played = self._ghost_said = self._carried = None
        self._early = []
        self._reached_for, self._reached_s = None, 0.0
        self.stage.transport.pause()
        self.stage.transport.clear_loop()
        self.stage.transport.to_start()
        self.stage.cloth.set_weave(None)
        self.strand.set_strand(None, None)
        self.snags.clear()
        self.retimed_panel.clear()

    def _show_picture(self) -> None:
        known = self.known
        assert known.weave is not None and known.picture is not None
        self._carried = None
        self._set_weave(known.weave)
        if self._fiber is not None and self._fiber >= len(known.names):
            self._fiber = None
        self._show_strand()
        self._set_piece()
        if known.picture.tracks.fibers and self._fiber is None:
            self.show_fiber(0)
        self.redrawn.emit()

    def _set_weave(self, weave: Any) -> None:
        # What is carried is shown until it is let go; the picture of the text comes then.
        if self._carried is None:
            chosen = self.snags.current
            self.stage.cloth.set_weave(weave)
            self._show_ghost()
            if chosen is not None and self.known.checked is not None:
                self.stage.cloth.choose_snag(None)

    def _set_piece(self) -> None:
        played = self.known.played(self.as_retimed)
        if played is not None and self.known.abilities is not None:
            tracks, bars = played
            self._played, self._sampler = tracks, None
            self.stage.transport.set_piece(bars, tracks.duration_s)

    # ---- strand ---------------------------------------------------------------------------------------------------------

    @property
    def fiber(self) -> int | None:
        """The fiber whose strand is shown."""
        return self._fiber

    def show_fiber(self, fiber: int | None) -> None:
        """Show the strand of a fiber."""
        if fiber != self._fiber:
            self._fiber = fiber
            self._show_strand()
            self.stage.cloth.choose_fiber(fiber)
            if self.hang is not None:
                self.hang.light(() if fiber is None else (fiber,))
            self.fiber_changed.emit(-1 if fiber is None else fiber)

    def _show_strand(self) -> None:
        known, fiber = self.known, self._fiber
        if known.weave is None or fiber is None or known.abilities is None:
            self.strand.set_strand(known.weave, None)
            return
        retimed = known.retimed.tracks if known.retimed is not None and known.retimed.hits else None
        snags = worded(known.checked.check.snags, known.abilities, fiber) if known.checked is not None else ()
        run = known.run.of(fiber) if known.run is not None and known.run.count else None
        self.strand.set_strand(known.weave, fiber, retimed, run, snags)
        self.strand.show_stretch(*self.stage.cloth.shown)

    # ---- what would be --------------------------------------------------------------------------------------------------

    def show_beside(self, beside: bool) -> None:
        """Show the retiming beside what is written, or not."""
        self.beside = beside
        self._show_ghost()

    def show_choice(self, choice: Choice | None) -> None:
        """Show what would come of a choice, None for none."""
        if choice is None and self._ghost_said is None:
            return
        self._ghost_said = None if choice is None else choice.after.tracks
        self._show_ghost(choice.say if choice is not None else "")

    def _show_ghost(self, words: str = "") -> None:
        known, cloth = self.known, self.stage.cloth
        if self._carried is not None or cloth.weave is None:
            return
        words_of = ("as written", "retimed")
        if self._ghost_said is not None:
            ghost, words_of = self._ghost_said, ("as written", words or "mended")
        elif self.beside and known.retimed is not None and known.retimed.hits:
            ghost = known.retimed.tracks
        else:
            ghost = None
        self._reach(0.0 if ghost is None else ghost.duration_s)
        cloth.set_ghost(ghost, words_of)

    def _reach(self, end_s: float) -> None:
        """Let cloth and strand reach so far; back only with another retiming, so that what is in view stays there till then."""
        retimed = self.known.retimed
        if retimed is None or retimed is self._reached_for:
            end_s = max(end_s, self._reached_s)
        else:
            self._reached_for = retimed
        self._reached_s = end_s
        # They follow one another, so both have to know of a later end before either shows it.
        self.strand.reach(end_s)
        self.stage.cloth.reach(end_s)

    def carry(self, tracks: Tracks | None) -> None:
        """Show tracks that would come of a drag under way; None: it is over."""
        self._carried = tracks
        if self.known.weave is None:
            return
        if tracks is None:
            self._set_weave(self.known.weave)
            self._show_strand()
            return
        weave = replace(self.known.weave, tracks=tracks)
        self.stage.cloth.set_weave(weave)
        if self._fiber is not None:
            self.strand.set_strand(weave, self._fiber)

    def light(self, stretches: Any) -> None:
        """Light what a line of the text moves."""
        if stretches is None:
            self.stage.cloth.select(())
            return
        fibers, begins, ends = (getattr(stretches, name).tolist()[:MOST_LIT] for name in ("fiber", "from_s", "to_s"))
        self.stage.cloth.select([Stretch(f, a, b) for f, a, b in zip(fibers, begins, ends, strict=True)])
        few = set(fibers)
        if self.hang is not None and len(few) <= MOST_OUTLINED:
            self.hang.light(few)

    # ---- rig ------------------------------------------------------------------------------------------------------------

    def set_theme(self, theme: Theme) -> None:
        """Everything in these colours."""
        self._theme = theme
        for view in (self.stage.cloth, self.strand, self.hang, self.rig_page):
            if view is not None:
                view.set_theme(theme)

    def _show_rig(self) -> None:
        """Put the rig on the leaf that is open; a leaf that is not is made when it is opened."""
        known = self.known
        if known.rig is None or known.abilities is None:
            return
        if self.stage.shown == HANG and self._hung is not known.rig:
            self._hung = known.rig
            if self.hang is None:
                from composer.picture.hang.hang_view import HangView

                self.hang = HangView(known.rig, known.abilities, view="three-quarter")
                self.hang.fiber_clicked.connect(self.show_fiber)
                self.hang.set_theme(self._theme)
                self.stage.put(HANG, self.hang)
            else:
                self.hang.set_rig(known.rig, known.abilities)
            self.hang.light(() if self._fiber is None else (self._fiber,))
        elif self.stage.shown == RIG and self._paged is not known.rig:
            self._paged = known.rig
            if self.rig_page is None:
                from composer.editor.rig_page import RigPage

                self.rig_page = RigPage()
                self.rig_page.fiber_chosen.connect(self.show_fiber)
                self.rig_page.set_theme(self._theme)
                self.stage.put(RIG, self.rig_page)
            self.rig_page.show_rig(known.rig, known.abilities)
            self.rig_page.show_faults(self._rig_faults)
            if self._fiber is not None:
                self.rig_page.choose(self._fiber)

    def show_rig_faults(self, faults: Sequence[Fault]) -> None:
        """What is wrong with the rig's file, on its leaf."""
        self._rig_faults = tuple(faults)
        if self.rig_page is not None:
            self.rig_page.show_faults(faults)

    def _leaf_opened(self) -> None:
        self._show_rig()
        self._show_hang()

    # ---- play head ------------------------------------------------------------------------------------------------------

    def play_as_retimed(self, as_retimed: bool) -> None:
        """Play what is retimed, or what is written; the head stays at its place in the score."""
        was = self.known.warp(self.as_retimed).was(self.stage.transport.head_s)
        self.as_retimed = as_retimed
        self.known.run = None
        self._set_piece()
        self.stage.transport.move_to(self.known.warp(as_retimed).now(was))
        self._show_strand()

    def _head_moved(self, at_s: float) -> None:
        written = self.known.warp(self.as_retimed).was(at_s)
        self.stage.cloth.set_head(written, follow=self.stage.transport.playing)
        self.strand.set_head(written)
        self._show_hang()

    def _head_put(self, written_s: float) -> None:
        self.stage.transport.move_to(self.known.warp(self.as_retimed).now(written_s))

    def _show_hang(self) -> None:
        """Move the hanging fibers: as wanted, and as simulated where the run has come so far."""
        if self.hang is None or self.stage.shown != HANG or self._played is None or self.known.abilities is None:
            return
        if self._hung is not self.known.rig or self._played.fibers != len(self.known.names):
            return
        if self._sampler is None:
            self._sampler = Sampler(self._played, self.known.abilities)
        at = self.stage.transport.head_s
        stroke = self.known.abilities.stroke
        wanted = self._sampler.shares(np.arange(len(stroke)), np.array([at]))[:, 0] * stroke
        self.hang.show_strain(wanted, self.known.run.at(at) if self.known.run is not None else None)

    def _run_grown(self) -> None:
        self._show_strand()
        if not self.stage.transport.playing:
            self._show_hang()
