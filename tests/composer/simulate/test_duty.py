"""Coil duty as it runs."""

import numpy as np
import pytest

from composer.limits.coil import coils_of
from composer.simulate.duty import beyond_after, share_used


def run(rig, moving):
    """Allowance in use after each 0.1 s in which fibers move or not."""
    coils, beyond, seen = coils_of(rig), np.zeros(len(rig.fibers)), []
    for moves in moving:
        beyond = beyond_after(coils, beyond, np.full(len(beyond), 0.1), np.full(len(beyond), 0.1 + 0.01 * moves), 0.1)
        seen.append(share_used(coils, beyond)[0])
    return seen


def test_moving_uses_what_it_takes_beyond_the_duty_and_standing_still_gives_it_back(make_rig):
    seen = run(make_rig(1, duty=0.5, duty_burst_s=2.0), [1] * 20 + [0] * 40)
    assert seen[19] == pytest.approx(2.0 * 0.5 / 2.0)
    assert seen[39] == pytest.approx(0.0, abs=1e-9)
    assert min(seen) == 0.0


def test_a_coil_energised_while_holding_uses_its_allowance_as_if_it_moved(make_rig):
    holding = run(make_rig(1, duty=0.5, duty_burst_s=2.0, energised_while_holding=True), [0] * 10)
    assert holding[-1] == pytest.approx(0.25)


def test_a_duty_of_one_never_runs_out(make_rig):
    assert run(make_rig(1, duty=1.0), [1] * 50)[-1] == 0.0


def test_a_coil_without_burst_is_at_its_limit_as_soon_as_it_is_beyond(make_rig):
    assert run(make_rig(1, duty=0.5, duty_burst_s=0.0), [0, 1]) == [0.0, 1.0]
