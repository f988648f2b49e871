"""What would mend a snag, each as an edit of the text that has been tried: only what really helps is offered."""

from dataclasses import dataclass

from composer.edits.edit import Edit
from composer.edits.made import Made, Remake
from composer.limits.check import Check
from composer.limits.snag import Snag
from composer.retime.retiming import Retiming

WAYS = ("time", "lead", "shrink", "pin", "retime", "air")
"""Give it time, let it lead, shrink it, pin this, let the retimer do this hit, ask less of the air."""


@dataclass(frozen=True, slots=True, eq=False)
class Choice:
    """A way to mend a snag: `way` one of WAYS, the words for its button, the edit, what comes of it (for the ghost), and how
    many snags are left then."""

    way: str
    say: str
    edit: Edit
    after: Made
    snags_left: int


@dataclass(frozen=True, slots=True, eq=False)
class Mending:
    """The choices for a snag, and for each way that does not help a sentence why not, by way."""

    choices: tuple[Choice, ...]
    not_these: dict[str, str]


def mends(text: str, made: Made, snag: Snag, checked: Check, remake: Remake, retiming: Retiming | None = None) -> Mending:
    """What would mend a snag of `checked`, each tried by expanding and checking the edited text. Takes a while: for a worker.

    retiming: of `made.tracks` where there is one; without it nothing is offered that needs one.
    """
    raise NotImplementedError
