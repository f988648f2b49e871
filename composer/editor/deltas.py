"""A change of a text as Qt tells it: so many code units out, a text in; what the journal and the worker both are sent.

Positions count UTF-16 code units, as in a `QTextDocument`, so that no change has to look at the text before it.
"""

from collections.abc import Iterable
from dataclasses import dataclass

UNIT = 2
"""Bytes of a code unit."""


@dataclass(frozen=True, slots=True)
class Delta:
    """`put` takes the place of `out` code units from `at` on."""

    at: int
    out: int
    put: str


class Units:
    """A text as UTF-16 code units, that deltas change in place."""

    def __init__(self, text: str = ""):
        self._bytes = bytearray(_encoded(text))

    def __len__(self) -> int:
        return len(self._bytes) // UNIT

    @property
    def text(self) -> str:
        """The text as it is now; half of a pair that stands alone becomes the mark of an unreadable character."""
        return self._bytes.decode("utf-16-le", "replace")

    def change(self, delta: Delta) -> None:
        """Make one change. Raises ValueError where it reaches beyond the text."""
        if delta.at < 0 or delta.out < 0 or delta.at + delta.out > len(self):
            raise ValueError(f"{delta.out} units from {delta.at} on, in a text of {len(self)}")
        self._bytes[UNIT * delta.at : UNIT * (delta.at + delta.out)] = _encoded(delta.put)


def units_in(text: str) -> int:
    """How many code units a text has."""
    return len(text) if text.isascii() else len(_encoded(text)) // UNIT


def between(was: str, now: str) -> Delta | None:
    """The one change, as short as may be, that makes `was` into `now`; None where they are the same.

    It never parts a pair of code units.
    """
    if was == now:
        return None
    most = min(len(was), len(now))
    head = _alike(was, now, most)
    tail = _alike(was[head:][::-1], now[head:][::-1], most - head)
    return Delta(units_in(was[:head]), units_in(was[head : len(was) - tail]), now[head : len(now) - tail])


def counted(text: str, changes: Iterable[tuple[int, int, str]]) -> list[Delta]:
    """Changes of a text by characters (from, to before, what stands there instead) as deltas."""
    if text.isascii():
        return [Delta(start, end - start, put) for start, end, put in changes]
    made = []
    at = units = 0
    for start, end, put in sorted(changes):
        units += units_in(text[at:start])
        length = units_in(text[start:end])
        made.append(Delta(units, length, put))
        at, units = end, units + length
    return made


def _alike(one: str, other: str, most: int) -> int:
    """How many characters two texts begin with alike, by halving: comparing slices is what Python does fast."""
    low, high = 0, most
    while low < high:
        middle = (low + high + 1) // 2
        if one[low:middle] == other[low:middle]:
            low = middle
        else:
            high = middle - 1
    return low


def _encoded(text: str) -> bytes:
    return text.encode("utf-16-le", "surrogatepass")
