"""What signals do to a command that plays, and to the process of a run."""

import signal
from collections.abc import Callable, Iterator
from contextlib import contextmanager


class Interrupt:
    """Before arming, signals end the program; afterwards they ask for a stop. hung_up: the terminal is gone."""

    def __init__(self, ask: Callable[[str], object]):
        self._ask, self._stops = ask, False
        self.hung_up = False

    def become_stops(self) -> None:
        """From here on the fibers may be moving."""
        self._stops = True

    def __call__(self, number: int, *_: object) -> None:
        """A signal has come."""
        if number == getattr(signal, "SIGHUP", None):
            self.hung_up = True
        if not self._stops:
            raise KeyboardInterrupt
        self._ask("stop")


@contextmanager
def stopping(ask: Callable[[str], object]) -> Iterator[Interrupt]:
    """Ctrl-C, and being told to end, or losing the terminal: each asks for a stop."""
    interrupt = Interrupt(ask)
    numbers = [signal.SIGINT, signal.SIGTERM] + ([signal.SIGHUP] if hasattr(signal, "SIGHUP") else [])
    before = {number: signal.signal(number, interrupt) for number in numbers}
    try:
        yield interrupt
    finally:
        for number, handler in before.items():
            signal.signal(number, handler)
