"""From a solver's displacements, good to its tolerance, to times that keep every least duration and unmoved instants."""

import numpy as np
from numpy.typing import NDArray

from composer.retime.events import Events
from composer.retime.reach import pairs, simple_rows
from composer.retime.rows import PIN_ROW, Rows

Array = NDArray[np.float64]
Index = NDArray[np.int64]
Flags = NDArray[np.bool_]

STILL_S = 1e-9
"""A displacement below this is the solver's rounding: the event stays as written."""


def polish(events: Events, rows: Rows, shift_s: Array) -> Array:
    """Displacements (N,) that keep all rows between two events to the last digits, those below `STILL_S` exactly 0.

    A pass forward in time pushes what comes later, a pass backward from the pins what came before them; both move by no
    more than the solver's tolerance.
    """
    shift = np.where(np.abs(shift_s) < STILL_S, 0.0, shift_s)
    held = _held(rows, len(shift))
    later, earlier, least = pairs(rows, simple_rows(rows))
    by_place = np.append(events.place, -1)
    forward = np.argsort(by_place[later], kind="stable")
    backward = np.argsort(-by_place[earlier], kind="stable")
    for _ in range(4):
        if not _pass(shift, later, earlier, least, forward, held, push=True):
            break
        if not _pass(shift, later, earlier, least, backward, held, push=False):
            break
    return shift


def _held(rows: Rows, count: int) -> Flags:
    """The events that pins hold on the spot."""
    pins = np.flatnonzero((rows.kind == PIN_ROW) & (rows.least >= 0.0))
    part = rows.matrix[pins]
    up = np.zeros(count, dtype=bool)
    down = np.zeros(count, dtype=bool)
    up[part.indices[part.data > 0.0]] = True
    down[part.indices[part.data < 0.0]] = True
    return up & down


def _pass(shift: Array, later: Index, earlier: Index, least: Array, order: Index, held: Flags, *, push: bool) -> bool:
    """One pass over rows in order, mending each that is short; returns whether any was."""
    padded = np.append(shift, 0.0)
    lack = least - (padded[later] - padded[earlier])
    if not (lack > 1e-13).any():
        return False
    changed = False
    # What stands still cannot be short of another that does, so only rows round a moved event can be.
    touched = (padded[later] != 0.0) | (padded[earlier] != 0.0) | (lack > 1e-13)
    order = order[touched[order]]
    values = padded.tolist()
    for row in order.tolist():
        i, j = earlier[row], later[row]
        short = least[row] - (values[j] - values[i])
        if short > 1e-13:
            target = j if push else i
            if target >= 0 and not held[target]:
                values[target] += short if push else -short
                changed = True
    shift[:] = values[:-1]
    return changed
