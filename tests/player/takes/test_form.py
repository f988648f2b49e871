"""Takes as bytes: whole, cut off anywhere, damaged, hostile."""

import json

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from composer.faults import Faults
from player.engine.framed import framed
from player.takes.form import HEAD, INPUT, MAGIC, SAMPLE, Recorder, read_take

NAMES = ("r.1", "r.2", "r.3")


def recorded(samples, ended=True):
    data = bytearray()
    recorder = Recorder(data.extend, NAMES, rig="bench.rig.toml", score="", fingerprint=7)
    for k, row in enumerate(samples):
        recorder.sample(0.005 * k, np.array(row) * 2.0, np.array(row))
    recorder.input(0.01, "fader box", "cc 21", 0.5)
    if ended:
        recorder.end()
    return bytes(data)


rows = st.lists(st.tuples(*[st.sampled_from([0.0, 0.0625, 0.125, 0.25])] * 3), min_size=1, max_size=30)


@given(rows)
def test_what_was_sampled_is_read_back_of_every_fiber(samples):
    take = read_take(recorded(samples), "a.take")
    for fiber in range(3):
        assert take.strain(take.governed, fiber).tolist() == [row[fiber] for row in samples]
        assert take.strain(take.wanted, fiber).tolist() == [2.0 * row[fiber] for row in samples]
    assert take.time_s == pytest.approx(0.005 * np.arange(len(samples)))
    assert take.inputs == ((0.01, "fader box", "cc 21", 0.5),)
    assert (take.fibers, take.rig, take.fingerprint, take.complete, take.left_bytes) == (NAMES, "bench.rig.toml", 7, True, 0)


def test_a_take_cut_off_at_any_byte_is_read_up_to_its_last_whole_sample():
    samples = [(0.01 * k, 0.0, 0.02 * (k // 2)) for k in range(12)]
    whole, read = recorded(samples), []
    for cut in range(len(whole)):
        try:
            take = read_take(whole[:cut], "a.take")
        except Faults as wrong:
            assert not read and ("no take" in str(wrong) or "not one whole sample" in str(wrong))
            continue
        assert take.strain(take.governed, 2) == pytest.approx([row[2] for row in samples[: len(take.time_s)]])
        assert not take.complete
        read.append(len(take.time_s))
    assert read == sorted(read) and set(read) == set(range(1, 13))


def test_a_sample_that_is_not_later_is_not_taken():
    recorder = Recorder(bytearray().extend, NAMES, fingerprint=7)
    zeros = np.zeros(3)
    assert [recorder.sample(t, zeros, zeros) for t in (0.5, 0.5, 0.4, 0.6)] == [True, False, False, True]


def test_fibers_that_stand_still_cost_the_same_however_many_they_are():
    sizes = []
    for count in (3, 3000):
        data = bytearray()
        recorder = Recorder(data.extend, tuple(f"r.{k}" for k in range(count)), fingerprint=7)
        start = len(data)
        for k in range(10):
            recorder.sample(0.005 * k, np.zeros(count), np.zeros(count))
        sizes.append(len(data) - start)
    assert sizes[0] == sizes[1]


def test_a_disk_that_is_full_stops_the_take_and_says_so():
    def full(data):
        raise OSError(28, "No space left on device")

    recorder = Recorder(full, NAMES, fingerprint=7)
    recorder.sample(0.0, np.zeros(3), np.zeros(3))
    assert recorder.broken == "No space left on device"


@settings(max_examples=200)
@given(st.data())
def test_a_take_with_a_changed_byte_is_read_up_to_there_or_refused_with_a_sentence(data):
    whole = bytearray(recorded([(0.01 * k, 0.0, 0.02) for k in range(8)]))
    at = data.draw(st.integers(0, len(whole) - 1))
    whole[at] ^= data.draw(st.integers(1, 255))
    try:
        take = read_take(bytes(whole), "a.take")
    except Faults as wrong:
        assert str(wrong).startswith("a.take: ")
        return
    assert take.strain(take.governed, 0) == pytest.approx(0.01 * np.arange(len(take.time_s)))


HEADS = framed(HEAD, 0, json.dumps({"fibers": NAMES, "fingerprint": 7}).encode())


@pytest.mark.parametrize(
    ("body", "says"),
    [
        (b"\x05\x00\x01\x00" + bytes(8), "fibers that are not there"),
        (b"\x00\x00\xff\xff" + bytes(8), "fibers that are not there"),
        (b"\x00\x00\x00\x00", "fibers that are not there"),
        (b"\x00", "cut short"),
        (b"\x00\x00\x01\x00" + np.array([0.0, np.nan], "<f4").tobytes(), "a strain"),
    ],
)
def test_a_sample_that_cannot_be_is_refused_with_what_is_wrong_in_it(body, says):
    with pytest.raises(Faults, match=says):
        read_take(MAGIC + HEADS + framed(SAMPLE, 0, body), "a.take")


@pytest.mark.parametrize(
    "records",
    [
        framed(SAMPLE, 0, b""),
        framed(HEAD, 0, b"[" * 100_000),
        framed(HEAD, 0, b'{"fibers": 3, "fingerprint": 1}'),
        framed(HEAD, 0, b'{"fibers": ["a"], "fingerprint": 1, "rig": 4}'),
        HEADS + HEADS,
        HEADS + framed(INPUT, 0, b'{"source": "a"}'),
        HEADS + framed(SAMPLE, 5, b"") + framed(SAMPLE, 5, b""),
        HEADS,
        HEADS + framed(SAMPLE, 1 << 60, b""),
    ],
)
def test_records_that_cannot_be_are_refused(records):
    with pytest.raises(Faults, match=r"a\.take: "):
        read_take(MAGIC + records, "a.take")
