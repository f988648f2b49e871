import contextlib
import struct

import pytest
from hypothesis import given
from hypothesis import strategies as st
from pythonosc.osc_bundle_builder import OscBundleBuilder
from pythonosc.osc_message_builder import OscMessageBuilder
from pythonosc.osc_packet import OscPacket

from player.inputs.osc_packets import (
    DEEPEST,
    IMMEDIATELY,
    LARGEST,
    MOST_MESSAGES,
    OscMessage,
    Refused,
    read_packet,
    seconds_ahead,
    tag_of,
)


def built(address, *arguments):
    """A message as python-osc encodes it."""
    builder = OscMessageBuilder(address)
    for value in arguments:
        builder.add_arg(value)
    return builder.build().dgram


def bundle(tag, *elements):
    return b"#bundle\0" + struct.pack(">Q", tag) + b"".join(struct.pack(">i", len(one)) + one for one in elements)


def why(data):
    with pytest.raises(Refused) as caught:
        read_packet(data)
    return caught.value.why


def test_the_specification_s_own_messages_are_read_byte_for_byte(outside):
    table = outside["osc_1_0"]
    assert read_packet(bytes.fromhex(table["oscillator"])) == [OscMessage("/oscillator/4/frequency", "f", (440.0,))]
    (foo,) = read_packet(bytes.fromhex(table["foo"]))
    assert (foo.address, foo.types) == ("/foo", "iisff")
    assert foo.arguments[:3] == (1000, -1, "hello")
    assert foo.arguments[3:] == pytest.approx((1.234, 5.678), rel=1e-7)


def test_the_specification_s_strings_are_read(outside):
    table = outside["osc_1_0"]
    for word in ("OSC", "data"):
        packet = b"/a\0\0,s\0\0" + bytes.fromhex(table[f"string_{word}"])
        assert read_packet(packet)[0].arguments == (word,)


def test_the_tag_for_at_once_is_the_specification_s(outside):
    assert int(outside["osc_1_0"]["immediately"], 16) == IMMEDIATELY
    assert seconds_ahead(IMMEDIATELY, 1.7e9) == 0.0


ARGUMENTS = st.one_of(
    st.integers(-(2**31), 2**31 - 1),
    st.floats(width=32, allow_nan=False),
    st.text(st.characters(min_codepoint=32, max_codepoint=126), max_size=20),
    st.booleans(),
)


@given(st.lists(ARGUMENTS, max_size=8))
def test_what_python_osc_writes_is_read_back(arguments):
    (message,) = read_packet(built("/some/where", *arguments))
    assert list(message.arguments) == arguments


def test_bundles_keep_their_order_and_inner_tags():
    builder = OscBundleBuilder(1_700_000_000.5)
    builder.add_content(OscPacket(built("/a", 1)).messages[0].message)
    builder.add_content(OscPacket(built("/b", 2)).messages[0].message)
    data = bundle(IMMEDIATELY, built("/first"), builder.build().dgram, built("/last"))
    found = read_packet(data)
    assert [message.address for message in found] == ["/first", "/a", "/b", "/last"]
    assert found[0].tag == found[3].tag == IMMEDIATELY
    assert seconds_ahead(found[1].tag, 1_700_000_000.0) == pytest.approx(0.5, abs=1e-6)


@given(st.floats(0, 4e9))
def test_a_time_of_day_comes_back_from_its_tag(unix_s):
    now = max(0.0, unix_s - 10.0)
    if unix_s < 2**32 - 2_208_988_800:
        assert seconds_ahead(tag_of(unix_s), now) == pytest.approx(unix_s - now, abs=1e-5)


def test_a_tag_that_is_past_is_for_now():
    assert seconds_ahead(tag_of(1000.0), 2000.0) == 0.0


@pytest.mark.parametrize(
    ("data", "reason"),
    [
        (b"", "malformed"),
        (b"/a", "malformed"),
        (b"abc\0", "malformed"),
        (b"/abc", "malformed"),
        (b"/a\0\0,f\0\0", "malformed"),
        (b"/a\0\0,f\0\0\0\0", "malformed"),
        (b"/a\0\0f\0\0\0\0\0\0\0", "malformed"),
        (b"/a\0\0,\0\0\0\0\0\0\0", "malformed"),
        (b"/a\0x,\0\0\0", "malformed"),
        (b"/a\0\0,[i]\0\0\0\0\0\0\0\0", "malformed"),
        (b"/a\0\0,b\0\0\x7f\xff\xff\xff", "malformed"),
        (b"/a\0\0,b\0\0\xff\xff\xff\xff", "malformed"),
        (b"/\xff\0\0,\0\0\0", "malformed"),
        (b"#bundle\0\0\0\0\0", "malformed"),
        (bundle(1, b"/a\0\0")[:-1], "malformed"),
        (bundle(1) + b"\0\0\0\x7f", "malformed"),
        (bundle(1) + b"\xff\xff\xff\xff", "malformed"),
        (bundle(tag_of(2000.0), bundle(tag_of(1000.0), built("/a"))), "malformed"),
        (b"/" * (LARGEST + 4), "large"),
    ],
)
def test_what_is_no_packet_is_refused_whole(data, reason):
    assert why(data) == reason


def test_bundles_a_thousand_deep_are_refused_without_recursion():
    data = built("/a")
    for _ in range(300):
        data = bundle(1, data)
    assert why(data) == "deep"
    for _ in range(700):
        data = bundle(1, data)
    assert why(data) == "large"


def test_bundles_as_deep_as_allowed_are_read():
    data = built("/a")
    for _ in range(DEEPEST):
        data = bundle(1, data)
    assert len(read_packet(data)) == 1
    assert why(bundle(1, data)) == "deep"


def test_more_messages_than_allowed_in_a_packet_are_refused():
    one = b"/a\0\0"
    assert len(read_packet(bundle(1, *[one] * MOST_MESSAGES))) == MOST_MESSAGES
    assert why(bundle(1, *[one] * (MOST_MESSAGES + 1))) == "deep"


def test_a_bad_element_takes_the_whole_bundle_with_it():
    assert why(bundle(1, built("/a"), b"/b\0\0,f\0\0")) == "malformed"


@given(st.binary(max_size=200))
def test_any_bytes_end_in_messages_or_a_refusal(data):
    for packet in (data, b"#bundle\0" + data, b"/a\0\0," + data):
        with contextlib.suppress(Refused):
            assert all(message.address.startswith("/") for message in read_packet(packet))
