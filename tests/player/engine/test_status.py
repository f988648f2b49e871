"""Lateness and endings."""

import numpy as np
import pytest

from player.engine.account import Account
from player.engine.status import Lateness


def test_quantiles_of_lateness_are_right_to_within_a_class():
    lateness = Lateness()
    values = np.random.default_rng(5).lognormal(-8.0, 1.0, 5000)
    for value in values:
        lateness.count(float(value))
    for share in (0.5, 0.99, 0.999):
        assert lateness.quantile_s(share) == pytest.approx(np.quantile(values, share), rel=0.12)
    assert lateness.worst_s == values.max() and lateness.quantile_s(1.0) == values.max()


def test_no_quantile_is_above_the_worst():
    lateness = Lateness()
    lateness.count(0.00301)
    assert lateness.quantile_s(0.99) == 0.00301
    assert Lateness().quantile_s(0.5) == 0.0


def test_lateness_of_any_size_is_counted():
    lateness = Lateness()
    for late in (0.0, 1e-9, 1e9):
        lateness.count(late)
    assert lateness.classes.sum() == lateness.ticks == 3


def test_the_first_reason_for_an_end_stays_unless_a_graver_one_comes():
    account = Account()
    account.ends("stopped", "a", ending=False)
    account.ends("end", "b", ending=True)
    assert account.why == "a"
    account.ends("fault", "c", ending=True)
    account.ends("vented", "d", ending=True)
    assert (account.how, account.why) == ("fault", "c")


def test_a_flood_of_faults_is_bounded_and_counted():
    account = Account()
    for number in range(10_000):
        account.fault(0.0, "main", f"fault {number}")
        account.fault(0.0, "main", "again")
    ending = account.ending("idle", 0.0)
    assert len(ending.faults) == 200 and ending.more_faults == 20_000 - 200
    assert len(account.news()) == 200 and account.news() == ()


def test_a_run_with_a_fault_never_ends_with_zero():
    account = Account()
    account.ends("end", "over", ending=False)
    assert account.ending("idle", 0.0).exit_code == 0
    account.fault(0.0, "main", "sensor")
    assert account.ending("idle", 0.0).exit_code == 1
