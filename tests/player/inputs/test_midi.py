from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from mido import Message

from player.inputs.beat import Beat
from player.inputs.events import Ask, Back, Begin, End, HoldToRun, Silent, Timing, Wanted
from player.inputs.midi import PAIR_S, SENSING_S, MidiBinds
from player.inputs.midi_stream import MidiStream


def hear(binds, text, at_s=0.0, source="box"):
    """The events of bytes in hex."""
    return [event for message in MidiStream().feed(bytes.fromhex(text)) for event in binds.hear(source, message, at_s)]


def strokes(events):
    return [round(event.stroke, 6) for event in events if isinstance(event, Wanted)]


def bind(midi, rest='fibers = "r.1"'):
    return f"[[bind]]\nmidi = {{ {midi} }}\n{rest}\n"


@pytest.mark.parametrize(
    ("midi", "sent", "value"),
    [
        ("cc = 7", "B0077F", 1.0),
        ("cc = 7", "B00740", 64 / 127),
        ("note = 60", "903C40", 64 / 127),
        ("bend = true", "E07F7F", 1.0),
        ("bend = true", "E00040", 8192 / 16383),
        ("pressure = true", "D07F", 1.0),
        ("poly_pressure = 60", "A03C7F", 1.0),
    ],
)
def test_each_kind_of_control_runs_from_0_to_1(binds_of, midi, sent, value):
    assert strokes(hear(binds_of(bind(midi)), sent)) == [pytest.approx(value, abs=1e-6)]


def test_low_high_and_curve_shape_the_value(binds_of):
    binds = binds_of(bind("cc = 7", 'fibers = "r.*"\nlow = 0.2\nhigh = 0.6\ncurve = "gentle"\nhow = "adds"'))
    (event,) = hear(binds, "B00740", 3.0)
    assert event == Wanted("box", 3.0, (0, 1, 2, 3), 0.2 + 0.4 * (64 / 127) ** 2, "adds", 0)


def test_a_channel_and_a_port_are_heard_alone_where_they_are_named(binds_of):
    binds = binds_of(bind("cc = 7, channel = 2") + bind('cc = 7, port = "pads"') + bind("cc = 7"))
    assert [event.bind for event in hear(binds, "B0077F", source="faders")] == [2]
    assert [event.bind for event in hear(binds, "B1077F", source="faders")] == [0, 2]
    assert [event.bind for event in hear(binds, "B1077F", source="my pads 1")] == [0, 1, 2]


# 14 bits -----------------------------------------------------------------------------------------


@pytest.mark.parametrize("sent", ["B00340 B02301", "B02301 B00340"])
def test_coarse_and_fine_make_one_value_in_either_order(binds_of, outside, sent):
    assert outside["midi_1_0"]["fine_of_controller_0"] == 32
    assert strokes(hear(binds_of(bind("cc14 = 3")), sent))[-1] == pytest.approx((64 * 128 + 1) / 16383, abs=1e-6)


def test_a_coarse_part_alone_stands_for_fine_0(binds_of):
    binds = binds_of(bind("cc14 = 3"))
    hear(binds, "B00310 B02364", 0.0)
    hear(binds, "B00340", 1.0)
    assert binds.tick(1.0 + 0.9 * PAIR_S) == []
    assert strokes(binds.tick(1.0 + 1.1 * PAIR_S)) == [pytest.approx(64 * 128 / 16383, abs=1e-6)]
    assert binds.tick(2.0) == []


def test_a_fine_part_alone_moves_within_the_coarse_step(binds_of):
    binds = binds_of(bind("cc14 = 3"))
    hear(binds, "B00310 B02300", 0.0)
    assert strokes(hear(binds, "B0237F", 5.0)) == [pytest.approx((16 * 128 + 127) / 16383, abs=1e-6)]
    assert binds.tick(6.0) == []


# pickup ------------------------------------------------------------------------------------------


def test_a_control_with_pickup_does_nothing_until_it_passes_the_present_value(binds_of):
    binds = binds_of(bind("cc = 7", 'fibers = "r.1"\npickup = true'))
    binds.present = np.array([0.5, 0.0, 0.0, 0.0])
    assert hear(binds, "B0070A B00720 B0073C") == []
    assert strokes(hear(binds, "B00746")) == [pytest.approx(70 / 127, abs=1e-6)]
    assert len(hear(binds, "B00700")) == 1


def test_a_control_that_lies_at_the_present_value_is_taken_at_once(binds_of):
    binds = binds_of(bind("cc = 7", 'fibers = "r.1"\npickup = true'))
    assert strokes(hear(binds, "B00701")) == [pytest.approx(1 / 127, abs=1e-6)]


def test_a_present_value_out_of_reach_is_picked_up_at_the_end_next_to_it(binds_of):
    binds = binds_of(bind("cc = 7", 'fibers = "r.1"\nhigh = 0.4\npickup = true'))
    binds.present = np.full(4, 0.9)
    assert hear(binds, "B00750") == []
    assert strokes(hear(binds, "B0077F")) == [0.4]


