"""Bending fibers: a thread sewn along one side of a contractile or extensile fiber keeps that side's length."""

import math
from dataclasses import dataclass

from composer.fiber.make import Make
from composer.keys import Key

KEYS = (Key("constraint_length_mm", "number", "how much of the fiber is held", unit="mm", low=0.1, high=1e5),)


@dataclass(frozen=True, slots=True, kw_only=True)
class Bending:
    """The make of the fiber itself and the length in mm that the thread holds."""

    base: Make
    constraint_length_mm: float

    def turn_deg(self) -> float:
        """Degrees of bend for a strain of 1: the thread at distance r keeps its length, so theta = Lc e / r."""
        return math.degrees(self.constraint_length_mm / self.base.radius_mm)

    def stop(self) -> float:
        """Strain at which it has bent by one full turn, or its base stops."""
        return min(self.base.shape().stop, 360.0 / self.turn_deg())

    def problems(self) -> list[tuple[str, str, str]]:
        """What cannot be about this make, as (key, found, expected)."""
        return [*self.base.problems(), *held_problems(self.base, self.constraint_length_mm)]


def held_problems(base: Make, constraint_length_mm: float) -> list[tuple[str, str, str]]:
    """A thread longer than the fiber that it holds, as (key, found, expected); empty where it fits."""
    if constraint_length_mm <= base.rest_length_mm:
        return []
    found = f"a thread holds {constraint_length_mm:g} mm of a fiber of {base.rest_length_mm:g} mm"
    return [("constraint_length_mm", found, f"at most {base.rest_length_mm:g} mm")]
