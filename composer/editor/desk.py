"""What a worker does with a text, step by step: read it, expand it, check it, retime it, simulate it, answer questions.

Between steps it looks for what the window has said since, and lets go of whatever is of an older text. Two roles share the
work, so that a long retiming never keeps the cloth waiting: the reader (picture, check, questions about the text as it is)
and the solver (retiming, simulation, what would mend a snag).
"""

import os
from collections import deque
from collections.abc import Callable, Generator, Iterator
from dataclasses import replace
from typing import Any

from composer.editor import questions
from composer.editor.deltas import Units
from composer.editor.leaning import Leaning
from composer.editor.messages import (
    Again,
    Answer,
    Ask,
    Changed,
    Checked,
    Doing,
    Failed,
    Lanes,
    Mode,
    Picture,
    RigRead,
    Superseded,
    Told,
    Whole,
)
from composer.editor.rechecking import Known, recheck
from composer.editor.rows import rows_of
from composer.edits.edit import Refusal
from composer.edits.threads import Threads, threads_of
from composer.faults import Fault, Faults, Where
from composer.limits.check import Check
from composer.load import Loaded, made_from
from composer.picture.cloth.weave import lanes_of
from composer.report.check import waiting_notes
from composer.report.sentences import Teller
from composer.rig.select import Selector
from composer.score.model import Score
from composer.score.names import check_names, groups_of
from composer.score.reading import parse_score
from composer.score.tempo import fault_at, with_text

READER, SOLVER = "reader", "solver"

MOST_SNAGS = 20_000
"""Snags that are sent to the window; all of them are counted."""