@pytest.mark.parametrize("by", ["another control", "the caller"])
def test_pickup_is_asked_for_anew_once_something_else_moved_the_fibers(binds_of, by):
    binds = binds_of(bind("cc = 7", 'fibers = "r.1-2"\npickup = true') + bind("cc = 8", 'fibers = "r.2"'))
    assert len(hear(binds, "B00700")) == 1
    binds.present = np.array([0.0, 1.0, 0.0, 0.0])
    if by == "another control":
        hear(binds, "B0087F")
    else:
        binds.let_go((1,))
    assert hear(binds, "B00705") == []
    assert len(hear(binds, "B00750")) == 1


# phrases -----------------------------------------------------------------------------------------

FLICK = 'phrase = "flick"\non = "r.1-2"'


def test_a_note_begins_its_phrase_at_the_velocity_and_its_end_lets_it_go(binds_of):
    binds = binds_of(bind("note = 36", FLICK) + bind("note = 38", FLICK + '\nrelease = "rest"'))
    (begin,) = hear(binds, "902440", 1.0)
    assert (begin.phrase, begin.fibers, begin.scale, begin.at_s) == ("flick", (0, 1), 64 / 127, 1.0)
    assert hear(binds, "802440", 2.0) == [End("box", 2.0, begin.key, (0, 1), False)]
    (other,) = hear(binds, "902640", 3.0)
    assert hear(binds, "902600", 4.0) == [End("box", 4.0, other.key, (0, 1), True)]


def test_a_quantised_phrase_begins_on_the_next_part_of_the_running_tempo(binds_of):
    binds = binds_of(bind("note = 36", FLICK + '\nquantise = "1/2"'))
    binds.beat = Beat(10.0, 5.0, 2.0)
    assert hear(binds, "902440", 5.1)[0].at_s == pytest.approx(5.25)
    assert hear(binds, "902440", 5.25)[1].at_s == pytest.approx(5.25)
    binds.beat = None
    assert hear(binds, "902440", 5.3)[1].at_s == 5.3


def test_a_note_struck_twice_lets_the_first_go_without_a_rest(binds_of):
    binds = binds_of(bind("note = 36", FLICK + '\nrelease = "rest"'))
    (first,) = hear(binds, "902440", 1.0)
    ended, second = hear(binds, "902440", 2.0)
    assert ended == End("box", 2.0, first.key, (0, 1), False)
    assert second.key != first.key
    assert hear(binds, "802440", 3.0) == [End("box", 3.0, second.key, (0, 1), True)]
    assert hear(binds, "802440", 4.0) == []


@pytest.mark.parametrize("stop", ["B07B00", "B07800", "B07E01", "FF"])
def test_stuck_notes_are_let_go_by_all_notes_off_and_by_a_reset(binds_of, outside, stop):
    assert outside["midi_1_0"]["all_notes_off"] == 0x7B
    binds = binds_of(bind("note = 36", FLICK) + bind("note = 40"))
    (begin, *_) = hear(binds, "902440 90287F", 1.0)
    ended = hear(binds, stop, 2.0)
    assert End("box", 2.0, begin.key, (0, 1), False) in ended
    assert strokes(ended) == [0.0]
    assert hear(binds, stop, 3.0) == []


def test_all_notes_off_is_for_its_own_channel(binds_of):
    binds = binds_of(bind("note = 36", FLICK))
    hear(binds, "902440")
    assert hear(binds, "B17B00") == []


def test_a_pedal_presses_at_half_way_and_only_once(binds_of):
    binds = binds_of(bind("cc = 64", 'does = "next_cue"'))
    assert hear(binds, "B0403F") == []
    assert hear(binds, "B04040 B04050 B0407F", 1.0) == [Ask("box", 1.0, "next_cue")]
    assert hear(binds, "B04000 B04040", 2.0) == [Ask("box", 2.0, "next_cue")]


def test_hold_to_run_tells_down_and_up(binds_of):
    binds = binds_of(bind("cc = 64", 'does = "hold_to_run"'))
    assert hear(binds, "B0407F", 1.0) == [HoldToRun("box", 1.0, True)]
    assert hear(binds, "B04000", 2.0) == [HoldToRun("box", 2.0, False)]
    assert hear(binds, "B0407F", 3.0) == [HoldToRun("box", 3.0, True)]
    assert hear(binds, "B07900", 4.0) == [HoldToRun("box", 4.0, False)]


# silence -----------------------------------------------------------------------------------------


def test_a_lost_port_lets_go_of_all_that_it_held_and_names_the_fibers_that_it_drove(binds_of):
    binds = binds_of(bind("cc = 7", 'fibers = "r.3"') + bind("note = 36", FLICK) + bind("cc = 64", 'does = "hold_to_run"'))
    begin = hear(binds, "B0077F 902440 B0407F", 1.0)[1]
    events = binds.lost("box", 2.0, "its port is gone")
    assert HoldToRun("box", 2.0, False) in events
    assert End("box", 2.0, begin.key, (0, 1), False) in events
    assert events[-1] == Silent("box", 2.0, (0, 1, 2), "box: its port is gone")
    assert binds.lost("box", 3.0, "again") == []
    assert hear(binds, "B00700", 4.0)[0] == Back("box", 4.0)


