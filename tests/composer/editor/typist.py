"""Somebody who types without end into a real pane with a real file, saving now and then: to be killed at any moment.

Run as a script it forks a typist for every line `FOLDER SEED` on its input, and says that one's process id; the typist writes
the number of each edit that is done to FOLDER/done, as soon as it is done.
"""

import os
import random
import signal
import sys

START = 'title "Typing"\n' + "# a line that stands here\n" * 40
EDITS = 4000


def edits(seed):
    """The edits of a typist, without end in sight: where (a share of the text), how many characters go, what comes."""
    dice = random.Random(seed)
    for number in range(EDITS):
        out = dice.choice((0, 0, 0, 1, 5))
        yield dice.random(), out, f"w{number} " + dice.choice(("", "\n", "ä", "\U0001f300"))


def span(text, where, out):
    """Which characters of a text an edit replaces."""
    at = int(where * len(text))
    return at, min(at + out, len(text))


def texts(seed, count):
    """The text after each of so many edits, the text before the first at 0."""
    text = START
    made = [text]
    for (where, out, put), _ in zip(edits(seed), range(count), strict=False):
        at, end = span(text, where, out)
        text = text[:at] + put + text[end:]
        made.append(text)
    return made


def work(folder, seed):
    """Type until killed."""
    from PySide6.QtCore import QTimer
    from PySide6.QtWidgets import QApplication

    from composer.editor import recovery
    from composer.editor.background import Later
    from composer.editor.deltas import counted
    from composer.editor.notices import Notices
    from composer.editor.pane import TextPane
    from composer.editor.session import Session

    recovery.REWRITE_MS, recovery.SYNC_MS = 40, 25
    app = QApplication.instance() or QApplication([])
    pane, later = TextPane(), Later()
    session = Session(pane, Notices(), later)
    session.open(os.path.join(folder, "a.score"))
    done = os.open(os.path.join(folder, "done"), os.O_WRONLY | os.O_CREAT | os.O_APPEND)
    text = START
    todo = edits(seed)
    count = 0

    def type_one():
        nonlocal text, count
        where, out, put = next(todo)
        at, end = span(text, where, out)
        pane.change(counted(text, [(at, end, put)]))
        text = text[:at] + put + text[end:]
        count += 1
        os.write(done, b"%d\n" % count)
        if count % 7 == 0:
            session.save()

    timer = QTimer()
    timer.timeout.connect(type_one)
    timer.start(0)
    app.exec()


def main():
    """Fork a typist for each line."""
    import composer.editor.session  # noqa: F401  what takes long is loaded once

    signal.signal(signal.SIGCHLD, signal.SIG_IGN)
    for line in sys.stdin:
        folder, seed = line.split()
        child = os.fork()
        if not child:
            sys.stdin.close()
            work(folder, int(seed))
        print(child, flush=True)


if __name__ == "__main__":
    main()
