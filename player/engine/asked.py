"""What the operator asks of a run, kept until the loop does it."""

from collections import deque
from collections.abc import Iterator
from dataclasses import dataclass

AT_ONCE = frozenset(("vent", "stop", "rest", "left"))
"""What does not wait for the next tick."""

ENDS = frozenset(("stop", "left"))
"""What ends a run for good, so that nothing is brought back."""

LEFT_SAID = "the front end that commanded is gone, and the rule is rest"

MOST = 1000


@dataclass(frozen=True, slots=True)
class Command:
    """What the operator asks: pause, go_on, jump (`value` in s), next_cue, rest, vent, bring_back, or stop (rest, then vent);
    or "left": whoever commanded is gone, and the rule is rest."""

    kind: str
    value: float = 0.0


class Asked:
    """What has been asked and is not yet done; a signal's handler or another thread may add to it at any moment."""

    def __init__(self) -> None:
        self._waits: deque[Command] = deque(maxlen=MOST)

    def put(self, kind: str, value: float = 0.0) -> None:
        """One more."""
        self._waits.append(Command(kind, value))

    def take(self) -> list[Command]:
        """All of it, in order; it waits no longer."""
        return [self._waits.popleft() for _ in range(len(self._waits))]

    def __iter__(self) -> Iterator[Command]:
        return iter(tuple(self._waits))

    def has(self, kinds: frozenset[str]) -> bool:
        """Whether one of these waits."""
        return bool(self._waits) and any(command.kind in kinds for command in self)
