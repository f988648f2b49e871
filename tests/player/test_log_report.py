"""A run's log in sentences."""

import pytest

from player.commands.log_report import sentences

RUN = {
    "title": "Estuary", "played": "estuary.score", "rig": "estuary.rig.toml", "targets": ["sim"],
    "date": "2026-01-01T00:00:00Z", "sound": True, "left_bytes": 0, "ended": "end", "why": "", "place": "2:1",
    "sets": 2, "duration_s": 1.0, "rate_Hz": 200.0,
    "senses": 0, "outputs": [], "lateness": [], "latest_ms": 0.0, "hits": [], "supply": [],
    "drift": {"fibers": ()}, "faults": [],
}  # fmt: skip


def told(**other):
    return list(sentences({**RUN, **other}))


def fault(place, kind="fault", code=5, of="main", say="the queue is full"):
    return {"place": place, "kind": kind, "code": code, "of": of, "say": say}


def test_what_came_again_and_again_is_one_line_with_its_first_place_and_its_last():
    said = told(faults=[fault("1:1"), fault("1:2", code=3, say="set while not armed"), fault("1:3"), fault("2:1")])
    assert said[-2:] == [
        "From 1:1 to 2:1, 3 times: fault 5, main: the queue is full",
        "At 1:2: fault 3, main: set while not armed",
    ]
    assert told(faults=[fault("1:1"), fault("1:1")])[-1] == "At 1:1, 2 times: fault 5, main: the queue is full"


def test_a_fiber_that_the_sentence_begins_with_is_not_named_twice():
    said = told(faults=[fault("1:1", "alarm", None, "r.1", "r.1 does not move though it should")])
    assert said[-1] == "At 1:1: alarm: r.1 does not move though it should"


@pytest.mark.parametrize(("ended", "free"), [("end", True), ("stopped", True), ("vented", True), ("fault", False)])
def test_a_run_that_a_fault_has_ended_is_not_said_to_be_without_faults(ended, free):
    assert ("No faults." in told(ended=ended, why="the clock has jumped")) == free


def test_a_log_that_breaks_off_says_so_after_its_last_hit():
    said = told(sound=False, ended="broken off", why="the log breaks off", place="after 1:2")
    assert said[1].startswith("The log breaks off after 1:2.") and said[2] == "Broken off after 1:2: the log breaks off."


def test_what_outputs_have_counted_is_told():
    counted = {"target": "serial:/dev/ttyACM0", "drivers": ["main"], "sets": 301, "dropped_at_board": 250, "skipped": 0}
    assert told(outputs=[counted])[3] == "serial:/dev/ttyACM0 (main): 301 sets, 250 sets dropped by the board's full queue."
