"""Work on several cores: the same results in the same order, whatever becomes of the processes beside."""

import os
import signal
import threading

import numpy as np
import pytest

from composer.limits.abilities import abilities_of
from player.takes import settling
from player.takes.cores import Cores
from player.takes.fitting import one_by_one

from .hands import governed, hand


def squared(number):
    return number * number


def who(number):
    return os.getpid()


def lost(home):
    if os.getpid() != home:
        os.kill(os.getpid(), signal.SIGKILL)
    return home


def fails(number):
    raise ValueError(f"{number} is wrong")


@pytest.mark.parametrize("cores", [1, 2, 3])
def test_results_come_in_the_order_of_their_items_however_many_cores_there_are(cores):
    told = []
    with Cores(cores) as each:
        assert each(squared, list(range(20)), told.append) == [number * number for number in range(20)]
    assert told[-1] == 20 and told == sorted(told)


def test_several_processes_take_part_and_are_gone_afterwards():
    with Cores(2) as each:
        # This process waits at its item until another has done one.
        begun = set()
        while len(begun) < 2:
            begun |= set(each(who, list(range(4)), lambda done: None))
        (other,) = begun - {os.getpid()}
    with pytest.raises(ProcessLookupError):
        os.kill(other, 0)


def test_a_process_that_is_lost_leaves_no_item_undone():
    with Cores(2) as each:
        home = os.getpid()
        assert each(lost, [home] * 200, lambda done: None) == [home] * 200


def test_what_goes_wrong_beside_is_raised_here():
    with Cores(2) as each, pytest.raises(ValueError, match="is wrong"):
        each(fails, [1, 2, 3], lambda done: None)


def test_where_threads_run_and_hold_locks_the_processes_beside_work_all_the_same():
    lock, ends = threading.Lock(), threading.Event()

    def hold():
        with lock:
            ends.wait()

    thread = threading.Thread(target=hold)
    thread.start()
    try:
        with Cores(2) as each:
            assert each(squared, [1, 2, 3], lambda done: None) == [1, 4, 9]
    finally:
        ends.set()
        thread.join()


def test_a_take_fitted_on_several_cores_is_the_same_as_on_one(make_rig, even_tempo, monkeypatch):
    monkeypatch.setattr(settling, "SPREAD", 0)
    monkeypatch.setattr("player.takes.fitting.BATCH", 1)
    rig = make_rig(4, fill=0.6, exhaust=0.25)
    abilities = abilities_of(rig)
    times, let = governed(rig, abilities, np.array([hand(10.0, seed) for seed in range(4)]))

    def fit(each, tell=lambda share: None):
        return settling.settle(times, lambda f: let[f], rig, abilities, even_tempo(), 0.01, each=each, tell=tell)

    alone, told = fit(one_by_one), []
    with Cores(2) as each:
        spread = fit(each, told.append)
    for one, other in zip(alone.paths, spread.paths, strict=True):
        assert one.place.tolist() == other.place.tolist() and one.share.tolist() == other.share.tolist()
        assert one.shape.tolist() == other.shape.tolist()
    assert alone.worst.tolist() == spread.worst.tolist()
    assert told == sorted(told) and told[-1] == 1.0
