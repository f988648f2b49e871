"""A snag: a stretch of a track that its fiber or its supply cannot do."""

from dataclasses import dataclass

KINDS = ("stroke", "rate", "accel", "switching", "duty", "hold", "air", "pin")


@dataclass(frozen=True, slots=True)
class Snag:
    """What is broken, where, and by how much.

    kind: one of KINDS; fiber: index in the rig, None for air
    from_s, to_s: the unbroken stretch of time; needs over has, in `unit`, is how far past the limit
    knot: the segment (index into the tracks) where it is worst, -1 where none is to blame alone
    line: line of the score that made that segment, 0 for none
    mends: whether time alone can mend it
    """

    kind: str
    fiber: int | None
    from_s: float
    to_s: float
    needs: float
    has: float
    unit: str
    knot: int
    line: int
    mends: bool = True
