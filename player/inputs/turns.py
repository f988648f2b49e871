"""What a followed clock does that the player must know of: it runs, stands, jumps, falls silent."""

from dataclasses import dataclass

KINDS = {
    "run": "the clock runs from a place on",
    "stop": "the clock has been stopped",
    "locate": "the clock has gone to another place",
    "coast": "nothing came: going on at the last tempo",
    "hold": "still nothing: standing, fibers held",
    "again": "the clock is there again",
    "wild": "the clock runs at a tempo that no score has, or backwards: standing",
}


@dataclass(frozen=True, slots=True)
class Turn:
    """One such event: `kind` of `KINDS`, the place and moment that it concerns, and what the operator is told."""

    kind: str
    place: float
    at_s: float
    say: str


STATES = ("waiting", "stopped", "running", "coasting", "holding", "wild")
"""What a follower is doing; it moves the score in "running" and "coasting" alone."""
