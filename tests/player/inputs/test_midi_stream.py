import mido
import pytest
from hypothesis import given
from hypothesis import strategies as st
from mido import Message

from player.inputs.midi_stream import LONGEST_SYSEX, MidiStream


@pytest.mark.parametrize(
    ("name", "data", "kind"),
    [
        ("note_off", [60, 1], "note_off"),
        ("note_on", [60, 1], "note_on"),
        ("poly_pressure", [60, 1], "polytouch"),
        ("control_change", [7, 1], "control_change"),
        ("program_change", [5], "program_change"),
        ("channel_pressure", [5], "aftertouch"),
        ("pitch_bend", [0, 64], "pitchwheel"),
        ("clock", [], "clock"),
        ("start", [], "start"),
        ("continue", [], "continue"),
        ("stop", [], "stop"),
        ("active_sensing", [], "active_sensing"),
        ("reset", [], "reset"),
    ],
)
def test_status_bytes_mean_what_the_standard_says(outside, name, data, kind):
    (message,) = MidiStream().feed(bytes([outside["midi_1_0"][name], *data]))
    assert message.type == kind


def test_the_wheel_and_the_song_position_have_their_low_byte_first(outside, bytes_of):
    table = outside["midi_1_0"]
    pitches = [bytes_of(table[f"bend_{at}"])[0].pitch for at in ("lowest", "centre", "highest")]
    assert pitches == [-8192, 0, 8191]
    assert bytes_of(table["song_position_one_bar"])[0].pos == 16


def test_a_status_holds_for_the_data_that_follow(bytes_of):
    assert [(m.control, m.value) for m in bytes_of("B0 07 01 07 02 0A 03")] == [(7, 1), (7, 2), (10, 3)]


def test_real_time_bytes_may_stand_within_a_message_and_leave_it_whole(bytes_of):
    assert [m.type for m in bytes_of("90 F8 3C FE 40 F8 3E 41")] == [
        "clock", "active_sensing", "note_on", "clock", "note_on",
    ]  # fmt: skip


def test_system_messages_end_the_running_status():
    stream = MidiStream()
    assert [m.type for m in stream.feed(bytes.fromhex("90 3C 40 F2 10 00 3C 40"))] == ["note_on", "songpos"]
    assert stream.refused["stray"] == 2


def test_what_is_cut_short_or_undefined_is_counted_and_nothing_else_is_lost():
    stream = MidiStream()
    found = stream.feed(bytes.fromhex("3C 40 90 3C 80 3C 00 F4 F5 F0 01 02 90 3C 40 F7"))
    assert [m.type for m in found] == ["note_off", "note_on"]
    assert stream.refused == {"stray": 2, "broken": 2, "undefined": 2, "long": 0}


def test_a_flood_of_system_exclusive_takes_no_memory():
    stream = MidiStream()
    stream.feed(b"\xf0")
    for _ in range(100):
        assert stream.feed(bytes(10_000)) == []
    assert len(stream._data) == LONGEST_SYSEX
    assert [m.type for m in stream.feed(b"\xf7\xf8")] == ["clock"]
    assert stream.refused["long"] == 1


@given(st.binary(max_size=200), st.integers(1, 7))
def test_pieces_of_any_size_make_the_same_messages(data, size):
    whole, pieces = MidiStream(), MidiStream()
    found = [m for at in range(0, len(data), size) for m in pieces.feed(data[at : at + size])]
    assert found == whole.feed(data)
    assert pieces.refused == whole.refused


CHANNEL = st.one_of(
    st.builds(
        lambda c, n, v: Message("note_on", channel=c, note=n, velocity=v), *[st.integers(0, 15), *[st.integers(0, 127)] * 2]
    ),
    st.builds(
        lambda c, n, v: Message("control_change", channel=c, control=n, value=v),
        st.integers(0, 15),
        st.integers(0, 127),
        st.integers(0, 127),
    ),
    st.builds(lambda c, p: Message("pitchwheel", channel=c, pitch=p), st.integers(0, 15), st.integers(-8192, 8191)),
    st.builds(lambda p: Message("songpos", pos=p), st.integers(0, 16383)),
    st.builds(lambda t, v: Message("quarter_frame", frame_type=t, frame_value=v), st.integers(0, 7), st.integers(0, 15)),
    st.just(Message("clock")),
)


@given(st.lists(CHANNEL, max_size=30))
def test_what_mido_writes_is_read_back(sent):
    data = b"".join(bytes(message.bytes()) for message in sent)
    assert MidiStream().feed(data) == sent


@given(st.binary(max_size=300))
def test_it_reads_what_mido_s_own_parser_reads_of_messages_with_their_status(data):
    """mido keeps no running status, so only streams whose every message has one are alike."""
    plain = [b for m in mido.parse_all(data) if m.type != "sysex" for b in m.bytes()]
    assert [m for m in MidiStream().feed(bytes(plain)) if m.type != "sysex"] == mido.parse_all(plain)
