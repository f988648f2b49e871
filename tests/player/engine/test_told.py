"""A log told afterwards: landings, distances, lateness, and logs that make no sense."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from player.engine.framed import framed
from player.engine.run_log import FULL, KINDS, MAGIC, RunLog, records
from player.engine.told import Senseless, apart, landings, lateness, told

RATE = 100.0
HEAD = {"fibers": ["a", "b"], "stroke": [0.3, 0.2], "rate_Hz": RATE, "lead_s": 0.0}


def run(off=0.0, sense_every=5, jump_at=None):
    """A run of 2 s in which both fibers go to half stroke at 1 s; the second is sensed `off` further than wanted."""
    data = bytearray()
    log = RunLog(data.extend)
    log.tell("head", 0.0, **HEAD)
    log.tell("hits", 0.0, hits=[[1_000_000, "2:1", [0, 1]]])
    for tick in range(200):
        at = tick / RATE
        position = at if jump_at is None or at < jump_at else at + 0.5
        share = min(0.5, 0.5 * position)
        wanted = np.full(2, round(share * FULL), dtype=np.uint16)
        # A set stands for the end of its tick.
        log.set(at, 10.0 + at - 1.0 / RATE, 0.0001 * (tick == 7), position, wanted, wanted)
        if tick % sense_every == 0:
            log.sense(at, 10.0 + at, np.array([0, 1]), np.array([share, share + off]))
    log.tell("end", 3.0, ended="end", exit=0)
    return told(records(bytes(data))[0])


def test_a_landing_is_off_by_what_was_sensed_less_what_was_wanted_worst_first():
    found = landings(run(off=-0.1))
    assert [(one.place, one.fiber) for one in found] == [("2:1", 1), ("2:1", 0)]
    assert found[0].error == pytest.approx(-0.1, abs=1e-4) and found[0].strain_error == pytest.approx(-0.02, abs=1e-4)
    assert found[1].error == pytest.approx(0.0, abs=1e-4)


def test_a_hit_that_a_jump_of_the_score_has_passed_over_is_no_landing():
    assert landings(run(jump_at=0.8)) == []


def test_a_hit_after_which_nothing_is_sensed_in_time_is_not_judged():
    assert landings(run(sense_every=199)) == []


def test_distances_are_told_fiber_by_fiber():
    signed, size, most = apart(run(off=0.05)).T
    assert signed == pytest.approx([0.0, 0.05], abs=1e-3) and size == pytest.approx([0.0, 0.05], abs=1e-3)
    assert most == pytest.approx([0.0, 0.05], abs=1e-3)


def test_every_tick_is_in_one_class_of_lateness():
    counts = dict(lateness(run()))
    assert sum(counts.values()) == 200 and counts[0.1] == 1 and counts[0.05] == 199


def at_the_end(ended, sensed_s=1.04):
    """A run of which the last move lands at its very end, at 1 s; it is sensed once, 0.1 too far."""
    data = bytearray()
    log = RunLog(data.extend)
    log.tell("head", 0.0, **HEAD)
    log.tell("hits", 0.0, hits=[[1_000_000, "2:1", [0, 1]]])
    for tick in range(101):
        wanted = np.full(2, round(0.5 * tick / RATE * FULL), dtype=np.uint16)
        log.set(tick / RATE, 10.0 + (tick - 1) / RATE, 0.0, tick / RATE, wanted, wanted)
    share = 0.5 * min(1.0, sensed_s)
    log.sense(1.05, 10.0 + sensed_s, np.array([0, 1]), np.array([share, share + 0.1]))
    log.tell("end", 1.1, ended=ended, exit=0)
    return told(records(bytes(data))[0])


def test_a_landing_at_the_last_instant_is_judged_by_what_is_sensed_just_after_the_end():
    worst, other = landings(at_the_end("end"))
    assert (worst.place, worst.fiber, worst.error) == ("2:1", 1, pytest.approx(0.1, abs=1e-4))
    assert other.error == pytest.approx(0.0, abs=1e-4)


def test_a_landing_at_the_last_instant_is_judged_by_the_tick_before_where_nothing_is_sensed_after_it():
    worst, other = landings(at_the_end("end", sensed_s=0.99))
    assert (worst.fiber, worst.error) == (1, pytest.approx(0.1, abs=1e-4))
    assert other.error == pytest.approx(0.0, abs=1e-4)
    assert landings(at_the_end("end", sensed_s=0.9)) == []


def test_after_a_vent_nothing_is_wanted_any_more():
    assert landings(at_the_end("vented")) == []


@pytest.mark.parametrize(
    "head", [{}, {**HEAD, "fibers": []}, {**HEAD, "stroke": [0.3]}, {**HEAD, "rate_Hz": 0}, {**HEAD, "stroke": [0.3, "x"]}]
)
def test_a_log_whose_head_does_not_say_what_was_played_is_refused(head):
    data = bytearray()
    RunLog(data.extend).tell("head", 0.0, **head)
    with pytest.raises(Senseless):
        told(records(bytes(data))[0])


@settings(max_examples=200, deadline=None)
@given(st.lists(st.tuples(st.sampled_from(sorted(KINDS)), st.binary(max_size=40)), max_size=6))
def test_whole_records_of_any_content_behind_a_head_are_told_without_harm(bodies):
    data = bytearray()
    RunLog(data.extend).tell("head", 0.0, **HEAD)
    data += b"".join(framed(kind, 5, body) for kind, body in bodies)
    found = told(records(bytes(data))[0])
    landings(found), apart(found), lateness(found)


def test_the_magic_alone_is_refused():
    with pytest.raises(Senseless):
        told(records(MAGIC)[0])
