"""Pages for the rehearsal-room wall: made one at a time between other things, written when they are whole, stopped at a word."""

from collections.abc import Sequence
from typing import Any

from PySide6.QtCore import QObject, QTimer

from composer.editor import disk
from composer.editor.background import Later
from composer.editor.known import Known
from composer.editor.messages import Row
from composer.editor.notices import Notices
from composer.editor.recovering import sentence


class Printer(QObject):
    """One print at a time."""

    def __init__(self, notices: Notices, later: Later, parent: QObject | None = None):
        super().__init__(parent)
        self._notices, self._later = notices, later
        self._pages: Any = None
        self._printing: Any = None
        self._path = ""
        self._timer = QTimer(self)
        self._timer.setInterval(0)
        self._timer.timeout.connect(self._next)

    @property
    def busy(self) -> bool:
        """Whether pages are being made."""
        return self._pages is not None

    def start(self, path: str, known: Known, rows: Sequence[Row], paper: str = "A4") -> None:
        """Print what is shown into a PDF file."""
        if known.weave is None or known.picture is None:
            self._notices.say("print", "There is nothing to print yet: the text cannot be read.")
            return
        from composer.picture.pages import Line, Printing

        lines = [Line(row.place, row.says, row.mends) for row in rows]
        self._path = path if path.lower().endswith(".pdf") else f"{path}.pdf"
        self._printing = Printing(known.weave, known.picture.title, lines, known.picture.sections, paper)
        self._pages = self._printing.pages()
        self._say(0.0)
        self._timer.start()

    def stop(self) -> None:
        """Let it be; nothing is written."""
        self._timer.stop()
        self._pages = self._printing = None
        self._notices.say("print", "Printing was stopped; nothing was written.")

    def _say(self, share: float) -> None:
        self._notices.say("print", f"Printing to {self._path}: {100 * share:.0f} % …", [("Stop printing", self.stop)])

    def _next(self) -> None:
        if self._pages is None:
            self._timer.stop()
            return
        try:
            share = next(self._pages)
        except StopIteration:
            self._timer.stop()
            pdf, self._pages, self._printing = self._printing.pdf, None, None
            self._later.do(lambda: disk.write_bytes(self._path, pdf), self._written)
            return
        self._say(share)

    def _written(self, _: object, wrong: Exception | None) -> None:
        if wrong is None:
            self._notices.say("print", f"Printed: {self._path}")
        else:
            self._notices.say("print", f"Nothing was printed. {sentence(wrong)}", kind="fault")
