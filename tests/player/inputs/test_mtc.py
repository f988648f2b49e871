import pytest
from hypothesis import given
from hypothesis import strategies as st

from player.inputs.events import Timing
from player.inputs.midi_stream import MidiStream
from player.inputs.mtc import COAST_S, CodeFollower
from player.inputs.timecode import RATES, Stamp, frames_of, stamp_of


def piece(number, stamp, code):
    """The data byte of a quarter frame."""
    part = (stamp.frames, stamp.seconds, stamp.minutes, stamp.hours | code << 5)[number // 2]
    return number << 4 | (part >> 4 if number % 2 else part & 15)


def run(follower, code, first, frames, from_s, wrong=lambda number: False, jitter=lambda: 0.0):
    """Quarter frames for so many frames from frame `first` on; the moment of the next."""
    rate = RATES[code]
    quarter_s = 1 / (4 * float(rate.per_s))
    for quarter in range(4 * frames):
        label = stamp_of(first + quarter // 8 * 2, rate)
        if not wrong(quarter):
            at_s = from_s + quarter * quarter_s + jitter()
            follower.hear(Timing("seq", at_s, "quarter_frame", piece(quarter % 8, label, code)))
    return from_s + 4 * frames * quarter_s


@pytest.mark.parametrize("code", range(4))
def test_the_place_is_that_of_the_code_at_every_rate(code):
    rate = RATES[code]
    first = frames_of(Stamp(1, 0, 59, 20), rate)
    follower = CodeFollower(start=Stamp(1, 0, 0, 0))
    end_s = run(follower, code, first, 40, 100.0)
    wanted = (first + 40 - frames_of(Stamp(1, 0, 0, 0), rate)) / float(rate.per_s)
    beat = follower.beat(end_s)
    assert beat.at(end_s) == pytest.approx(wanted, abs=1e-6)
    assert beat.rate == pytest.approx(1.0, rel=1e-9)
    assert [turn.kind for turn in follower.turns()] == ["run"]


def test_the_standard_s_bytes_spell_the_standard_s_label(outside):
    table = outside["midi_time_code"]
    follower, stream = CodeFollower(), MidiStream()
    for number, text in enumerate(table["quarter_frames_01_02_03_04_at_25"]):
        (message,) = stream.feed(bytes.fromhex(text))
        follower.hear(Timing("seq", number * 0.01, "quarter_frame", message.frame_type << 4 | message.frame_value))
    assert "01:02:03:04 at 25" in follower.turns()[0].say
    assert follower.beat(0.0).at(0.0) == pytest.approx(3723 + 4 / 25)


def test_a_full_frame_goes_to_a_place_and_stands_there():
    follower = CodeFollower()
    follower.hear(Timing("seq", 1.0, "full_frame", 0x21020304))
    assert (follower.state, follower.rate.name) == ("stopped", "25")
    assert follower.beat(5.0).at(9.0) == pytest.approx(3723 + 4 / 25)
    assert [(turn.kind, turn.place) for turn in follower.turns()] == [("locate", pytest.approx(3723.16))]


def test_jitter_of_a_millisecond_leaves_the_place_right_to_a_millisecond():
    import numpy as np

    rng = np.random.default_rng(5)
    follower = CodeFollower()
    end_s = run(follower, 1, 0, 50, 10.0, jitter=lambda: rng.uniform(-1e-3, 1e-3))
    assert follower.beat(end_s).at(end_s) == pytest.approx(2.0, abs=1e-3)


def test_a_quarter_frame_that_is_lost_changes_neither_place_nor_pace():
    follower = CodeFollower()
    end_s = run(follower, 1, 0, 40, 10.0, wrong=lambda quarter: quarter == 75)
    at_s = end_s - 0.7
    assert follower.beat(at_s).at(at_s) == pytest.approx(40 / 25 - 0.7, abs=1e-4)
    lost_s = run(follower, 1, 40, 1, end_s, wrong=lambda quarter: quarter == 2)
    assert follower.beat(lost_s).rate == pytest.approx(1.0, rel=1e-6)
    assert follower.state == "running"


def test_code_that_ends_is_coasted_on_and_then_held():
    follower = CodeFollower()
    end_s = run(follower, 1, 0, 20, 0.0)
    follower.tick(end_s + 0.2)
    assert follower.state == "coasting"
    assert follower.beat(end_s + 0.2).at(end_s + 0.2) == pytest.approx(1.0, abs=1e-6)
    follower.tick(end_s + COAST_S)
    held = follower.beat(end_s + 9.0)
    assert (follower.state, held.rate) == ("holding", 0.0)
    assert held.place == pytest.approx(0.8 - 0.01 + COAST_S, abs=1e-6)
    run(follower, 1, 100, 4, end_s + 10.0)
    assert follower.state == "running"
    assert [turn.kind for turn in follower.turns()] == ["run", "coast", "hold", "run"]


def test_code_that_runs_backwards_stands_and_is_told():
    follower = CodeFollower()
    end_s = run(follower, 1, 100, 20, 0.0)
    for quarter in range(32):
        label = stamp_of(118 - quarter // 8 * 2, RATES[1])
        follower.hear(Timing("seq", end_s + quarter * 0.01, "quarter_frame", piece(7 - quarter % 8, label, 1)))
    assert (follower.state, follower.beat(end_s + 1.0).rate) == ("wild", 0.0)
    assert [turn.kind for turn in follower.turns()] == ["run", "wild"]
    run(follower, 1, 100, 4, end_s + 1.0)
    assert follower.state == "running"


def test_a_jump_of_the_code_is_followed_and_told():
    follower = CodeFollower()
    end_s = run(follower, 0, 0, 20, 0.0)
    later_s = run(follower, 0, 2400, 20, end_s)
    assert follower.beat(later_s).at(later_s) == pytest.approx(2420 / 24, abs=1e-6)
    assert [turn.kind for turn in follower.turns()] == ["run", "locate"]


def test_labels_that_no_frame_has_change_nothing_and_are_counted():
    follower = CodeFollower()
    for number in range(16):
        follower.hear(Timing("seq", number * 0.01, "quarter_frame", number % 8 << 4 | 15))
    follower.hear(Timing("seq", 1.0, "full_frame", 0xFFFFFFFF))
    assert (follower.state, follower.invalid) == ("waiting", 3)


@given(st.lists(st.tuples(st.integers(0, 127), st.floats(-0.01, 0.6)), max_size=80))
def test_whatever_comes_the_place_never_runs_backwards_by_its_rate(heard):
    follower, now = CodeFollower(), 0.0
    for value, wait in heard:
        now += wait
        follower.hear(Timing("seq", now, "quarter_frame", value))
        follower.tick(now)
        beat = follower.beat(now)
        assert beat is None or beat.rate >= 0.0


@pytest.mark.parametrize("code", range(4))
def test_pieces_that_come_in_a_bunch_do_not_send_the_score_ahead_while_it_coasts(code):
    rate = RATES[code]
    first, follower = frames_of(Stamp(0, 0, 7, 0), rate), CodeFollower()
    at_s = run(follower, code, first, 40, 100.0)
    # The host stands still for 400 ms; what was sent meanwhile is heard in a moment, and then the source falls silent.
    quarter_s = 1 / (4 * float(rate.per_s))
    bunch = 8 * (int(0.4 / quarter_s) // 8)
    for quarter in range(bunch):
        label = stamp_of(first + 40 + quarter // 8 * 2, rate)
        when_s = at_s + bunch * quarter_s + 0.001 * quarter
        follower.hear(Timing("seq", when_s, "quarter_frame", piece(quarter % 8, label, code)))
    place = (first + 40) / float(rate.per_s) + bunch * quarter_s
    follower.tick(when_s + 0.2)
    follower.tick(when_s + 1.0)
    assert follower.state == "holding"
    assert follower.beat(when_s + 1.0).place == pytest.approx(place + COAST_S, abs=0.15)
