import socket

import pytest

from composer.faults import Faults
from player.inputs.osc_packets import LARGEST
from player.inputs.osc_port import HOST, PORT, OscPort, is_loopback, read_address


@pytest.mark.parametrize(
    ("written", "address"),
    [
        ("9001", (HOST, 9001)),
        ("0.0.0.0:9001", ("0.0.0.0", 9001)),
        ("desk", ("desk", PORT)),
        (":7", (HOST, 7)),
        ("[::1]:7", ("::1", 7)),
    ],
)
def test_an_address_is_on_loopback_unless_it_names_a_host(written, address):
    assert read_address(written) == address


@pytest.mark.parametrize("written", ["desk:", "desk:0", "desk:65536", "desk:x", "desk:999999999999"])
def test_a_port_that_is_none_is_told(written):
    with pytest.raises(Faults, match="has no port from 1 to 65535"):
        read_address(written)


def test_loopback_is_told_from_the_rest():
    assert [is_loopback(host) for host in ("127.0.0.1", "::1", "localhost", "0.0.0.0", "192.168.1.4", "desk")] == [True] * 3 + [
        False
    ] * 3


def test_packets_come_in_as_they_were_sent_and_go_out():
    port, other = OscPort(HOST, 0), OscPort(HOST, 0)
    try:
        for data in (b"/a\0\0", bytes(LARGEST + 1), b"/b\0\0"):
            port.send(data, *other.address)
        came = []
        while len(came) < 3:
            other.poll(came.append)
        assert [len(data) for data in came] == [4, LARGEST + 1, 4]
        assert other.poll(came.append) == 0
    finally:
        port.close()
        other.close()


def test_an_address_that_is_taken_is_told_in_a_sentence():
    with socket.socket(socket.AF_INET, socket.SOCK_DGRAM) as taken:
        taken.bind((HOST, 0))
        with pytest.raises(Faults, match=r"cannot hear at 127\.0\.0\.1"):
            OscPort(HOST, taken.getsockname()[1])


def test_an_address_of_another_machine_is_told_in_a_sentence():
    with pytest.raises(Faults, match=r"cannot hear at 192\.0\.2\.1:9000"):
        OscPort("192.0.2.1", 9000)
