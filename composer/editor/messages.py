"""What window and workers say to one another, as data. A version counts the changes of the text since the window opened."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    # What the arrays and objects are is known to those who make them; the window loads it when the first of them comes.
    import numpy as np
    from numpy.typing import NDArray

    from composer.editor.deltas import Delta
    from composer.edits.edit import Edit
    from composer.faults import Fault
    from composer.limits.abilities import Abilities
    from composer.limits.check import Check
    from composer.picture.scene import Lane
    from composer.rig.model import Rig
    from composer.tracks import Tracks

    Array = NDArray[np.float64]

# ---- from the window --------------------------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class Whole:
    """The whole text, the file that it stands for (relative paths begin there), and a rig file in place of the score's."""

    version: int
    file: str
    text: str


@dataclass(frozen=True, slots=True)
class Changed:
    """One change of the text, which makes it this version."""

    version: int
    delta: Delta


@dataclass(frozen=True, slots=True)
class Again:
    """Files that the score leans on have changed: read them anew."""

    version: int


@dataclass(frozen=True, slots=True)
class Mode:
    """Which tracks are simulated: those retimed, or those written."""

    retimed: bool


@dataclass(frozen=True, slots=True)
class Ask:
    """A question about a version of the text; `what` is a row of `composer.editor.questions.QUESTIONS`."""

    number: int
    version: int
    what: str
    about: tuple[Any, ...] = ()


# ---- from a worker ----------------------------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class Doing:
    """What a worker is at: a word for the status line, "" for nothing."""

    version: int
    what: str


@dataclass(frozen=True, slots=True)
class FileStamp:
    """A file that the score leans on, as it stood when it was read: when it was written, how large; 0 for not there."""

    path: str
    changed_ns: int
    size: int


@dataclass(frozen=True, slots=True)
class Told:
    """What is wrong with a version, and the files that it was read from beside its own text."""

    version: int
    faults: tuple[Fault, ...]
    leans_on: tuple[FileStamp, ...]


@dataclass(frozen=True, slots=True, eq=False)
class RigRead:
    """The rig, where it is another than before: sent ahead of the first picture that is of it."""

    number: int
    rig: Rig
    abilities: Abilities


@dataclass(frozen=True, slots=True, eq=False)
class Picture:
    """A version that could be read: tracks and all that is drawn with them; `rig` is the number of a `RigRead`."""

    version: int
    rig: int
    title: str
    tracks: Tracks
    tempo: Any
    pins_s: Array
    cues: tuple[Any, ...]


@dataclass(frozen=True, slots=True)
class Row:
    """Snags that are told together: one of them (index into the check's), the sentence, what would mend it, where it is.

    count: how many they are; others: indices of those that are there and then, on the same fibers
    """

    snag: int
    kind: str
    says: str
    mends: str
    place: str
    from_s: float
    to_s: float
    line: int
    phrase_line: int
    fibers: tuple[int, ...]
    others: tuple[int, ...] = ()
    count: int = 1


@dataclass(frozen=True, slots=True, eq=False)
class Checked:
    """The check of a version: what it found, its list for the composer; notes on what is no snag; `more` rows untold.

    count: all snags, of which a window is told no more than it can show
    """

    version: int
    check: Check
    rows: tuple[Row, ...]
    notes: tuple[str, ...] = ()
    more: int = 0
    count: int = 0


@dataclass(frozen=True, slots=True, eq=False)
class Lanes:
    """The curves below the cloth of a version: the receiver's pressure, the highest duty."""

    version: int
    lanes: tuple[Lane, ...]


@dataclass(frozen=True, slots=True)
class Hit:
    """A hit that retiming moved: instants, the sentence, the line."""

    was_s: float
    now_s: float
    says: str
    line: int
    fibers: tuple[int, ...]


@dataclass(frozen=True, slots=True, eq=False)
class Retimed:
    """The retiming of a version: tracks, where instants went, each hit that moved, the report.

    ok: no snag is left; known: whether there is a retiming at all
    """

    version: int
    tracks: Tracks
    was_s: Array
    now_s: Array
    hits: tuple[Hit, ...]
    says: tuple[str, ...]
    ok: bool
    cost: float
    known: bool


@dataclass(frozen=True, slots=True, eq=False)
class Simulated:
    """A stretch of the simulated run of a version: `strain` (F, N) at `time_s` (N,), `step_s` apart, in order.

    share: of the run, done; retimed: whether it is of the tracks as retimed
    """

    version: int
    time_s: Array
    strain: NDArray[np.float32]
    supply_kPa: Array
    duty: Array
    share: float
    step_s: float
    retimed: bool


@dataclass(frozen=True, slots=True, eq=False)
class Ghost:
    """What would come of an edit."""

    tracks: Tracks


@dataclass(frozen=True, slots=True, eq=False)
class Choice:
    """A way to mend a snag, as `composer.edits.mending` offers it."""

    way: str
    say: str
    edit: Edit
    after: Ghost
    snags_left: int


@dataclass(frozen=True, slots=True, eq=False)
class Mended:
    """The choices for a snag, and why the other ways do not help."""

    choices: tuple[Choice, ...]
    not_these: dict[str, str]


@dataclass(frozen=True, slots=True, eq=False)
class Taking:
    """The edit that takes the retiming into the text, what comes of it, and sentences on what could not be said."""

    edit: Edit
    after: Ghost
    off_s: float
    notes: tuple[str, ...]


@dataclass(frozen=True, slots=True, eq=False)
class Dragged:
    """A drag as far as it has got: its edit, and what would come of it, None where it cannot be drawn."""

    edit: Edit
    after: Ghost | None


@dataclass(frozen=True, slots=True, eq=False)
class Answer:
    """The answer to a question; None where there is nothing to say, a `Refusal` where it cannot be."""

    number: int
    version: int
    what: str
    value: Any


@dataclass(frozen=True, slots=True)
class Failed:
    """A fault of the program itself in a worker, as a sentence; what it was at is dropped, and it goes on."""

    version: int
    says: str


class Superseded(Exception):
    """Within a worker: a newer text has come, and what is being worked on is of no use any more."""
