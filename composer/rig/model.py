"""What a rig is, as read: nothing here knows of files."""

from dataclasses import dataclass
from typing import Any

from composer.fiber.mounting import Mounting, Supply, Valve


@dataclass(frozen=True, slots=True)
class FiberType:
    """A named make of fiber; `make` is the dataclass of its kind."""

    name: str
    kind: str
    make: Any
    line: int

    @property
    def max_pressure_kPa(self) -> float | None:
        """The gauge pressure that it must never exceed, None where its table says none; of a held fiber, its base's."""
        return getattr(getattr(self.make, "base", self.make), "max_pressure_kPa", None)


@dataclass(frozen=True, slots=True)
class Driver:
    """A board of valves on a serial line of its own."""

    name: str
    channels: int


@dataclass(frozen=True, slots=True)
class Fiber:
    """One fiber where it hangs: places in metres, `mirror` the index of its partner, `max_hold_s` 0 for no limit."""

    name: str
    type: FiberType
    mounting: Mounting
    driver: str
    channel: int
    at_m: tuple[float, float, float]
    toward: tuple[float, float, float]
    mirror: int | None
    max_hold_s: float
    line: int


@dataclass(frozen=True, slots=True)
class Rig:
    """A rig: fibers in the file's order, groups as indices into them in that order.

    file: the path it was read from; worn: on a person's body
    fingerprint: CRC-32 of the canonical form, which comments, order and spelling of numbers do not change
    """

    name: str
    file: str
    worn: bool
    supply: Supply
    fiber_types: dict[str, FiberType]
    valve_types: dict[str, Valve]
    drivers: tuple[Driver, ...]
    fibers: tuple[Fiber, ...]
    groups: dict[str, tuple[int, ...]]
    fingerprint: int
