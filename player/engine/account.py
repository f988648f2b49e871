"""What an engine keeps to tell: news for the operator, faults for the report, and the reason for which the run ended."""

from player.engine.status import Ending, RunFault

MOST = 200
"""Faults and pieces of news that are kept; further ones are only counted."""

GRAVITY = ("end", "stopped", "vented", "fault")
"""Reasons for an ending, gravest last."""


class Account:
    """News are taken once; of the reasons for the end the first stays, unless a graver one comes."""

    def __init__(self) -> None:
        self.how, self.why = "stopped", "stopped before it began"
        self.lasted_s = 0.0
        self._news: list[str] = []
        self._faults: list[RunFault] = []
        self._more = 0

    def tell(self, say: str) -> None:
        """Something for the operator to hear."""
        if len(self._news) < MOST:
            self._news.append(say)

    def news(self) -> tuple[str, ...]:
        """What is new since the last time."""
        told = tuple(self._news)
        self._news.clear()
        return told

    def fault(self, position_s: float, driver: str, say: str) -> None:
        """Keep a fault, and tell it; one that was told already is counted."""
        if len(self._faults) >= MOST or any(known.say == say for known in self._faults):
            self._more += 1
            return
        self._faults.append(RunFault(position_s, driver, say))
        self.tell(say)

    def ends(self, how: str, why: str, ending: bool) -> None:
        """A reason for the run to end; `ending`: it is on its way there already."""
        if not ending or GRAVITY.index(how) > GRAVITY.index(self.how):
            self.how, self.why = how, why

    def ending(self, state: str, position_s: float) -> Ending:
        """How it ended, with all that was kept."""
        return Ending(self.how, self.why, state, position_s, self.lasted_s, tuple(self._faults), self._more)
