import struct

import pytest
from hypothesis import given
from hypothesis import strategies as st

from player.wire import messages as m

LIMITS = {"u8": 0xFF, "u16": 0xFFFF, "u32": 0xFFFFFFFF}


def any_message(spec: m.Spec) -> st.SearchStrategy:
    fields = {field.name: st.integers(0, LIMITS[field.type]) for field in spec.fields if not field.counts}
    if spec.tail_type == "u16s":
        fields[spec.tail] = st.lists(st.integers(0, 0xFFFF), max_size=50).map(tuple)
    elif spec.tail_type == "text":
        fields[spec.tail] = st.text(st.characters(exclude_categories=["Cs"]), max_size=80)
    return st.builds(m.MADE[spec.made], **fields)


messages = st.one_of([any_message(spec) for spec in m.SPECS])


@given(messages, st.integers(0, 255))
def test_every_message_comes_back_from_its_bytes(message, seq):
    payload = m.encode(message, seq)
    assert m.decode(payload) == message
    assert payload[1] == seq


@given(st.binary(max_size=60))
def test_any_bytes_are_a_message_or_of_wrong_form(payload):
    try:
        message = m.decode(payload)
    except m.WrongForm:
        return
    if m.spec_of(message).tail_type != "text":
        assert m.encode(message, payload[1]) == payload


@pytest.mark.parametrize(
    ("message", "expected"),
    [
        (m.Hello(1), "01 07 01"),
        (m.Configure(48, 250, 0x1234ABCD), "02 07 30 00 fa 00 cd ab 34 12"),
        (m.Arm(m.ARM_KEY), "03 07 21 4d 52 41"),
        (m.Set(0x01020304, 2, (0, 0x8000, 0xFFFF)), "04 07 04 03 02 01 02 00 03 00 00 00 00 80 ff ff"),
        (m.Vent(), "05 07"),
        (m.Rest(1500), "06 07 dc 05"),
        (m.Ping(0xDEADBEEF), "07 07 ef be ad de"),
        (m.Board(1, 3, 48, 64, 1000, "né"), "81 07 01 03 30 00 40 00 e8 03 00 00 6e c3 a9"),
        (m.State(1, 2, 3, 4, 5, 0xFFFF), "82 07 01 00 00 00 02 03 00 04 00 00 00 05 00 00 00 ff ff"),
        (m.Sense(9, 1, (7,)), "83 07 09 00 00 00 01 00 01 00 07 00"),
        (m.Faulted(5, 0xFFFF, "no"), "84 07 05 ff ff 6e 6f"),
        (m.Pong(1, 2), "87 07 01 00 00 00 02 00 00 00"),
    ],
)
def test_a_message_is_little_endian_in_the_order_of_the_page(message, expected):
    assert m.encode(message, 7).hex(" ") == expected


def test_the_fixed_part_of_each_body_has_the_size_of_its_fields():
    for spec in m.SPECS:
        size = sum(m.SIZES[field.type][1] for field in spec.fields)
        tail = {"": [], "u16s": [()], "text": [""]}[spec.tail_type]
        empty = m.MADE[spec.made](*[0 for field in spec.fields if not field.counts], *tail)
        assert len(m.encode(empty, 0)) == 2 + size


def test_a_body_of_another_size_is_of_wrong_form():
    for spec in m.SPECS:
        size = sum(m.SIZES[field.type][1] for field in spec.fields)
        if size:
            with pytest.raises(m.WrongForm, match=f"{spec.name}: a body of {size - 1} bytes, expected {size}"):
                m.decode(bytes([spec.type, 0]) + bytes(size - 1))
        if not spec.tail:
            with pytest.raises(m.WrongForm, match=f"a body of {size + 1} bytes"):
                m.decode(bytes([spec.type, 0]) + bytes(size + 1))


@pytest.mark.parametrize("count", [0, 2, 0xFFFF])
def test_a_count_other_than_the_values_is_of_wrong_form(count):
    with pytest.raises(m.WrongForm, match=f"count is {count}, and 2 bytes of values follow"):
        m.decode(bytes([4, 0]) + struct.pack("<IHHH", 1, 0, count, 5))


def test_of_two_fields_the_one_that_does_not_fit_is_named_and_not_the_one_at_its_highest():
    with pytest.raises(m.WrongForm, match="set: value 1 is -1, expected"):
        m.encode(m.Set(0xFFFFFFFF, 0xFFFF, (65535, -1)), 1)


def test_a_value_that_does_not_fit_is_named_with_what_came():
    with pytest.raises(m.WrongForm, match="set: value 1 is 65536, expected a whole number, 0 to 65535"):
        m.encode(m.Set(1, 0, (0, 65536)), 1)
    with pytest.raises(m.WrongForm, match="rest: ramp_ms is -1, expected a whole number, 0 to 65535"):
        m.encode(m.Rest(-1), 1)


def test_a_set_fills_the_body_with_1020_values_and_no_more():
    full = m.encode(m.Set(1, 0, (1,) * m.VALUES_LIMIT), 1)
    assert m.VALUES_LIMIT == 1020
    assert len(full) - 2 == m.BODY_LIMIT
    with pytest.raises(m.WrongForm, match="a body of 2050 bytes, expected at most 2048"):
        m.encode(m.Set(1, 0, (1,) * (m.VALUES_LIMIT + 1)), 1)


def test_types_are_unique_and_those_of_the_device_have_the_high_bit():
    types = [spec.type for spec in m.SPECS]
    assert len(set(types)) == len(types)
    assert all((spec.type >= 0x80) == (spec.direction == "to host") for spec in m.SPECS)
