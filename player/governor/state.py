"""Where a governed rig is: everything that one tick hands to the next, and what it has to say."""

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from composer.limits.live import Look, look
from player.governor.causes import NONE
from player.governor.governor import Governor

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True, eq=False)
class State:
    """The end of a tick, (F,) arrays unless said otherwise; nobody writes into them.

    strain: what was allowed, to be sent; rate: 1/s there; here: what the fibers can do there
    on: whether the coil was energised in the tick; since_on_s: seconds since it was last switched on
    spent_s: energised seconds that its duty has not given back yet; tired: it fills no more until some have been given back
    above_s: seconds that the present hold above half stroke has lasted; let_down: it comes up no more until wanted lower
    air_missing_L: what the receiver lacks, one number for all
    cut: int8, index into `CAUSES`: what kept the fiber from where it was wanted, 0 where it is there
    by: strain wanted less strain allowed
    air_share: the share of the air asked for in the tick that was there, 1 where all of it was
    """

    strain: Array
    rate: Array
    here: Look
    on: NDArray[np.bool_]
    since_on_s: Array
    spent_s: Array
    tired: NDArray[np.bool_]
    above_s: Array
    let_down: NDArray[np.bool_]
    air_missing_L: float
    cut: NDArray[np.int8]
    by: Array
    air_share: float


def begin(governor: Governor, strain: Array | None = None) -> State:
    """Standing still, at rest unless `strain` (F,) says where; coils recovered, receiver full."""
    count = governor.fibers
    at = np.zeros(count) if strain is None else np.clip(strain, 0.0, governor.stroke)
    return State(
        strain=at,
        rate=np.zeros(count),
        here=look(governor.live, at),
        on=governor.holding & (at > governor.least),
        since_on_s=np.full(count, np.inf),
        spent_s=np.zeros(count),
        tired=np.zeros(count, dtype=bool),
        above_s=np.zeros(count),
        let_down=np.zeros(count, dtype=bool),
        air_missing_L=0.0,
        cut=np.full(count, NONE, dtype=np.int8),
        by=np.zeros(count),
        air_share=1.0,
    )


def standing_at(governor: Governor, state: State, strain: Array) -> State:
    """The same rig found standing at `strain` (F,) after something else moved it, a vent for one; coils and air stay spent."""
    fresh = begin(governor, strain)
    above = np.where(fresh.strain > governor.half, state.above_s, 0.0)
    return replace(
        fresh,
        spent_s=state.spent_s,
        since_on_s=state.since_on_s,
        on=state.on & (fresh.strain > governor.least),
        tired=state.tired,
        above_s=above,
        let_down=state.let_down,
        air_missing_L=state.air_missing_L,
    )
