"""What a fit found: one form for every kind, which report and picture read."""

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

CONFIDENCE = 0.95
"""Share of repeats in which the true values of all parameters at once lie in the intervals that are told."""


@dataclass(frozen=True, slots=True)
class Found:
    """One parameter: its value, its interval at CONFIDENCE, its unit, and whether the data tell it.

    why: what to say where they do not; held: they say nothing of it at all, and the value was not found but taken
    """

    key: str
    unit: str
    value: float
    low: float
    high: float
    told: bool
    why: str = ""
    held: bool = False


@dataclass(frozen=True, slots=True, eq=False)
class Fitted:
    """A fiber type fitted to a bench.

    values: every key that its table needs, in the order of the manual, as the rig file has them
    found: the parameters that were looked for; known: keys taken as given, and where from
    load_N: constant load on the bench, None where it was measured
    rows: of the file; used: rows that were fitted, fewer where the file is long
    time: (N,) s, pressure: (N,) Pa, measured, strain: (N,) of the fit, None for rated fibers without one; all of used rows
    noise: what is left between the fit and the data, as a standard deviation of strain, without outliers
    stroke: greatest strain measured; beside: pairs of keys that the data hardly tell apart, and their correlation
    notes: sentences that whoever pastes the table should read
    """

    name: str
    kind: str
    values: Mapping[str, Any]
    found: tuple[Found, ...]
    known: Mapping[str, str]
    load_N: float | None
    rows: int
    used: int
    time: Array
    pressure: Array
    measured: Array
    strain: Array
    noise: float
    stroke: float
    beside: tuple[tuple[str, str, float], ...]
    notes: tuple[str, ...]
