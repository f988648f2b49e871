import pytest
from hypothesis import given
from hypothesis import strategies as st

from player.inputs.beat import Beat
from player.inputs.events import Timing
from player.inputs.midi_clock import ClockFollower
from player.inputs.send_clock import MOST_MESSAGES, ClockSender


def types(sent):
    return [message.type for _, message in sent]


def test_the_beginning_is_a_start_and_ticks_come_24_a_count():
    sent = ClockSender().until(Beat(0.0, 5.0, 2.0), 5.0, 6.0)
    assert types(sent) == ["start"] + ["clock"] * 48
    assert [at for at, _ in sent[1:]] == pytest.approx([5.0 + n / 48 for n in range(48)])


def test_elsewhere_a_song_position_comes_first_and_its_tick_is_on_the_sixteenth():
    sent = ClockSender().until(Beat(3.9, 0.0, 1.0), 0.0, 0.2)
    assert types(sent)[:2] == ["songpos", "continue"]
    assert sent[0][1].pos == 16
    assert sent[2][0] == pytest.approx(0.1)


def test_a_pause_stops_once_and_a_jump_stops_and_goes_elsewhere():
    sender = ClockSender()
    sender.until(Beat(0.0, 0.0, 2.0), 0.0, 0.1)
    assert types(sender.until(Beat(0.2, 0.1, 0.0), 0.1, 0.2)) == ["stop"]
    assert sender.until(None, 0.2, 0.3) == []
    sender.until(Beat(0.25, 0.3, 2.0), 0.3, 0.4)
    assert types(sender.until(Beat(8.0, 0.4, 2.0), 0.4, 0.41))[:3] == ["stop", "songpos", "continue"]


@given(st.floats(0.1, 8.0), st.floats(0.001, 0.2))
def test_ticks_are_the_same_however_the_time_is_cut(rate, dt):
    beat, whole, pieces = Beat(0.0, 0.0, rate), ClockSender(), ClockSender()
    sent, now = [], 0.0
    for _ in range(20):
        sent += pieces.until(beat, now, now + dt)
        now += dt
    assert types(sent) == types(whole.until(beat, 0.0, now))


def test_a_follower_of_what_is_sent_is_where_the_sender_is():
    sender, follower, now = ClockSender(), ClockFollower(), 0.0
    while now < 6.0:
        rate = 2.0 if now < 3.0 else 2.2
        beat = Beat(2.0 * now if now < 3.0 else 6.0 + 2.2 * (now - 3.0), now, rate)
        for at_s, message in sender.until(beat, now, now + 0.005):
            follower.hear(Timing("us", at_s, message.type, getattr(message, "pos", 0)))
        now += 0.005
    assert follower.beat(now).at(now) == pytest.approx(6.0 + 2.2 * (now - 3.0), abs=0.01)


def test_one_call_sends_no_more_than_so_many_and_the_next_goes_on():
    sender, beat = ClockSender(), Beat(0.0, 0.0, 16.0)
    first = sender.until(beat, 0.0, 60.0)
    assert len(first) == MOST_MESSAGES
    assert types(sender.until(beat, 2.6, 2.61))[0] in ("clock", "stop")


def test_a_place_beyond_the_last_song_position_sends_nothing():
    assert ClockSender().until(Beat(5000.0, 0.0, 2.0), 0.0, 1.0) == []
