"""Where the play head is: a clock that is told how much time has passed, plays, loops and runs at any speed; no Qt."""

from dataclasses import dataclass, replace

SLOWEST, FASTEST = 0.25, 2.0
SHORTEST_LOOP_S = 0.05


@dataclass(frozen=True, slots=True)
class PlayHead:
    """At `at_s` of a piece of `end_s` seconds, running or not, at `speed` times its pace, over and over in `loop_s`."""

    end_s: float
    at_s: float = 0.0
    playing: bool = False
    speed: float = 1.0
    loop_s: tuple[float, float] | None = None


def moved_to(head: PlayHead, at_s: float) -> PlayHead:
    """The head at another instant, kept within the piece."""
    return replace(head, at_s=min(max(at_s, 0.0), head.end_s))


def started(head: PlayHead) -> PlayHead:
    """The head running: from the start where it stands at the end, from the loop's start where it stands outside the loop."""
    at = head.at_s
    if head.loop_s is not None and not head.loop_s[0] <= at < head.loop_s[1]:
        at = head.loop_s[0]
    elif head.loop_s is None and at >= head.end_s:
        at = 0.0
    return replace(head, at_s=at, playing=True)


def stopped(head: PlayHead) -> PlayHead:
    """The head at a stand."""
    return replace(head, playing=False)


def with_speed(head: PlayHead, speed: float) -> PlayHead:
    """The head at another speed, from SLOWEST to FASTEST."""
    return replace(head, speed=min(max(speed, SLOWEST), FASTEST))


def with_loop(head: PlayHead, from_s: float, to_s: float) -> PlayHead:
    """The head going round in a passage, whichever end is named first; one too short to be a passage is none."""
    begin, end = sorted((min(max(from_s, 0.0), head.end_s), min(max(to_s, 0.0), head.end_s)))
    return replace(head, loop_s=(begin, end) if end - begin >= SHORTEST_LOOP_S else None)


def without_loop(head: PlayHead) -> PlayHead:
    """The head going on to the end."""
    return replace(head, loop_s=None)


def advanced(head: PlayHead, passed_s: float) -> PlayHead:
    """The head after `passed_s` seconds of a person's time: at the end it stops, at a loop's end it begins that again."""
    if not head.playing or passed_s <= 0.0:
        return head
    at = head.at_s + passed_s * head.speed
    if head.loop_s is not None and head.at_s < head.loop_s[1]:
        begin, end = head.loop_s
        return replace(head, at_s=at if at < end else begin + (at - end) % (end - begin))
    return replace(head, at_s=min(at, head.end_s), playing=at < head.end_s)