def test_a_source_that_sent_active_sensing_is_gone_when_it_stops(binds_of, outside):
    binds = binds_of(bind("cc = 7"))
    hear(binds, "B0077F FE", 1.0)
    assert outside["midi_1_0"]["active_sensing_ms"] / 1000 < SENSING_S
    assert binds.tick(1.0 + outside["midi_1_0"]["active_sensing_ms"] / 1000) == []
    (silent,) = binds.tick(1.0 + SENSING_S + 0.01)
    assert silent.fibers == (0,)
    assert binds.tick(9.0) == []
    assert hear(binds, "FE", 10.0) == [Back("box", 10.0)]


def test_a_source_without_sensing_may_lie_still_for_ever_unless_the_map_says_otherwise(binds_of):
    still, watched = binds_of(bind("cc = 7")), binds_of(bind("cc = 7"), silence_s=2.0)
    hear(still, "B0077F", 0.0)
    hear(watched, "B0077F", 0.0)
    assert still.tick(3600.0) == []
    assert watched.tick(2.0) == []
    assert watched.tick(2.1) == [Silent("box", 2.1, (0,), "box: nothing came for 2.1 s")]


def test_one_controller_falling_silent_leaves_another_alone(binds_of):
    binds = binds_of(bind("cc = 7") + bind("cc = 8", 'fibers = "r.2"'))
    hear(binds, "B0077F", 0.0, "one")
    hear(binds, "B0087F", 0.0, "two")
    assert [event.fibers for event in binds.lost("one", 1.0, "gone")] == [(0,)]
    assert strokes(hear(binds, "B00800", 2.0, "two")) == [0.0]


def test_fibers_that_another_controller_has_taken_over_stay_with_it(binds_of):
    binds = binds_of(bind("cc = 7", 'fibers = "r.1-3"') + bind("cc = 8", 'fibers = "r.2"'))
    hear(binds, "B0077F", 0.0, "one")
    hear(binds, "B0087F", 1.0, "two")
    binds.let_go((2,))
    assert [event.fibers for event in binds.lost("one", 2.0, "gone")] == [(0,)]


# clocks ------------------------------------------------------------------------------------------


def test_messages_of_time_are_handed_on(binds_of, outside):
    table = outside["midi_time_code"]
    events = hear(binds_of(""), "F8 FA FB FC F21000 F104" + table["full_frame_01_02_03_04_at_25"], 1.0)
    assert [(event.what, event.value) for event in events] == [
        ("clock", 0),
        ("start", 0),
        ("continue", 0),
        ("stop", 0),
        ("songpos", 16),
        ("quarter_frame", 0x04),
        ("full_frame", 0x21020304),
    ]
    assert all(isinstance(event, Timing) for event in events)


# floods ------------------------------------------------------------------------------------------

KEYS = st.builds(
    lambda kind, n, v: Message(kind, note=n, velocity=v),
    st.sampled_from(["note_on", "note_off"]),
    st.integers(34, 40),
    st.integers(0, 127),
)
CONTROLS = st.builds(lambda n, v: Message("control_change", control=n, value=v), st.integers(0, 127), st.integers(0, 127))
OTHERS = st.sampled_from([Message("reset"), Message("active_sensing"), Message("clock"), Message("pitchwheel", pitch=-5)])


@given(st.lists(st.tuples(st.one_of(KEYS, CONTROLS, OTHERS), st.floats(0.0, 1.0)), max_size=60))
def test_whatever_is_played_every_phrase_that_began_ends_once_and_strokes_stay_in_range(map_of, played):
    text = (
        bind("note = 36", FLICK)
        + bind("note = 37")
        + bind("cc = 64", FLICK + '\nrelease = "rest"')
        + bind("cc14 = 1")
        + bind("bend = true")
    )
    binds, now, events = MidiBinds(map_of(text), 4), 0.0, []
    for message, wait in played:
        now += wait
        events += binds.hear("box", message, now) + binds.tick(now)
    events += binds.lost("box", now, "gone")
    begun = [event.key for event in events if isinstance(event, Begin)]
    assert len(set(begun)) == len(begun)
    assert sorted(event.key for event in events if isinstance(event, End)) == sorted(begun)
    assert all(0.0 <= event.stroke <= 1.0 for event in events if isinstance(event, Wanted))


def test_what_is_remembered_does_not_grow_with_what_is_sent(binds_of):
    binds = binds_of(bind("note = 36", FLICK) + bind("cc14 = 1"))
    for number in range(5000):
        binds.hear("box", Message("note_on", note=36, velocity=1 + number % 127, channel=number % 16), 0.0)
        binds.hear("box", Message("control_change", control=1, value=number % 128, channel=number % 16), 0.0)
    port = binds._ports["box"]
    assert len(port.held) == len(port.pressed) == len(port.fine) == 16


def test_steps_of_a_beat_are_exact_thirds_too():
    assert Beat(0.0, 0.0, 1.0).next_s(0.4, Fraction(1, 3)) == pytest.approx(2 / 3)
