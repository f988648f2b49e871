"""The simulated rig as one board sees it: numbers of channels in, strains and supply out."""

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.rig.model import Rig
from composer.simulate.rig import SimulatedRig
from player.wire.messages import NOT_SENSED
from player.wire.values import FULL, from_wire

Array = NDArray[np.float64]


class Bench:
    """The fibers of one driver of a rig, moved by the numbers its channels are set to; those of other drivers stay at rest.

    drives: the drive of each channel of the board (a channel that no fiber uses: "pressure")
    numbers (channels,): what each channel was last set to
    stuck, railed, leaking: channels whose valve no longer moves, whose sensor reads full, whose fiber falls as if it leaked
    low_supply: whether the receiver's sensor reads below the rig's least
    """

    def __init__(self, rig: Rig, abilities: Abilities, driver: str):
        mine = [n for n, fiber in enumerate(rig.fibers) if fiber.driver == driver]
        self.channels = next(board.channels for board in rig.drivers if board.name == driver)
        self._fibers = np.array(mine, dtype=np.int64)
        self._channel = np.array([rig.fibers[n].channel for n in mine], dtype=np.int64)
        drives = ["pressure"] * self.channels
        for n in mine:
            drives[rig.fibers[n].channel] = rig.fibers[n].mounting.valve.drive
        self.drives = tuple(drives)
        self._valve = np.array([drives[channel] == "valve" for channel in self._channel], dtype=bool)
        self._stroke = abilities.stroke[self._fibers]
        self._least_kPa = rig.supply.min_pressure_kPa
        self._rig = SimulatedRig(rig, abilities)
        self._command = np.zeros(len(rig.fibers))
        self.numbers = np.zeros(self.channels, dtype=np.int64)
        self.stuck: dict[int, int] = {}
        self.railed: set[int] = set()
        self.leaking: dict[int, float] = {}
        self.low_supply = False

    def set_valves(self, first: int, values: Sequence[int]) -> None:
        """Channels from `first` on take these numbers."""
        self.numbers[first : first + len(values)] = values
        for channel, number in self.stuck.items():
            self.numbers[channel] = number

    def step(self, dt_s: float) -> None:
        """Let time pass."""
        self._command[self._fibers] = from_wire(self.numbers[self._channel], self._valve)
        self._rig.step(dt_s, self._command)
        for channel in self.leaking:
            # Half of what is held is lost in a second.
            self.leaking[channel] *= 0.5**dt_s

    def strain(self, first: int, count: int) -> list[int]:
        """What the sensors of `count` channels read, 0 to 65535 of usable stroke; 0 where no fiber hangs."""
        share = np.zeros(self.channels)
        share[self._channel] = np.clip(self._rig.strain[self._fibers] / self._stroke, 0.0, 1.0)
        for channel, left in self.leaking.items():
            share[channel] *= left
        share[list(self.railed)] = 1.0
        return np.rint(share[first : first + count] * FULL).astype(int).tolist()

    def supply(self) -> int:
        """What the receiver's sensor reads, kPa gauge × 10."""
        kPa = 0.8 * self._least_kPa if self.low_supply else self._rig.supply_kPa
        return int(min(max(round(kPa * 10.0), 0), NOT_SENSED - 1))
