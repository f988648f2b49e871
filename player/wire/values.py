"""Drive units to the numbers on the wire, and back."""

import numpy as np
from numpy.typing import ArrayLike, NDArray

FULL = 65535
SHUT = 32768
"""A valve's opening of zero."""

DRIVES = ("pressure", "strain", "valve")
"""`pressure`: share of the type's max_pressure_kPa; `strain`: share of usable stroke; `valve`: signed opening, -1 to 1."""


class OutOfRange(ValueError):
    """Drive values that the wire cannot say; `indices` are their places."""

    def __init__(self, indices: NDArray[np.int64], values: NDArray[np.float64]):
        self.indices = indices
        place = int(indices[0])
        more = f", and {len(indices) - 1} more" if len(indices) > 1 else ""
        super().__init__(f"drive value {values[place]:.6g} at place {place}{more}; expected 0 to 1, or -1 to 1 for a valve")


def is_valve(drives: list[str] | tuple[str, ...]) -> NDArray[np.bool_]:
    """(F,) which of the drives take a signed opening."""
    return np.array([drive == "valve" for drive in drives], dtype=bool)


def to_wire(values: ArrayLike, valve: ArrayLike) -> NDArray[np.uint16]:
    """Numbers on the wire, nearest, of drive values (F,) that are signed openings where `valve` (F,) is true.

    0 to 1 is 0 to 65535. A valve's -1, 0, 1 are 0, 32768, 65535, straight lines between; the half below is one step longer.
    Raises OutOfRange where a value is outside its range or no number: a caller that wants clipping uses `clip` and hears of it.
    """
    given = np.asarray(values, dtype=np.float64)
    signed = np.broadcast_to(np.asarray(valve, dtype=bool), given.shape)
    inside = (given >= np.where(signed, -1.0, 0.0)) & (given <= 1.0)
    if not inside.all():
        raise OutOfRange(np.flatnonzero(~inside), given)
    above = np.where(signed, SHUT + given * (FULL - SHUT), given * FULL)
    counts = np.where(signed & (given < 0.0), SHUT + given * SHUT, above)
    return np.floor(counts + 0.5).astype(np.uint16)


def clip(values: ArrayLike, valve: ArrayLike) -> tuple[NDArray[np.float64], NDArray[np.bool_]]:
    """Drive values brought into their range, and where that changed them; what is no number goes to 0 (a valve's: shut)."""
    given = np.asarray(values, dtype=np.float64)
    signed = np.broadcast_to(np.asarray(valve, dtype=bool), given.shape)
    kept = np.clip(np.where(np.isnan(given), 0.0, given), np.where(signed, -1.0, 0.0), 1.0)
    return kept, kept != given


def from_wire(numbers: ArrayLike, valve: ArrayLike) -> NDArray[np.float64]:
    """Drive values of numbers on the wire; `to_wire` gives the same numbers again."""
    given = np.asarray(numbers, dtype=np.float64)
    signed = np.broadcast_to(np.asarray(valve, dtype=bool), given.shape)
    opening = (given - SHUT) / np.where(given < SHUT, SHUT, FULL - SHUT)
    return np.where(signed, opening, given / FULL)
