"""Governed runs: many ticks of anything wanted, and what was sent in them."""

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
import pytest

from composer.limits.abilities import Abilities, abilities_of
from composer.limits.check import Check, check
from composer.rig.model import Rig
from player.governor import Governor, State, begin, govern, governor_of, tracks_of


@dataclass
class Run:
    """A run so far: the governor, its last state, and strain, rate, cause and share of air after every tick."""

    rig: Rig
    abilities: Abilities
    governor: Governor
    states: list[State]
    time_s: list[float]

    @property
    def state(self) -> State:
        return self.states[-1]

    @property
    def strain(self) -> np.ndarray:
        return np.array([s.strain for s in self.states])

    @property
    def cut(self) -> np.ndarray:
        return np.array([s.cut for s in self.states])

    def tick(self, wanted, dt_s: float = 0.005, silent=None) -> State:
        wanted = np.broadcast_to(np.asarray(wanted, dtype=float), (self.governor.fibers,))
        self.states.append(govern(self.governor, self.state, wanted, dt_s, silent))
        self.time_s.append(self.time_s[-1] + dt_s)
        return self.state

    def wait(self, seconds: float, wanted, dt_s: float = 0.005, silent=None) -> State:
        for _ in range(round(seconds / dt_s)):
            self.tick(wanted, dt_s, silent)
        return self.state

    def check(self) -> Check:
        rates = np.array([s.rate for s in self.states])
        return check(tracks_of(self.governor, np.array(self.time_s), self.strain, rates), self.rig, self.abilities)


@pytest.fixture(scope="session")
def run_of(make_rig) -> Callable[..., Run]:
    """A maker of runs from rest on a rig of `make_rig`; `table`: (strain, fill, exhaust, air_L) in place of constant rates."""

    def make(count: int = 1, *, longest_tick_s: float = 0.01, table: tuple | None = None, **options) -> Run:
        rig = make_rig(count, **options)
        abilities = abilities_of(rig)
        if table is not None:
            strain, fill, exhaust, air_L = (np.array(column, dtype=float)[None] for column in table)
            abilities = replace(abilities, strain=strain, fill=fill, exhaust=exhaust, air_L=air_L)
        governor = governor_of(rig, abilities, longest_tick_s)
        return Run(rig, abilities, governor, [begin(governor)], [0.0])

    return make
