"""A take made into a score, in a process beside the window."""

import os
from collections.abc import Callable
from dataclasses import dataclass

from composer.faults import Faults
from composer.files import replacing
from player.takes.making import make_score


@dataclass(frozen=True, slots=True)
class Written:
    """The score that was written, and a sentence about it."""

    path: str
    says: str


@dataclass(frozen=True, slots=True)
class NotWritten:
    """No score was written, and why."""

    why: str


def make(take: str, out: str, onto: str | None, tell: Callable[[object], None]) -> None:
    """Write the score of a take: one of its own, or a section of the score that it is laid over."""
    try:
        made = make_score(take, out, onto=onto)
        if not made.fibers:
            tell(NotWritten(f"{os.path.basename(take)}: nothing moves in it"))
            return
        with replacing(out) as file:
            file.write(made.text)
    except Faults as wrong:
        tell(NotWritten(str(wrong)))
        return
    clean = "it checks clean" if made.checked.ok else f"it has {len(made.checked.snags)} snags"
    whole = "" if made.complete else f", sound up to {made.until_s:.1f} s"
    section = f", a section over {os.path.basename(onto)}" if onto else ""
    tell(
        Written(
            out,
            f"{out}: written from {os.path.basename(take)}{section}{whole}; {made.fibers} fibers, within "
            f"{100.0 * made.worst:.2f} % of the stroke of what was played; {clean}",
        )
    )
