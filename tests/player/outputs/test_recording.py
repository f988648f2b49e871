"""The format of a recording, and readers that believe nothing."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from composer.faults import Faults
from player.outputs.recording import END, REST, SET, VENT, frame, head, read

BOARDS = (("left", 3), ("right", 2))
HEAD = head(0x1234ABCD, 200.0, BOARDS, "bench.rig.toml")


def sets(count, seed=1):
    rng = np.random.default_rng(seed)
    return [(0.005 * n, rng.integers(0, 65536, 5).astype(np.uint16)) for n in range(count)]


ENDED = (frame(REST, 1.0), frame(END, 1.0))


def written(given, end=ENDED):
    return HEAD + b"".join(frame(SET, time, values) for time, values in given) + b"".join(end)


def test_a_recording_is_read_as_it_was_written():
    given = sets(7)
    found = read(written(given), "a.rec")
    assert (found.rig_path, found.fingerprint, found.rate_Hz, found.drivers) == ("bench.rig.toml", 0x1234ABCD, 200.0, BOARDS)
    assert np.allclose(found.time_s, [time for time, _ in given], atol=1e-9)
    assert np.array_equal(found.values, [values for _, values in given])
    assert found.complete and found.ended == "rest"


def test_a_vent_is_read_as_what_ended_it():
    assert read(written(sets(2), [frame(VENT, 1.0), frame(END, 1.0)]), "a.rec").ended == "vent"


def test_one_that_was_broken_off_is_played_up_to_there():
    whole = written(sets(7), [])
    found = read(whole[:-5], "a.rec")
    assert len(found.time_s) == 6 and not found.complete and found.ended == ""


def test_what_follows_a_damaged_frame_is_not_played():
    data = bytearray(written(sets(7)))
    data[len(HEAD) + 2 * 23 + 12] ^= 1
    assert len(read(bytes(data), "a.rec").time_s) == 2


def test_times_that_run_backwards_are_not_played():
    given = sets(3)
    assert len(read(written([given[1], given[0], given[2]]), "a.rec").time_s) == 1


@pytest.mark.parametrize(
    ("data", "says"),
    [
        (b"", "no recording"),
        (b"PK\x03\x04", "no recording"),
        (HEAD[:12], "head of this recording is damaged or cut off"),
        (HEAD[:-1] + b"\0", "head of this recording is damaged or cut off"),
        (HEAD[:8] + b"\x09\x00" + HEAD[10:], "version 9; expected version 1"),
        (HEAD, "not one whole set"),
        (HEAD + frame(END, 0.0), "not one whole set"),
    ],
)
def test_what_is_no_recording_is_refused_in_words(data, says):
    with pytest.raises(Faults, match=says):
        read(data, "a.rec")


@settings(max_examples=300, deadline=None)
@given(st.data())
def test_no_change_of_bytes_brings_more_than_faults_or_a_shorter_recording(data):
    whole = bytearray(written(sets(4)))
    for _ in range(data.draw(st.integers(1, 4))):
        whole[data.draw(st.integers(0, len(whole) - 1))] = data.draw(st.integers(0, 255))
    cut = data.draw(st.integers(0, len(whole)))
    try:
        found = read(bytes(whole[:cut]), "a.rec")
    except Faults:
        return
    assert len(found.time_s) <= 4 and np.all(np.diff(found.time_s) >= 0.0)


@settings(max_examples=200, deadline=None)
@given(st.binary(max_size=400))
def test_any_bytes_behind_the_magic_bring_faults_or_a_recording(tail):
    try:
        read(HEAD[:8] + tail, "a.rec")
    except Faults as wrong:
        assert len(wrong.faults) == 1
