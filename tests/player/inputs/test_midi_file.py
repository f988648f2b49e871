import io

import mido
import pytest
from hypothesis import given
from hypothesis import strategies as st
from mido import Message, MetaMessage, MidiFile, MidiTrack

from composer.faults import Faults
from player.inputs.midi_file import Times, read_midi, write_midi


def saved(*tracks, division=480, form=1):
    out = io.BytesIO()
    MidiFile(type=form, ticks_per_beat=division, tracks=[MidiTrack(track) for track in tracks], charset="utf-8").save(file=out)
    return out.getvalue()


def test_what_mido_writes_is_read():
    conductor = [
        MetaMessage("time_signature", numerator=6, denominator=8),
        MetaMessage("set_tempo", tempo=400_000),
        MetaMessage("marker", text="Tür", time=960),
        MetaMessage("set_tempo", tempo=500_000, time=480),
    ]
    notes = [
        Message("note_on", note=60, time=5),
        Message("note_off", note=60, time=200),
        MetaMessage("cue_marker", text="b", time=1000),
    ]
    notes += [Message("sysex", data=(1, 2, 3)), Message("program_change", program=3, time=3), MetaMessage("lyrics", text="la")]
    assert read_midi(saved(conductor, notes), "f") == Times(
        480, ((0, 6, 8),), ((0, 400_000), (1440, 500_000)), ((960, "Tür"), (1205, "b"))
    )


def test_a_running_status_in_a_track_is_read():
    track = bytes.fromhex("00 90 3C 40 10 3C 00 83 00 FF 06 01 61 00 FF 2F 00")
    data = b"MThd" + bytes.fromhex("00000006 0000 0001 0060") + b"MTrk" + len(track).to_bytes(4, "big") + track
    assert read_midi(data, "f").markers == ((16 + 384, "a"),)


CHANGES = st.integers(0, 100_000)


@given(
    st.lists(
        st.tuples(CHANGES, st.integers(1, 64), st.sampled_from([1, 2, 4, 8, 16, 32, 64])),
        max_size=8,
        unique_by=lambda row: row[0],
    ),
    st.lists(st.tuples(CHANGES, st.integers(1, 0xFFFFFF)), max_size=8, unique_by=lambda row: row[0]),
    st.lists(
        st.tuples(CHANGES, st.text(st.characters(exclude_categories=["Cs"]), max_size=30)),
        max_size=8,
        unique_by=lambda row: row[0],
    ),
)
def test_what_is_written_is_read_back_and_mido_reads_it_too(meters, tempi, markers):
    times = Times(960, *(tuple(sorted(rows)) for rows in (meters, tempi, markers)))
    data = write_midi(times)
    assert read_midi(data, "f") == times
    at, found = 0, []
    for message in MidiFile(file=io.BytesIO(data), charset="utf-8").tracks[0]:
        at += message.time
        if message.type == "set_tempo":
            found.append((at, message.tempo))
    assert tuple(found) == times.tempi


GOOD = saved([MetaMessage("set_tempo", tempo=400_000), MetaMessage("marker", text="a", time=96)])


@pytest.mark.parametrize(
    ("data", "said"),
    [
        (b"", "this is no standard MIDI file"),
        (b"RIFF" + GOOD, "this is no standard MIDI file"),
        (b"MThd\0\0\0\6", "the header is cut short"),
        (GOOD[:8] + b"\0\2" + GOOD[10:], "format 2, whose tracks are pieces of their own; expected format 0 or 1"),
        (GOOD[:12] + b"\xe7\x28" + GOOD[14:], "the file counts time in frames of time code"),
        (GOOD[:12] + b"\0\0" + GOOD[14:], "0 ticks a note"),
        (GOOD[:14], "the file has no track"),
        (GOOD[:-3], "of which"),
        (GOOD[:22] + b"\xff\xff\xff\xff" + GOOD[26:], "at byte 22: a number of variable length without end"),
        (GOOD[:23] + b"\xf5" + GOOD[24:], "the byte F5"),
        (GOOD[:23] + b"\x40" + GOOD[24:], "data 40 without a status"),
        (GOOD[:25] + b"\x7f" + GOOD[26:], "has no room for"),
    ],
)
def test_what_is_no_midi_file_is_told_at_its_byte(data, said):
    with pytest.raises(Faults) as caught:
        read_midi(data, "song.mid")
    assert str(caught.value).startswith("song.mid: ")
    assert said in str(caught.value)


@given(st.binary(max_size=120), st.booleans())
def test_any_bytes_end_in_times_or_in_faults(data, track):
    data = GOOD[:14] + b"MTrk" + len(data).to_bytes(4, "big") + data if track else data
    try:
        read_midi(data, "f")
    except Faults as wrong:
        assert str(wrong).startswith("f: ")


@given(st.integers(0, len(GOOD) - 1), st.integers(0, 255))
def test_one_wrong_byte_ends_in_times_or_in_faults(at, byte):
    try:
        read_midi(GOOD[:at] + bytes([byte]) + GOOD[at + 1 :], "f")
    except Faults as wrong:
        assert str(wrong).startswith("f: ")


def test_mido_is_asked_for_nothing_that_it_does_not_know():
    assert {"set_tempo", "time_signature", "marker"} <= set(mido.midifiles.meta._META_SPEC_BY_TYPE)
