"""Somebody at the faders: motions as hands make them, let through by the governor."""

import numpy as np

from composer.limits.abilities import Abilities
from composer.rig.model import Rig
from player.governor.governor import governor_of
from player.governor.state import begin
from player.governor.tick import govern

TICK_S = 0.005


def hand(seconds: float, seed: int, rest_s: float = 3.0, top: float = 1.0) -> np.ndarray:
    """A fader, 0 to 1, every tick: minimum-jerk moves of 0.3 to 2.5 s, rests between; odd seeds in MIDI's 127 steps."""
    rng = np.random.default_rng(seed)
    time = np.arange(round(seconds / TICK_S) + 1) * TICK_S
    value, was, at = np.zeros(len(time)), 0.0, 0.3
    while at < seconds - 3.0:
        lasts, goes = rng.uniform(0.3, 2.5), top * rng.uniform(0.0, 1.0)
        u = np.clip((time - at) / lasts, 0.0, 1.0)
        value = np.where(time >= at, was + (goes - was) * (10 * u**3 - 15 * u**4 + 6 * u**5), value)
        was, at = goes, at + lasts
        if rng.random() < 0.6:
            at += rng.uniform(0.1, rest_s)
    return np.round(value * 127) / 127 if seed % 2 else value


def governed(rig: Rig, abilities: Abilities, wanted: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Times (T,) and strains (F, T) that the governor lets through, `wanted` (F, T) in shares of stroke."""
    governor = governor_of(rig, abilities, TICK_S)
    state = begin(governor)
    let = np.zeros(wanted.shape)
    for k in range(1, wanted.shape[1]):
        state = govern(governor, state, wanted[:, k] * abilities.stroke, TICK_S)
        let[:, k] = state.strain
    return np.arange(wanted.shape[1]) * TICK_S, let
