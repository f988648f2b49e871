"""The simulated rig in a process of its own, so that its arithmetic never holds up a set that is due."""

import multiprocessing
import os
import signal
from collections.abc import Sequence
from typing import Any

from composer.limits.abilities import abilities_of
from composer.rig.model import Rig
from player.engine.clock import SteadyClock
from player.wire.mishaps import MISHAPS
from player.wire.simulated import Bench

STEP_S = 0.002
"""The rig moves in steps of this, or longer ones where its arithmetic takes longer: it keeps real time."""


class BenchProcess:
    """The fibers of one driver, as `player.wire.simulated.Bench` has them, moved elsewhere; what is read is at most a step old.

    mishap: the name of a row of MISHAPS whose `bench` is to happen at `strike`
    """

    def __init__(self, rig: Rig, driver: str, mishap: str | None):
        here = Bench(rig, abilities_of(rig), driver)
        self.channels, self.drives = here.channels, here.drives
        context = multiprocessing.get_context("spawn")
        self._numbers = context.RawArray("H", self.channels)
        self._strain = context.RawArray("H", here.strain(0, self.channels))
        self._supply = context.RawValue("H", here.supply())
        self._struck = context.RawValue("B", 0)
        shared = (self._numbers, self._strain, self._supply, self._struck)
        self._process = context.Process(target=_move, args=(rig, driver, mishap, shared, os.getpid()), daemon=True)

    def start(self) -> None:
        """Begin to move."""
        self._process.start()

    def close(self) -> None:
        """Stop moving; harmless when called twice."""
        if self._process.is_alive():
            self._process.terminate()
            self._process.join(2.0)

    def set_valves(self, first: int, values: Sequence[int]) -> None:
        """Channels from `first` on take these numbers."""
        self._numbers[first : first + len(values)] = values

    def strain(self, first: int, count: int) -> list[int]:
        """What the sensors of `count` channels read, 0 to 65535 of usable stroke."""
        return self._strain[first : first + count]

    def supply(self) -> int:
        """What the receiver's sensor reads, kPa gauge × 10."""
        return self._supply.value

    def strike(self) -> None:
        """Let the mishap happen."""
        self._struck.value = 1


def _move(rig: Rig, driver: str, mishap: str | None, shared: tuple[Any, ...], parent: int) -> None:
    """Move the rig in real time until the board is gone."""
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    numbers, strain, supply, struck = shared
    bench, clock = Bench(rig, abilities_of(rig), driver), SteadyClock(spin_s=0.0)
    was_s, hit = clock.now(), False
    while os.getppid() == parent:
        now_s = clock.wait_until(was_s + STEP_S)
        bench.set_valves(0, numbers[:])
        if struck.value and not hit and mishap is not None:
            MISHAPS[mishap].bench(bench)
            hit = True
        bench.step(now_s - was_s)
        was_s = now_s
        strain[:] = bench.strain(0, bench.channels)
        supply.value = bench.supply()
