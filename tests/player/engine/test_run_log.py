"""The log of a run, whole and cut off."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from player.engine.framed import framed
from player.engine.run_log import KINDS, MAGIC, RunLog, records
from player.wire.line import set_bytes


def logged():
    data = bytearray()
    log = RunLog(data.extend)
    log.tell("head", 1.0, played="a.score", kind="score")
    values = np.array([0, 65535, 32768], dtype=np.uint16)
    log.set(1.5, 1.56, 0.0012, 0.25, values, values[::-1])
    log.set(1.5, 1.5, 99.0, 0.25, values)
    log.sense(1.6, 1.59, np.array([0, 7]), np.array([0.1, 0.3]))
    log.sense(1.7, 1.69, np.array([0, 7]), np.array([0.2, 0.4]))
    log.supply(1.8, 1, 612.34)
    log.tell("end", 2.0, ended="end")
    return bytes(data)


def test_all_that_was_logged_is_read():
    found, left = records(logged())
    assert left == 0
    assert [one.kind for one in found] == ["head", "set", "sent", "layout", "sense", "sense", "supply", "end"]
    head, sent, blind, layout, one, other, supply, end = found
    assert head.told == {"played": "a.score", "kind": "score"} and end.told == {"ended": "end"}
    assert (sent.time_s, sent.due_s, sent.late_s, sent.position_s) == pytest.approx((1.5, 1.56, 0.0012, 0.25))
    assert sent.values.tolist() == [0, 65535, 32768] and sent.wanted.tolist() == [32768, 65535, 0]
    assert blind.values.tolist() == [0, 65535, 32768] and blind.wanted is None and blind.late_s == pytest.approx(16.777215)
    assert layout.told == {"layout": 0, "fibers": [0, 7]} and one.number == other.number == 0
    assert one.values / 65535 == pytest.approx([0.1, 0.3], abs=1e-5) and one.due_s == pytest.approx(1.59)
    assert (supply.number, supply.kPa) == (1, 612.3)


@pytest.mark.parametrize("fibers", [1, 12, 48, 250, 1000])
def test_a_set_and_a_sense_take_at_most_twice_what_they_take_on_the_wire(fibers):
    data = bytearray()
    log = RunLog(data.extend)
    values = np.zeros(fibers, dtype=np.uint16)
    log.sense(1.0, 1.0, np.arange(fibers), np.zeros(fibers))
    data.clear()
    log.set(1.0, 1.1, 0.0, 0.0, values, values)
    assert len(data) <= 2 * set_bytes(fibers)
    data.clear()
    log.sense(1.0, 1.0, np.arange(fibers), np.zeros(fibers))
    assert len(data) <= 2 * set_bytes(fibers)


def test_a_log_cut_off_at_any_byte_is_read_up_to_its_last_whole_record():
    whole = logged()
    ends = [len(whole) - records(whole[:cut])[1] for cut in range(len(MAGIC), len(whole))]
    counts = [len(records(whole[:cut])[0]) for cut in range(len(MAGIC), len(whole))]
    assert counts == sorted(counts) and counts[0] == 0 and counts[-1] == 7
    assert max(ends) == len(whole)


def test_a_damaged_record_ends_what_is_read():
    data = bytearray(logged())
    data[len(MAGIC) + 20] ^= 0xFF
    found, left = records(bytes(data))
    assert found == [] and left == len(data) - len(MAGIC)


def test_a_file_that_is_no_log_is_refused():
    with pytest.raises(ValueError, match="no run log"):
        records(b"drawclog\x09\x00")


@settings(max_examples=300, deadline=None)
@given(st.binary(max_size=300))
def test_any_bytes_behind_the_magic_are_read_without_harm(tail):
    found, left = records(MAGIC + tail)
    assert found == [] and left == len(tail)


@settings(max_examples=300, deadline=None)
@given(st.sampled_from(sorted(KINDS)), st.binary(max_size=60))
def test_whole_records_that_make_no_sense_are_read_without_harm(kind, body):
    data = MAGIC + framed(kind, 5, body)
    found, left = records(data)
    assert len(found) == (left == 0)


def test_a_full_disk_silences_the_log_and_says_so():
    def write(data):
        raise OSError(28, "No space left on device")

    log = RunLog(write)
    log.tell("head", 0.0)
    assert log.broken == "No space left on device"


def test_a_run_goes_on_without_its_log_and_ends_with_a_fault(make_engine, make_rig, make_tracks, kept):
    room = [3000]

    def write(data):
        room[0] -= len(data)
        if room[0] < 0:
            raise OSError(28, "No space left on device")

    output = kept()
    engine = make_engine(make_rig(4), make_tracks(4, [(0.0, 1.0, 0.3), (1.0, 3.0, 0.0)]), [output])
    engine.keep_log(RunLog(write))
    for _ in engine.run():
        pass
    assert engine.ending.how == "end" and len(output.sets) == 601
    assert "No space left" in engine.ending.faults[0].say and engine.ending.exit_code == 1
