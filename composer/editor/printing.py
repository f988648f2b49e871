"""Pages for the rehearsal-room wall: made by a worker while one writes on, written when they are whole, stopped at a word."""

from collections.abc import Sequence
from typing import Any

from PySide6.QtCore import QObject

from composer.editor import disk
from composer.editor.background import Later
from composer.editor.crew import Crew
from composer.editor.messages import Row
from composer.editor.notices import Notices
from composer.editor.recovering import sentence
from composer.editor.snags_panel import with_count
from composer.edits.edit import Refusal


class Printer(QObject):
    """One print at a time."""

    def __init__(self, crew: Crew, notices: Notices, later: Later, parent: QObject | None = None):
        super().__init__(parent)
        self._crew, self._notices, self._later = crew, notices, later
        self._path = ""
        self.busy = False
        crew.doing.connect(self._heard)

    def start(self, path: str, rows: Sequence[Row], paper: str = "A4") -> None:
        """Print what is shown into a PDF file."""
        if self.busy:
            return
        self._path = path if path.lower().endswith(".pdf") else f"{path}.pdf"
        self.busy = True
        self._say("")
        lines = tuple((row.place, row.says, with_count(row)) for row in rows)
        self._crew.ask("print", (lines, paper), self._printed, lasting=True)

    def stop(self) -> None:
        """Let it be; nothing is written."""
        if self.busy:
            self.busy = False
            self._crew.restart_solver()
            self._notices.say("print", "Printing was stopped; nothing was written.")

    def _say(self, share: str) -> None:
        self._notices.say("print", f"Printing to {self._path}{share} …", [("Stop printing", self.stop)])

    def _heard(self, what: str) -> None:
        if self.busy and what.startswith("printing "):
            self._say(f": {what.removeprefix('printing ')}")

    def _printed(self, pdf: Any) -> None:
        if not self.busy:
            return
        self.busy = False
        if isinstance(pdf, Refusal) or pdf is None:
            self._notices.say("print", pdf.say if pdf is not None else "Nothing was printed.", kind="fault")
        else:
            self._later.do(lambda: disk.write_bytes(self._path, pdf), self._written)

    def _written(self, _: object, wrong: Exception | None) -> None:
        if wrong is None:
            self._notices.say("print", f"Printed: {self._path}")
        else:
            self._notices.say("print", f"Nothing was printed. {sentence(wrong)}", kind="fault")
