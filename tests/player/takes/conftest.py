"""Takes on the small rig, fitted and written."""

import numpy as np
import pytest

from composer.limits.abilities import abilities_of
from composer.score.tempo import TempoMap
from player.takes.settling import settle


@pytest.fixture(scope="session")
def even_tempo():
    """A tempo map of so many counts a minute, four in a bar."""

    def make(counts=60.0):
        one = np.ones(1)
        return TempoMap(0.0 * one, 0.0 * one, counts / 60.0 * one, 0.0 * one, 0.0 * one, 0.0 * one, 4.0 * one)

    return make


@pytest.fixture(scope="session")
def fitted(even_tempo):
    """What was played on a rig, shares of stroke (F, T) every `step_s`, fitted within `tolerance` of the stroke."""

    def fit(rig, share, step_s=0.005, tolerance=0.01, counts=60.0):
        abilities = abilities_of(rig)
        times = step_s * np.arange(np.shape(share)[1])
        strain = np.asarray(share) * abilities.stroke[:, None]
        return settle(times, lambda fiber: strain[fiber], rig, abilities, even_tempo(counts), tolerance)

    return fit
