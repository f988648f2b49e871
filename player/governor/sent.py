"""What a governor has sent, as tracks: for the check, for takes, for pictures."""

import numpy as np
from numpy.typing import NDArray

from composer.tracks import HOLD, MOVE, Tracks
from player.governor.governor import Governor

Array = NDArray[np.float64]

SLIVER_S = 1e-6
"""A stretch of a tick shorter than this is one with the rest of its tick."""


def tracks_of(governor: Governor, time_s: Array, strain: Array, rate: Array) -> Tracks:
    """Tracks of what was sent: straight lines between ticks; with a limit of acceleration, speed changed at the limit first.

    time_s: (T,) ends of ticks, the first at 0 s where it began; strain, rate: (T, F) the states' at those instants. A fiber
    that stands where it was through a tick holds there, and ticks of one hold are one; one that comes to a stand within a
    tick moves until its end, as its coil is energised until then.
    """
    braced = np.zeros(governor.fibers, dtype=bool)
    braced[governor.braced] = True
    knots, curves, manners, first = [], [], [], [0]
    for fiber in range(governor.fibers):
        if braced[fiber]:
            time, curve, moves = _bent(time_s, strain[:, fiber], rate[:, fiber], float(governor.accel[fiber]))
        else:
            time, curve, moves = _straight(time_s, strain[:, fiber])
        manner = np.where(moves, MOVE, HOLD).astype(np.int8)
        keep = np.ones(len(time), dtype=bool)
        keep[1:] = (manner[1:] != HOLD) | (manner[:-1] != HOLD)
        knots.append(time[keep])
        curves.append(curve[keep])
        manners.append(manner[keep])
        first.append(first[-1] + int(keep.sum()))
    count = first[-1]
    return Tracks(
        first=np.array(first),
        time_s=np.concatenate(knots) if knots else np.empty(0),
        curve=np.concatenate(curves) if curves else np.empty((0, 6)),
        manner=np.concatenate(manners) if manners else np.empty(0, dtype=np.int8),
        shape=np.full(count, -1, dtype=np.int8),
        line=np.zeros(count, dtype=np.int32),
        phrase_line=np.zeros(count, dtype=np.int32),
        duration_s=float(time_s[-1]),
    )


def _straight(time_s: Array, strain: Array) -> tuple[Array, Array, NDArray[np.bool_]]:
    """Knots and curves of straight lines between ticks and which of them move, a hold without end after the last."""
    curve = np.zeros((len(time_s), 6))
    curve[:, 0] = strain
    curve[:-1, 1] = np.diff(strain)
    return time_s, curve, curve[:, 1] != 0.0


def _bent(time_s: Array, strain: Array, rate: Array, accel: float) -> tuple[Array, Array, NDArray[np.bool_]]:
    """The same of ticks in which the speed is changed first and kept then."""
    lasts, change = np.diff(time_s), np.diff(rate)
    bends = np.minimum(np.abs(change) / accel, lasts)
    bends[bends < SLIVER_S] = 0.0
    two = (bends > 0.0) & (lasts - bends >= SLIVER_S)
    bent = 0.5 * change * bends
    turned = strain[:-1] + rate[:-1] * bends + bent
    whole = np.zeros((len(lasts), 6))
    whole[:, 0], whole[:, 1] = strain[:-1], np.diff(strain)
    once = (bends > 0.0) & ~two
    whole[once, 1] -= bent[once]
    whole[once, 2] = bent[once]
    whole[two, 1] = (rate[:-1] * bends)[two]
    whole[two, 2] = bent[two]
    rest = np.zeros((len(lasts), 6))
    rest[:, 0], rest[:, 1] = turned, strain[1:] - turned
    time = np.concatenate([np.column_stack([time_s[:-1], time_s[:-1] + bends]).ravel(), time_s[-1:]])
    curve = np.concatenate([np.stack([whole, rest], axis=1).reshape(-1, 6), np.zeros((1, 6))])
    curve[-1, 0] = strain[-1]
    moves = np.append(np.repeat((np.diff(strain) != 0.0) | (rate[:-1] != 0.0), 2), False)
    keep = np.concatenate([np.column_stack([np.ones(len(lasts), dtype=bool), two]).ravel(), [True]])
    return time[keep], curve[keep], moves[keep]