class Desk:
    """One worker's state. `say` sends a message, `newer` tells whether another has come, `clock` the time in seconds."""

    def __init__(self, role: str, say: Callable[[Any], None], newer: Callable[[], bool], clock: Callable[[], float]):
        self.role = role
        self.say, self.newer, self.clock = say, newer, clock
        self.version = -1
        self.file = ""
        self.units = Units()
        self.leaning = Leaning()
        self.text = ""
        self.made: Loaded | None = None
        """What followed from the last text that could be read, of version `made_version` and text `made_text`."""
        self.made_version = -1
        self.made_text = ""
        self.settled = -1
        """The version of which it is known whether it can be read."""
        self.check: Check | None = None
        self.retimed_mode = False
        self.known: Known | None = None
        self.solver = _solver(self) if role == SOLVER else None
        self._job: Iterator[None] | None = None
        self._asked: deque[Ask] = deque()
        self._rig_told = 0
        self._threads: Threads | None = None

    def hear(self, message: Any) -> None:
        """Take a message in; work for the text before is dropped."""
        match message:
            case Whole():
                if message.file != self.file:
                    self._forget()
                self.file, self.units = message.file, Units(message.text)
                self._begin(message.version)
            case Changed():
                self.units.change(message.delta)
                self._begin(message.version)
            case Again():
                self._begin(self.version)
            case Mode():
                self.retimed_mode = message.retimed
                if self.solver is not None and self.solver.idle_or_simulating(self._job is None):
                    self._job = self.solver.simulate()
            case Ask():
                self._asked.append(message)

    def work(self) -> bool:
        """One step; False where nothing is left to do."""
        if self._asked and self._answer():
            return True
        if self._job is None:
            return bool(self._asked) and self._answer(hopeless=True)
        try:
            next(self._job)
        except StopIteration:
            self._job = None
            self.say(Doing(self.version, ""))
        except Superseded:
            self._job = None
        return True

    def drop(self) -> None:
        """Let go of whatever is in hand, after a fault of the program's own."""
        self._job = None
        self._asked.clear()

    def threads(self) -> Threads:
        """The tracks at hand made ready for asking; once a text."""
        assert self.made is not None
        if self._threads is None or self._threads.tracks is not self.made.tracks:
            self._threads = threads_of(self.made)
        return self._threads

    def remake(self, text: str) -> Loaded:
        """What follows from another text by the rig at hand. Raises Faults."""
        score, faults = self._parsed(text)
        if faults or self.leaning.rig is None:
            raise Faults(faults)
        return made_from(score, self.leaning.rig, self.leaning.abilities)

    def picture_of(self, made: Loaded, version: int) -> Picture:
        """A picture to be sent; the rig goes ahead of it where the window has not got it."""
        if self._rig_told != self.leaning.number:
            self._rig_told = self.leaning.number
            self.say(RigRead(self._rig_told, made.rig, made.abilities))
        title = made.score.title or os.path.basename(self.file)
        return Picture(version, self._rig_told, title, made.tracks, made.tempo, made.pins_s, made.cues)

    # ---- the way of a text ----------------------------------------------------------------------------------------------

    def _forget(self) -> None:
        """Nothing is known of another score: not what was read of the one before, nor its rig."""
        self.leaning.forget()
        self.made, self.made_version, self.made_text, self.settled = None, -1, "", -1
        self.check = self.known = self._threads = None
        self._rig_told = 0
        if self.solver is not None:
            self.solver.forget()

    def _begin(self, version: int) -> None:
        self.version = version
        self._job = self._way()

    def _way(self) -> Generator[None, None, None]:
        version = self.version
        self.say(Doing(version, "reading"))
        self.text = self.units.text
        self.leaning.begin()
        score, faults = self._parsed(self.text)
        yield
        faults += self._take_rig(score, bool(faults))
        yield from self._made(version, score, faults)
        if self.made_version != version or self.made is None:
            return
        if self.solver is None:
            yield from self._checked(version, self.made)
        else:
            yield from self.solver.work()

    def _parsed(self, text: str) -> tuple[Score, list[Fault]]:
        folder = os.path.dirname(self.file)
        return parse_score(text, self.file, lambda used: self.leaning.text(os.path.join(folder, used)))

    def _take_rig(self, score: Score, torn: bool) -> list[Fault]:
        """Faults of the rig's file, or of the lack of one; the desk keeps the last rig of that file that could be read."""
        if score.rig is None:
            if torn:
                return []
            self.leaning.rig = None
            return [Fault(Where(self.file), "the score names no rig", "a statement such as 'rig estuary.rig.toml'")]
        wrong = self.leaning.take_rig(os.path.join(os.path.dirname(self.file), score.rig.text))
        told: list[Fault] = []
        for one in wrong.faults if wrong is not None else ():
            if one.where.line:
                told.append(one)
            else:
                found = f"{one.where.file}: {one.found}"
                told += with_text([fault_at(score.rig.span, found, one.expected, one.hint)], score)
        return told

    def _made(self, version: int, score: Score, faults: list[Fault]) -> Generator[None, None, None]:
        """Expand the score where it can be; say what is wrong, and show it."""
        rig = self.leaning.rig
        own = [fault for fault in faults if fault.where.file in score.lines or not fault.where.line]
        made = None
        if rig is not None and not [one for one in own if not self._of_the_rig(one, score)]:
            try:
                made = made_from(score, rig, self.leaning.abilities)
            except Faults as wrong:
                faults = [*faults, *wrong.faults]
        elif rig is not None and own:
            known = {(one.where.file, one.where.line) for one in own}
            names = check_names(score, rig, Selector(rig, groups_of(score)))
            faults = [*faults, *(one for one in names if (one.where.file, one.where.line) not in known)]
        if self.role == READER:
            self.say(Told(version, tuple(faults), self.leaning.leans_on))
        self.settled = version
        if made is not None:
            self.made, self.made_version, self.made_text = made, version, self.text
            self.check = None
            if self.role == READER:
                self.say(self.picture_of(made, version))
        yield

    def _of_the_rig(self, fault: Fault, score: Score) -> bool:
        """Whether a fault is of the rig's file, of which an older state can still be shown."""
        return fault.where.file not in score.lines or (
            score.rig is not None and fault.where.line == score.rig.span.line and self.leaning.rig is not None
        )

    def _checked(self, version: int, made: Loaded) -> Generator[None, None, None]:
        self.say(Doing(version, "checking"))
        self.check, self.known = yield from recheck(made.tracks, made.rig, made.abilities, self.known)
        teller = Teller(made.tracks, made.rig, made.tempo.say_place)
        rows, more = rows_of(self.check, teller)
        count = len(self.check.snags)
        shown = replace(self.check, snags=self.check.snags[:MOST_SNAGS]) if count > MOST_SNAGS else self.check
        self.say(Checked(version, shown, rows, tuple(waiting_notes(made.cues, teller)), more, count))
        yield
        self.say(Lanes(version, lanes_of(made.rig, made.abilities, made.tracks, asked=self.known.asked)))

    # ---- questions ------------------------------------------------------------------------------------------------------

    def _answer(self, hopeless: bool = False) -> bool:
        """Answer the first question that can be answered now; one of an older text is let go, with no answer.

        hopeless: nothing more will be known of this text, so one that waits for it is refused.
        """
        for place, ask in enumerate(self._asked):
            question = questions.QUESTIONS.get(ask.what)
            lasting = question is not None and question.lasting and self.made is not None
            if question is None or (ask.version < self.version and not lasting):
                del self._asked[place]
                return True
            if ask.version > self.version:
                continue
            if lasting and self.settled != self.version and not hopeless:
                # What has been written since may be read in a moment; only where it cannot is the text before it meant.
                continue
            value: Any = None
            if question.needs_made and self.made_version != self.version and not lasting:
                if self.settled != self.version and not hopeless:
                    continue
                value = Refusal("The text cannot be read as it stands; mend what is marked first.")
            elif question.needs_check and self.check is None and self.role == READER and not hopeless:
                continue
            else:
                if not question.needs_made:
                    self.text = self.units.text
                try:
                    value = question.answer(self, *ask.about)
                except Superseded:
                    continue
                except Faults as wrong:
                    value = Refusal(wrong.faults[0].found)
                except Exception as error:
                    # A question that goes wrong takes nothing else with it.
                    value = Refusal(own_fault(error))
                    self.say(Failed(self.version, value.say))
            del self._asked[place]
            self.say(Answer(ask.number, ask.version, ask.what, value))
            if self.solver is not None:
                back_to = "simulating" if self.solver.simulating else "retiming"
                self.say(Doing(self.version, "" if self._job is None else back_to))
            return True
        return False


def own_fault(error: Exception) -> str:
    """A fault of the program itself, with the place where it came up."""
    trace = error.__traceback__
    while trace and trace.tb_next:
        trace = trace.tb_next
    at = f" ({os.path.basename(trace.tb_frame.f_code.co_filename)}:{trace.tb_lineno})" if trace else ""
    return f"drawcord met a fault of its own: {type(error).__name__}: {error}{at}"


def _solver(desk: Desk) -> Any:
    """What only the solver does, and so what only it has to load."""
    from composer.editor.solving import Solver

    return Solver(desk)
