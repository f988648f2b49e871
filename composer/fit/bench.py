"""What a bench measured, and what its file says beside: nothing here knows of files."""

from collections.abc import Mapping
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from composer.faults import Where

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Said:
    """A value that stands in the head of a bench file, and where."""

    value: Any
    where: Where


@dataclass(frozen=True, slots=True, eq=False)
class Bench:
    """N rows of a bench in SI.

    time: (N,) s, rising; pressure: (N,) Pa gauge; strain: (N,) positive in the fiber's own direction
    force: (N,) N along the axis against the motion, None where it was not measured
    said: what the head says, by key; ignored: columns that mean nothing here
    line: (N,) the line of each row
    """

    file: str
    time: Array
    pressure: Array
    strain: Array
    force: Array | None
    said: Mapping[str, Said]
    ignored: tuple[str, ...]
    line: NDArray[np.int64]

    @property
    def rows(self) -> int:
        """How many rows there are."""
        return len(self.time)


def thinned(bench: Bench, most: int) -> Bench:
    """The bench with at most so many rows: means of equal numbers of rows, those left over at the end dropped."""
    each = -(-bench.rows // most)
    if each <= 1:
        return bench
    whole = bench.rows // each * each

    def means(values: Array) -> Array:
        return values[:whole].reshape(-1, each).mean(axis=1)

    return replace(
        bench,
        time=means(bench.time),
        pressure=means(bench.pressure),
        strain=means(bench.strain),
        force=None if bench.force is None else means(bench.force),
        line=bench.line[:whole:each],
    )
