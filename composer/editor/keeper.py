"""Keeps every change of the text as it is made: the file of recovery from the window's side, with its timers."""

from collections.abc import Callable

from PySide6.QtCore import QObject, QTimer, Signal

from composer.editor import disk, recovery
from composer.editor.background import Later
from composer.editor.deltas import Delta

AT_ONCE = 1 << 20
"""Characters of a text that is written whole without leaving the window's thread: a few milliseconds."""


class Keeper(QObject):
    """One text's file of recovery. failed: a sentence on why changes cannot be kept; mended: they can be again."""

    failed = Signal(str)
    mended = Signal()

    def __init__(self, later: Later, text: Callable[[], str], parent: QObject | None = None):
        super().__init__(parent)
        self._later, self._text = later, text
        self._keeping: disk.Keeping | None = None
        self._claim: disk.Claim | None = None
        self._path, self._of, self._saved = "", "", ""
        self._since: list[Delta] | None = None
        self._broken = False
        self._number = 0
        self._sync = QTimer(self)
        self._sync.setInterval(recovery.SYNC_MS)
        self._sync.timeout.connect(self._sync_now)
        self._rewrite = QTimer(self)
        self._rewrite.setSingleShot(True)
        self._rewrite.setInterval(recovery.REWRITE_MS)
        self._rewrite.timeout.connect(self.rewrite)

    @property
    def path(self) -> str:
        """The file of recovery."""
        return self._path

    @property
    def keeps(self) -> bool:
        """Whether every change is kept as it is made."""
        return not self._broken

    def begin(self, path: str, of: str, saved: str, text: str) -> bool:
        """Keep a text there from now on; False where another process does, and it is kept with the program instead."""
        self.end(remove=True)
        claim = disk.Claim(path)
        mine = claim.take()
        if not mine:
            path = disk.untitled_path()
            claim = disk.Claim(path)
            claim.take()
        self._path, self._of, self._saved, self._claim = path, of, saved, claim
        self._broken = False
        if len(text) <= AT_ONCE:
            try:
                self._keeping = disk.Keeping(path, of, saved, text)
                self._keeping.take_place()
            except OSError as error:
                self._fail(error)
        else:
            self.rewrite()
        self._sync.start()
        return mine

    def add(self, delta: Delta) -> None:
        """Keep one change; when this returns, it outlives this process."""
        if self._since is not None:
            self._since.append(delta)
        if self._keeping is not None and not self._broken:
            try:
                self._keeping.add(delta)
            except OSError as error:
                self._fail(error)
        if self._path and not self._rewrite.isActive():
            self._rewrite.start()

    def moved(self, of: str) -> None:
        """The text stands for another file now."""
        self._of = of
        self.rewrite()

    def saved(self, hash_: str, of: str = "") -> None:
        """The file now holds a text of that hash."""
        self._saved, self._of = hash_, of or self._of
        self.rewrite()

    def rewrite(self) -> None:
        """Write the whole text anew, in the background; changes meanwhile go into the old file and the new one."""
        if not self._path:
            return
        if self._since is not None:
            self._rewrite.start()
            return
        self._since = []
        number, path, of, saved, text = self._number, self._path, self._of, self._saved, self._text()
        self._later.do(
            lambda: disk.Keeping(path, of, saved, text), lambda keeping, wrong: self._rewritten(number, keeping, wrong)
        )

    def end(self, remove: bool) -> None:
        """Keep no longer. remove: the text is safe elsewhere, or not wanted; else the next start finds it."""
        self._number += 1
        self._sync.stop()
        self._rewrite.stop()
        self._since = None
        if self._keeping is not None:
            self._keeping.close()
            self._keeping = None
        if remove and self._path:
            disk.remove(self._path)
        if self._claim is not None:
            self._claim.drop()
            self._claim = None
        self._path = ""

    def _rewritten(self, number: int, keeping: disk.Keeping | None, wrong: Exception | None) -> None:
        since, self._since = self._since, None
        if number != self._number:
            # Meanwhile another text is kept; what was begun for the one before is not wanted.
            self._since = since
            if keeping is not None:
                keeping.drop()
            return
        if keeping is None:
            self._fail(wrong)
            return
        try:
            for delta in since or ():
                keeping.add(delta)
            keeping.take_place()
        except OSError as error:
            keeping.drop()
            self._fail(error)
            return
        if self._keeping is not None:
            self._keeping.close()
        self._keeping = keeping
        if self._broken:
            self._broken = False
            self.mended.emit()

    def _fail(self, error: Exception | None) -> None:
        if not self._broken:
            self._broken = True
            why = error.strerror if isinstance(error, OSError) and error.strerror else str(error)
            self.failed.emit(
                f"Changes cannot be kept as you make them ({why}): {self._path}. Save the score, here or elsewhere."
            )
        self._rewrite.start()

    def _sync_now(self) -> None:
        keeping = self._keeping
        if keeping is not None and keeping.dirty and not self._later.busy:
            self._later.do(keeping.sync)
