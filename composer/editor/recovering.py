"""Texts that a window left behind when it ended by itself: found at the next start, and offered while work goes on."""

import os
from typing import TYPE_CHECKING

from composer.editor import disk, recovery
from composer.editor.background import Later
from composer.editor.notices import Notices
from composer.faults import Faults, say

if TYPE_CHECKING:
    from composer.editor.session import Session

Found = list[tuple[str, recovery.Recovered]]


def put_aside(kept_at: str, text: str) -> Found:
    """What was left unsaved of a file, moved where nothing overwrites it; what is in the file already is dropped."""
    there = _beside(*os.path.split(kept_at))
    kept = []
    for at, read in disk.left_behind(there) if there else []:
        if read.text == text:
            disk.remove(at)
            continue
        if at == kept_at:
            aside = f"{kept_at}.{os.urandom(3).hex()}"
            try:
                os.replace(at, aside)
            except OSError:
                continue
            at = aside
        kept.append((at, read))
    return kept


def orphans() -> Found:
    """What was left behind of texts that never had a name; those in which nothing was changed are dropped."""
    kept = []
    for at, read in disk.left_behind():
        if recovery.hash_of(read.text) == read.saved:
            disk.remove(at)
        else:
            kept.append((at, read))
    return kept


def offer(session: "Session", notices: Notices, later: Later, at: str, read: recovery.Recovered) -> None:
    """A bar that says what was found, and what can be done with it."""
    name = os.path.basename(read.of) if session.path is not None else "A score that had no name"
    title = next((line for line in read.text.splitlines() if line.startswith("title")), "").partition('"')[2].rstrip('"')
    what = f"{name} ({title})" if title else name

    def take_up() -> None:
        session.take_up(read.of, read.text)
        # Not before the text is kept under the window's own name.
        later.do(lambda: disk.remove(at))

    def save_beside() -> None:
        beside = free_beside(session.path or os.path.join(os.getcwd(), "untitled.score"), "recovered")

        def done(_: object, wrong: Exception | None) -> None:
            if wrong is None:
                disk.remove(at)
                notices.say("beside", f"It is in {beside}.")
            else:
                notices.say("beside", sentence(wrong), kind="fault")

        later.do(lambda: disk.write_score(beside, read.text), done)

    notices.say(
        f"recovered {at}",
        f"{what} was left unsaved. Its text is still there, to the last change.",
        [("Take it up", take_up), ("Save it beside", save_beside), ("Throw it away", lambda: disk.remove(at))],
    )


def free_beside(path: str, word: str) -> str:
    """A name beside a score's that no file has yet."""
    stem = path[: -len(".score")] if path.lower().endswith(".score") else path
    number = 1
    while os.path.exists(name := f"{stem}.{word}{'' if number == 1 else f'-{number}'}.score"):
        number += 1
    return name


def sentence(wrong: Exception) -> str:
    """What went wrong, for a bar."""
    return say(wrong.faults[0]) if isinstance(wrong, Faults) else f"{type(wrong).__name__}: {wrong}"


def _beside(folder: str, name: str) -> list[str]:
    """The files of recovery of a score, the one in use and those put aside."""
    try:
        there = os.listdir(folder or ".")
    except OSError:
        return []
    return [os.path.join(folder, each) for each in sorted(there) if each.startswith(name) and not each.endswith(".new")]
