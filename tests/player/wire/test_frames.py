import pytest
from hypothesis import given
from hypothesis import strategies as st

from player.wire.frames import (
    ENCODED_LIMIT,
    PAYLOAD_LIMIT,
    FrameReader,
    crc16,
    frame,
    frame_length,
    stuff,
    stuffed_length,
    unstuff,
)

payloads = st.binary(min_size=2, max_size=600)


def test_the_crc_has_the_published_values(outside):
    published = {data: crc for data, crc in outside["crc_16_ibm_3740"].items() if data != "source"}
    assert {data: crc16(bytes.fromhex(data)) for data in published} == published


@given(st.binary(max_size=200))
def test_the_crc_is_the_division_by_its_polynomial_bit_by_bit(data):
    register = 0xFFFF
    for byte in data:
        for bit in range(7, -1, -1):
            carry = (register >> 15) ^ (byte >> bit & 1)
            register = (register << 1 & 0xFFFF) ^ (0x1021 if carry else 0)
    assert crc16(data) == register


def test_stuffing_gives_the_figures_of_the_paper(outside):
    cobs = outside["cobs"]
    plain, stuffed = bytes.fromhex(cobs["figure_3_input"]), bytes.fromhex(cobs["figure_3_stuffed"])
    assert stuff(plain) == stuffed
    assert unstuff(stuffed) == plain
    ones = b"\x01" * cobs["figure_2_ones"]
    long = b"".join(bytes([code]) + b"\x01" * (code - 1) for code in cobs["figure_2_codes"])
    assert stuff(ones) == long
    assert unstuff(long) == ones


@given(st.one_of(st.binary(max_size=1200), st.lists(st.sampled_from([0, 1, 255]), max_size=800).map(bytes)))
def test_stuffed_bytes_have_no_zero_and_come_back(data):
    stuffed = stuff(data)
    assert 0 not in stuffed
    assert len(stuffed) <= stuffed_length(len(data))
    assert unstuff(stuffed) == data


@pytest.mark.parametrize("full", [254, 508])
def test_a_last_block_that_is_full_may_or_may_not_be_followed_by_a_code(full):
    data = b"\x05" * full
    assert stuff(data).endswith(b"\x05\x01")
    assert unstuff(stuff(data)) == unstuff(stuff(data)[:-1]) == data


@given(st.binary(max_size=300))
def test_any_bytes_unstuff_or_raise_a_value_error(data):
    try:
        plain = unstuff(data)
    except ValueError:
        return
    assert len(plain) < len(data)


@given(st.lists(payloads, max_size=8), st.lists(st.integers(1, 97), min_size=1), st.binary(max_size=40))
def test_frames_come_through_in_pieces_of_any_size_after_any_garbage(sent, sizes, garbage):
    stream = garbage + b"\0" + b"".join(map(frame, sent))
    reader, got, at, turn = FrameReader(), [], 0, 0
    while at < len(stream):
        size = sizes[turn % len(sizes)]
        got += reader.feed(stream[at : at + size])
        at, turn = at + size, turn + 1
    assert got[len(got) - len(sent) :] == sent
    assert len(got) - len(sent) + reader.bad == sum(1 for part in garbage.split(b"\0") if part)


@given(payloads, st.data())
def test_a_frame_with_one_byte_changed_is_dropped_and_counted_and_the_next_one_read(payload, data):
    good = frame(payload)
    at = data.draw(st.integers(0, len(good) - 2))
    other = data.draw(st.integers(1, 255).filter(lambda byte: byte != good[at]))
    reader = FrameReader()
    got = reader.feed(good[:at] + bytes([other]) + good[at + 1 :] + good)
    assert got == [payload]
    assert reader.bad == 1


@given(payloads, st.data())
def test_a_frame_cut_anywhere_costs_itself_and_no_other(payload, data):
    good = frame(payload)
    cut = data.draw(st.integers(1, len(good) - 2))
    reader = FrameReader()
    assert reader.feed(good[:cut] + b"\0" + good) == [payload]
    assert reader.bad == 1


def test_the_longest_frame_passes_and_a_longer_one_is_dropped():
    longest = b"\x04" * PAYLOAD_LIMIT
    reader = FrameReader()
    assert reader.feed(frame(longest)) == [longest]
    assert reader.feed(frame(longest + b"\x04")) == []
    assert reader.bad == 1
    assert len(frame(longest)) - 1 <= ENCODED_LIMIT


def test_an_endless_frame_is_counted_once_and_takes_no_memory():
    reader = FrameReader()
    for _ in range(1000):
        assert reader.feed(b"\x33" * 5000) == []
        assert len(reader._kept) <= ENCODED_LIMIT
    assert reader.feed(b"\0" + frame(b"ok")) == [b"ok"]
    assert reader.bad == 1


def test_zeros_between_frames_are_no_bad_frames():
    reader = FrameReader()
    assert reader.feed(b"\0\0\0" + frame(b"ab") + b"\0\0") == [b"ab"]
    assert reader.bad == 0


@given(st.binary(max_size=2048))
def test_a_frame_is_never_longer_than_its_length_says(body):
    assert len(frame(b"\x04\x01" + body)) <= frame_length(len(body))


def test_the_rest_of_a_frame_in_whose_midst_listening_began_is_dropped_uncounted_and_the_next_is_read():
    whole = frame(b"\x01\x02\x03")
    for cut in range(1, len(whole)):
        reader = FrameReader()
        reader.begin_amid()
        assert reader.feed(whole[cut:] + whole) == [b"\x01\x02\x03"] and reader.bad == 0
        assert reader.feed(whole[1:]) == [] and reader.bad == 1
