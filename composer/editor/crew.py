"""The two workers as the window sees them: one text, its versions, questions with answers, and workers that may die."""

from collections.abc import Callable
from typing import Any

from PySide6.QtCore import QObject, QTimer, Signal

from composer.editor.background import Worker
from composer.editor.deltas import Delta
from composer.editor.messages import Again, Answer, Ask, Changed, Doing, Failed, Mode, Whole

READER, SOLVER = "reader", "solver"
"""As `composer.editor.desk` has them, which is not loaded into the window's process."""

SLOW_ASKS = ("mends", "take", "print")
"""Questions that the solver answers."""

MOST_DEATHS = 3
"""How often in a row a worker may die of one text before it is left alone until that changes."""

STUCK_MS = 1500
"""How long the solver may go on with an older text before it is ended and begun anew."""

SECOND_MS = 400
"""How much later than the reader the solver is started: window and first picture come first."""

STOPPABLE = ("retiming", "looking for what would mend it", "taking the retiming in")


class Crew(QObject):
    """Both workers. said: whatever they say of the newest version; doing: a word for the status line; died: a sentence."""

    said = Signal(object)
    doing = Signal(str)
    died = Signal(str)

    def __init__(self, text: Callable[[], str] = str, parent: QObject | None = None):
        super().__init__(parent)
        self._text = text
        self._file = ""
        self._retimed = False
        self.version = 0
        self._number = 0
        self._asked: dict[int, tuple[int, Callable[[Any], None]]] = {}
        self._lasting: dict[int, tuple[int, Callable[[Any], None]]] = {}
        self._does: dict[str, str] = {READER: "", SOLVER: ""}
        self._at: dict[str, int] = {READER: -1, SOLVER: -1}
        self._deaths: dict[str, list[int]] = {READER: [], SOLVER: []}
        self._workers = {role: Worker(role, self) for role in (READER, SOLVER)}
        for role, worker in self._workers.items():
            worker.said.connect(lambda message, role=role: self._hear(role, message))
            worker.ended.connect(lambda code, role=role: self._ended(role, code))
        self._second = QTimer(self)
        self._second.setSingleShot(True)
        self._second.setInterval(SECOND_MS)
        self._second.timeout.connect(lambda: self._start(SOLVER))
        self._stuck = QTimer(self)
        self._stuck.setSingleShot(True)
        self._stuck.setInterval(STUCK_MS)
        self._stuck.timeout.connect(self._end_stuck)

    def set_text(self, text: Callable[[], str]) -> None:
        """Where the whole text is had from, for a worker that has to begin anew."""
        self._text = text

    def warm(self) -> None:
        """Start the reader, so that it loads what it needs while the window comes up; the solver follows a little later."""
        self._workers[READER].start()

    def begin(self, file: str, text: str) -> None:
        """Another text."""
        self._file = file
        self.version += 1
        self._asked.clear()
        for role, worker in self._workers.items():
            self._deaths[role] = []
            if worker.runs or role == READER:
                if not worker.runs:
                    worker.start()
                worker.send(Whole(self.version, file, text))
            else:
                self._second.start()
        self._watch()

    def change(self, delta: Delta) -> None:
        """One change of the text."""
        self.version += 1
        self._asked.clear()
        for role, worker in self._workers.items():
            if worker.runs:
                worker.send(Changed(self.version, delta))
            elif not (role == SOLVER and self._second.isActive()):
                self._start(role)
        self._watch()

    def again(self) -> None:
        """Files that the score leans on have changed."""
        for worker in self._workers.values():
            worker.send(Again(self.version))

    def simulate_retimed(self, retimed: bool) -> None:
        """What is to be simulated: the tracks as retimed, or as written."""
        self._retimed = retimed
        self._workers[SOLVER].send(Mode(retimed))

    def ask(self, what: str, about: tuple[Any, ...], then: Callable[[Any], None], lasting: bool = False) -> None:
        """Ask about the text as it is now. An answer that comes when it has changed is not heard, unless it is `lasting`."""
        self._number += 1
        (self._lasting if lasting else self._asked)[self._number] = (self.version, then)
        role = SOLVER if what in SLOW_ASKS else READER
        if role == SOLVER and self._second.isActive():
            self._second.stop()
            self._start(SOLVER)
        self._workers[role].send(Ask(self._number, self.version, what, about))

    def restart_solver(self) -> None:
        """End what the solver is at; another begins with the text as it is."""
        self._lasting.clear()
        self._set_doing(SOLVER, "")
        self._start(SOLVER)

    def end(self) -> None:
        """End both."""
        self._stuck.stop()
        self._second.stop()
        for worker in self._workers.values():
            worker.stop()

    def worker(self, role: str) -> Worker:
        """One of them."""
        return self._workers[role]

    def _start(self, role: str) -> None:
        worker = self._workers[role]
        worker.start()
        worker.send(Whole(self.version, self._file, self._text()))
        if role == SOLVER:
            worker.send(Mode(self._retimed))

    def _watch(self) -> None:
        if self._does[SOLVER] in STOPPABLE and not self._stuck.isActive():
            self._stuck.start()

    def _end_stuck(self) -> None:
        if self._does[SOLVER] in STOPPABLE and self._at[SOLVER] < self.version:
            self.restart_solver()

    def _hear(self, role: str, message: Any) -> None:
        if isinstance(message, Doing):
            self._at[role] = message.version
            self._set_doing(role, message.what)
        elif isinstance(message, Answer):
            lasting = self._lasting.pop(message.number, None)
            version, then = lasting or self._asked.pop(message.number, (-1, None))
            if then is not None and (lasting or version == self.version):
                then(message.value)
        elif isinstance(message, Failed):
            self._set_doing(role, "")
            self.died.emit(message.says)
        elif getattr(message, "version", self.version) == self.version:
            self.said.emit(message)

    def _set_doing(self, role: str, what: str) -> None:
        self._does[role] = what
        self.doing.emit(self._does[READER] or self._does[SOLVER])

    def _ended(self, role: str, code: int) -> None:
        """A worker has died: another takes up the text, unless this text has been too much for several of them."""
        self._set_doing(role, "")
        deaths = [at for at in self._deaths[role] if at == self.version]
        self._deaths[role] = [*deaths, self.version]
        what = "reads and checks" if role == READER else "retimes and simulates"
        how = f"was ended by signal {-code}" if code < 0 else f"ended with code {code}"
        if len(self._deaths[role]) < MOST_DEATHS:
            self._start(role)
            self.died.emit(f"The process that {what} {how}; another has taken up the text.")
        else:
            self.died.emit(
                f"The process that {what} {how}, {MOST_DEATHS} times on this text; it starts again at the next change."
            )
