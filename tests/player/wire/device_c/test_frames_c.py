"""CRC and stuffing in C, against values from outside and against the ones in Python."""

from random import Random

import pytest

from player.wire.frames import crc16, frame, stuff, unstuff


def op(number, data):
    return bytes((number,)) + len(data).to_bytes(2, "little") + data


def crc_in_c(driver, data):
    return int.from_bytes(driver(op(4, data))[1:], "little")


def unstuffed_in_c(driver, data):
    back = driver(op(5, data))
    size = int.from_bytes(back[1:5], "little", signed=True)
    return None if size < 0 else back[5:]


def framed_in_c(driver, payload):
    back = driver(op(6, payload))
    return back[3:]


def test_the_crc_gives_the_catalogued_values(driver, outside):
    for data, crc in outside["crc_16_ibm_3740"].items():
        if data != "source":
            assert crc_in_c(driver, bytes.fromhex(data)) == crc


def test_it_unstuffs_the_papers_example(driver, outside):
    stuffed, plain = (bytes.fromhex(outside["cobs"][f"figure_3_{which}"]) for which in ("stuffed", "input"))
    assert unstuffed_in_c(driver, stuffed) == plain


def test_it_stuffs_the_papers_examples(driver, outside):
    """A frame has its CRC between data and delimiter: what comes before the last code is the paper's."""
    plain = bytes.fromhex(outside["cobs"]["figure_3_input"])
    stuffed = bytes.fromhex(outside["cobs"]["figure_3_stuffed"])
    sent = framed_in_c(driver, plain)
    assert unstuff(sent[:-1])[:-2] == plain
    # The paper's last block, "@" 0x06 "O7", grows by the two bytes of the CRC, neither of which is 0 here.
    assert sent[: len(stuffed) - 5] == stuffed[:-5]
    assert sent[len(stuffed) - 5] == stuffed[-5] + 2
    ones = framed_in_c(driver, b"\1" * outside["cobs"]["figure_2_ones"] + b"\0")
    codes = outside["cobs"]["figure_2_codes"]
    assert [ones[0], ones[255], ones[510]] == codes


@pytest.mark.parametrize("length", [2, 3, 252, 253, 254, 255, 256, 506, 507, 508, 509, 760, 2048, 2050])
def test_a_frame_is_the_same_whatever_its_length(driver, length):
    chance = Random(length)
    for payload in (bytes(length), b"\xff" * length, chance.randbytes(length), bytes(range(256)) * 9):
        assert framed_in_c(driver, payload[:length]) == frame(payload[:length])


def test_unstuffing_is_the_same_as_in_python_whatever_the_bytes(driver):
    chance = Random(4)
    many = [chance.randbytes(chance.randrange(12)) for _ in range(1500)]
    many += [bytes(chance.randrange(1, 5) for _ in range(chance.randrange(20))) for _ in range(1500)]
    many += [stuff(bytes(chance.choice((0, 1, 255)) for _ in range(chance.randrange(700)))) for _ in range(300)]
    back = driver(b"".join(op(5, data) for data in many))
    expected = b""
    for data in many:
        try:
            plain = unstuff(data)
            expected += b"U" + len(plain).to_bytes(4, "little") + plain
        except ValueError:
            expected += b"U" + (-1).to_bytes(4, "little", signed=True)
    assert back == expected


def test_the_crc_is_the_same_as_in_python_whatever_the_bytes(driver):
    chance = Random(5)
    many = [chance.randbytes(chance.randrange(300)) for _ in range(1000)]
    back = driver(b"".join(op(4, data) for data in many))
    assert back == b"".join(b"R" + crc16(data).to_bytes(2, "little") for data in many)
