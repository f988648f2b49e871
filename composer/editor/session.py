"""The file behind the text: opened, saved, kept, recovered, and looked after while others may write it too."""

import os
from collections.abc import Callable

from PySide6.QtCore import QObject, QTimer, Signal

from composer.editor import disk, recovering, recovery
from composer.editor.background import Later
from composer.editor.deltas import Delta, between
from composer.editor.keeper import Keeper
from composer.editor.messages import FileStamp
from composer.editor.notices import Notices
from composer.editor.pane import TextPane
from composer.editor.recovering import sentence
from composer.faults import Faults, say

LOOK_MS = 1000
"""How often files are looked at for what others have written."""

NEW = """title   "Untitled"
rig    \x20

meter   4/4
tempo   60

phrase lift 4
  2      full
  4      rest

section one at 1:1
  *           lift
"""
"""What a new score begins with."""

RIG_AT = (2, 9)
"""Where in it the rig is to be named: line and column."""

UNNAMED = "untitled.score"


class Session(QObject):
    """One score in the window.

    began: another text was begun (the file that relative paths start from, and the text); named: its name has changed
    saved: it was saved; leaned_changed: a file that the score leans on has changed
    rig_wanted: a new score waits for its rig, with the caret where that is named
    """

    began = Signal(str, str)
    named = Signal()
    saved = Signal(str)
    leaned_changed = Signal()
    rig_wanted = Signal()

    def __init__(self, pane: TextPane, notices: Notices, later: Later, parent: QObject | None = None):
        super().__init__(parent)
        self._pane, self._notices, self._later = pane, notices, later
        self.path: str | None = None
        self.base = UNNAMED
        """The file from which relative paths start: the score's own, or that of the demo for an unsaved copy of it."""
        self._stamp: disk.Stamp | None = None
        self._line_end = disk.LF
        self._is_demo = False
        self._revision = 0
        self._saving = False
        self._looking = False
        self._leans_on: tuple[FileStamp, ...] = ()
        self.keeper = Keeper(later, lambda: pane.text, self)
        self.keeper.failed.connect(lambda says: notices.say("keeping", says, kind="fault"))
        self.keeper.mended.connect(lambda: notices.drop("keeping"))
        for told in (self.keeper.failed, self.keeper.mended):
            told.connect(lambda *_: self.named.emit())
        pane.changed.connect(self._changed)
        self._timer = QTimer(self)
        self._timer.setInterval(LOOK_MS)
        self._timer.timeout.connect(self.look)
        self._timer.start()

    @property
    def name(self) -> str:
        """What the window calls the score."""
        if self.path is not None:
            return os.path.basename(self.path)
        return "Estuary, an unsaved copy" if self._is_demo else "untitled"

    @property
    def modified(self) -> bool:
        """Whether something is not saved."""
        return self._pane.document().isModified()

    # ---- beginning ------------------------------------------------------------------------------------------------------

    def open(self, path: str) -> bool:
        """Open a score. Where it cannot be read the text at hand stays, and a sentence says why."""
        found = os.path.abspath(path)
        try:
            read = disk.read_score(found)
        except Faults as wrong:
            self._notices.say("file", say(wrong.faults[0]), kind="fault")
            return False
        self._notices.drop("file")
        self.path, self.base, self._stamp, self._line_end, self._is_demo = found, found, read.stamp, read.line_end, False
        self._begin(read.text, recovery.hash_of(read.text), disk.recovery_path(found))
        if read.mixed:
            self._notices.say("ends", "The lines of this file end in two ways; saving makes them all alike.")
        if not disk.may_write(found):
            self._notices.say("write", f"{self.name} may not be written here. Save it under another name to keep changes.")
        return True

    def begin_at(self, path: str) -> None:
        """Begin with next to nothing, under the name of a file that is not there yet; saving makes it."""
        found = os.path.abspath(path)
        self.path, self.base, self._stamp, self._line_end, self._is_demo = found, found, None, disk.LF, False
        self._begin(NEW, recovery.hash_of(NEW), disk.recovery_path(found))
        self._pane.document().setModified(True)
        self._wait_for_rig()

    def open_demo(self) -> None:
        """Begin with an unsaved copy of *Estuary*."""
        text, folder = disk.demo()
        self._unnamed(text, os.path.join(folder, f"{disk.DEMO}.score"), demo=True)

    def new(self) -> None:
        """Begin with next to nothing."""
        self._unnamed(NEW, os.path.join(os.path.dirname(self.base) if self.path else os.getcwd(), UNNAMED))
        self._wait_for_rig()

    def _wait_for_rig(self) -> None:
        self._pane.go_to(*RIG_AT)
        self.rig_wanted.emit()

    def _unnamed(self, text: str, base: str, demo: bool = False) -> None:
        self.path, self.base, self._stamp, self._line_end, self._is_demo = None, base, None, disk.LF, demo
        self._begin(text, recovery.hash_of(text), disk.untitled_path())

    def _begin(self, text: str, hash_: str, kept_at: str) -> None:
        for name in ("theirs", "write", "ends", "gone"):
            self._notices.drop(name)
        self._leans_on = ()
        found = recovering.put_aside(kept_at, text) if self.path is not None else recovering.orphans()
        self._pane.open_text(text)
        self._revision += 1
        if not self.keeper.begin(kept_at, self.base, hash_, text):
            self._notices.say("twice", f"{self.name} is open in another window too: each will be told when the other saves.")
        self.began.emit(self.base, text)
        self.named.emit()
        for at, read in found[:3]:
            recovering.offer(self, self._notices, self._later, at, read)

    def take_up(self, of: str, text: str) -> None:
        """Go on with a text that was left behind, as one step that undo takes back."""
        if self.path is None:
            self.base = of or self.base
            self._is_demo = os.path.dirname(self.base) == disk.demo()[1]
            self.began.emit(self.base, self._pane.text)
        self.put_text(text)
        self.keeper.moved(self.base)

    def put_text(self, text: str) -> None:
        """Put another text in place of the one at hand, as one step that undo takes back."""
        delta = between(self._pane.text, text)
        if delta is not None:
            self._pane.change([delta])

    def _changed(self, delta: Delta) -> None:
        self._revision += 1
        self.keeper.add(delta)

    # ---- saving ---------------------------------------------------------------------------------------------------------

    def save(self, then: Callable[[], None] | None = None) -> None:
        """Save; where there is no name yet, `save_as` has to be called instead. `then` is called when it is saved."""
        if self.path is not None:
            self._write(self.path, then, self._stamp, over=False)

    def save_as(self, path: str, then: Callable[[], None] | None = None) -> None:
        """Save under another name, which the score then has."""
        if not path.lower().endswith(".score"):
            path += ".score"
        self._write(os.path.abspath(path), then, None, over=True)

    def _write(self, path: str, then: Callable[[], None] | None, expected: disk.Stamp | None, over: bool) -> None:
        if self._saving:
            return
        self._saving = True
        text, revision, ends = self._pane.text, self._revision, self._line_end

        def job() -> disk.Stamp | None:
            now = disk.stamp_of(path)
            if not over and now is not None and now != expected:
                raise _Theirs
            return disk.write_score(path, text, ends)

        def done(stamp: disk.Stamp | None, wrong: Exception | None) -> None:
            self._saving = False
            if isinstance(wrong, _Theirs):
                self.look()
                return
            if wrong is not None:
                self._notices.say("save", f"Not saved; the text is kept. {sentence(wrong)}", kind="fault")
                return
            self._notices.drop("save")
            self._notices.drop("gone")
            self._written(path, text, stamp, revision)
            if then is not None:
                then()

        self._later.do(job, done)

    def _written(self, path: str, text: str, stamp: disk.Stamp | None, revision: int) -> None:
        was = self.base
        moved = path != self.path
        self.path, self._stamp, self.base = path, stamp, path
        if revision == self._revision:
            self._pane.document().setModified(False)
        if moved:
            self._bring_along(was, path, text)
            self._is_demo = False
            self.keeper.begin(disk.recovery_path(path), path, recovery.hash_of(text), self._pane.text)
            self._notices.drop("write")
            self.began.emit(self.base, self._pane.text)
        else:
            self.keeper.saved(recovery.hash_of(text))
        self.named.emit()
        self.saved.emit(path)

    def _bring_along(self, was: str, path: str, text: str) -> None:
        """The rig of a score that has gone to another folder, where it is not there too: copied for the demo, offered else."""
        old, new = os.path.dirname(was), os.path.dirname(path)
        rig = _rig_in(text)
        if old == new or not rig or os.path.isabs(rig) or os.path.exists(os.path.join(new, rig)):
            return
        source, target = os.path.join(old, rig), os.path.join(new, rig)
        if not os.path.exists(source):
            return

        def copy() -> None:
            self._later.do(lambda: disk.copy(source, target), copied)

        def copied(_: object, wrong: Exception | None) -> None:
            if wrong is None:
                self._notices.say("rig", f"Its rig is beside it now: {target}.")
                self.leaned_changed.emit()
            else:
                self._notices.say("rig", sentence(wrong), kind="fault")

        if self._is_demo:
            copy()
        else:
            self._notices.say(
                "rig", f"The rig {rig} is not in that folder.", [("Copy it there", copy), ("Leave it", lambda: None)]
            )

    # ---- others ---------------------------------------------------------------------------------------------------------

    def lean_on(self, files: tuple[FileStamp, ...]) -> None:
        """Look after these files too."""
        self._leans_on = files

    def look(self) -> None:
        """See whether somebody else has written one of the files, without waiting for the disk."""
        if self._looking or self._saving:
            return
        self._looking = True
        path, stamp, leans = self.path, self._stamp, self._leans_on

        def job() -> tuple[disk.Read | Faults | None, bool, bool]:
            changed = any(_differs(one) for one in leans)
            if path is None or stamp is None:
                return None, changed, False
            now = disk.stamp_of(path)
            if now is None:
                return None, changed, True
            if now == stamp:
                return None, changed, False
            try:
                return disk.read_score(path), changed, False
            except Faults as wrong:
                return wrong, changed, False

        def done(found: tuple | None, _: Exception | None) -> None:
            self._looking = False
            if found is None or path != self.path or self._stamp != stamp:
                return
            theirs, changed, gone = found
            if changed and self._leans_on is leans:
                self._leans_on = ()
                self.leaned_changed.emit()
            if gone:
                self._stamp = None
                self._pane.document().setModified(True)
                self._notices.say("gone", f"{self.name} is no longer there. Its text is here; saving writes it again.")
            elif isinstance(theirs, disk.Read):
                self._theirs(theirs)
            elif isinstance(theirs, Faults):
                self._stamp = disk.stamp_of(path) if path else None
                self._notices.say(
                    "theirs", f"{self.name} was written by another program, and cannot be read: {sentence(theirs)}"
                )

        self._later.do(job, done)

    def _theirs(self, theirs: disk.Read) -> None:
        """Another program has written the file: nothing happens to either text until somebody chooses."""
        self._stamp = theirs.stamp
        if theirs.text == self._pane.text:
            self._pane.document().setModified(False)
            return
        mine = " You have changes too." if self.modified else ""
        self._pane.document().setModified(True)

        def take() -> None:
            self.put_text(theirs.text)
            self._pane.document().setModified(False)
            self.keeper.saved(recovery.hash_of(theirs.text))

        def keep() -> None:
            beside = recovering.free_beside(self.path or UNNAMED, "theirs")
            self._later.do(lambda: disk.write_score(beside, theirs.text), told_beside(beside))

        def told_beside(beside: str) -> Callable[[object, Exception | None], None]:
            def told(_: object, wrong: Exception | None) -> None:
                says = f"Theirs is kept in {beside}." if wrong is None else sentence(wrong)
                self._notices.say("beside", says, kind="notice" if wrong is None else "fault")

            return told

        self._notices.say(
            "theirs",
            f"{self.name} was written by another program.{mine} Undo brings yours back if you take theirs; "
            "theirs is kept beside it if you keep yours.",
            [("Take theirs", take), ("Keep mine", keep)],
        )

    def close(self, keep: bool) -> None:
        """No more of this. keep: what is not saved is found at the next start."""
        self._timer.stop()
        self.keeper.end(remove=not (keep and self.modified))


class _Theirs(Exception):
    """Somebody else has written the file in between."""


def _differs(one: FileStamp) -> bool:
    now = disk.stamp_of(one.path)
    return (now.changed_ns, now.size) != (one.changed_ns, one.size) if now is not None else one.changed_ns != 0


def _rig_in(text: str) -> str:
    for line in text.splitlines():
        words = line.split("#")[0].split()
        if len(words) == 2 and words[0] == "rig":
            return words[1].strip('"')
    return ""
