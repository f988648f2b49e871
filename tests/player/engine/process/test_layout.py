"""What a run shows in shared memory: whole moments, whatever the other side does."""

import threading

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from player.engine.process.layout import FIELDS, HEAD, LINES, NAME, Reader, Unreadable, Writer, size_of, text


def both(fibers=3, boards=2):
    buffer = bytearray(size_of(fibers, boards))
    return Writer(buffer, fibers, boards), Reader(buffer), buffer


def test_before_the_first_moment_a_reader_sees_that_there_is_none():
    _, reader, _ = both()
    assert reader.snapshot().count == 0


def test_what_is_shown_is_read_field_by_field():
    writer, reader, _ = both()
    writer.slot["state"], writer.slot["cue"] = 2, text("doors", NAME)
    writer.slot["wanted"], writer.slot["supply_kPa"] = [0.1, 0.2, 0.3], [600.0, np.nan]
    writer.slot["lines"] = [b""] * (LINES - 1) + [b"it plays"]
    writer.show()
    seen = reader.snapshot()
    assert (seen.count, seen.state, seen.text("cue")) == (1, "playing", "doors")
    assert seen.array("wanted").tolist() == [0.1, 0.2, 0.3] and seen.texts("lines")[-1] == "it plays"
    assert seen.array("supply_kPa")[0] == 600.0 and np.isnan(seen.array("supply_kPa")[1])


def test_a_snapshot_stays_as_it_is_when_the_run_goes_on():
    writer, reader, _ = both()
    writer.slot["position_s"] = 1.0
    writer.show()
    seen = reader.snapshot()
    for position in (2.0, 3.0, 4.0):
        writer.slot["position_s"] = position
        writer.show()
    assert seen.number("position_s") == 1.0 and reader.snapshot().number("position_s") == 4.0


def test_a_writer_that_dies_in_mid_write_leaves_the_moment_before_it_whole():
    writer, reader, buffer = both()
    writer.slot["position_s"] = 1.0
    writer.show()
    slot = (len(buffer) - HEAD.itemsize) // 2
    # The next moment goes into the first slot; it is written over in part, and never shown.
    buffer[HEAD.itemsize : HEAD.itemsize + slot // 2] = b"\xff" * (slot // 2)
    assert (reader.snapshot().count, reader.snapshot().number("position_s")) == (1, 1.0)


def test_no_snapshot_is_ever_half_of_one_moment_and_half_of_another():
    writer, reader, _ = both(fibers=2000)
    ends = threading.Event()

    def write():
        number = 0.0
        while not ends.is_set():
            number += 1.0
            for field in ("wanted", "allowed", "sent", "sensed"):
                writer.slot[field] = number
            writer.show()

    thread = threading.Thread(target=write)
    thread.start()
    seen, last = 0, -1
    while seen < 300:
        now = reader.snapshot()
        if now.count == last or now.count == 0:
            continue
        seen, last = seen + 1, now.count
        values = np.concatenate([now.array(field) for field in ("wanted", "allowed", "sent", "sensed")])
        assert np.all(values == values[0])
    ends.set()
    thread.join()


@given(st.text(max_size=60), st.integers(1, 40))
def test_a_text_is_cut_between_two_characters(value, most):
    cut = text(value, most)
    assert len(cut) <= most and value.encode(errors="replace").startswith(cut.decode().encode())


@pytest.mark.parametrize(
    "spoil",
    [
        lambda buffer: buffer[:10],
        lambda buffer: buffer[:-1],
        lambda buffer: b"other" + buffer[5:],
        lambda buffer: buffer[:8] + b"\x09" + buffer[9:],
        lambda buffer: buffer[:12] + b"\xff\xff\xff\xff" + buffer[16:],
    ],
    ids=["short", "cut", "other", "version", "endless"],
)
def test_memory_that_is_of_another_layout_is_refused(spoil):
    _, _, buffer = both()
    with pytest.raises(Unreadable):
        Reader(spoil(bytes(buffer)))


def test_every_field_says_what_it_is():
    assert all(about for *_, about in FIELDS) and len({name for name, *_ in FIELDS}) == len(FIELDS)
