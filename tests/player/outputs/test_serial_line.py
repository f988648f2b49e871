import errno
import os
import pty
import time
import tty
from collections.abc import Iterator
from contextlib import suppress

import pytest

from composer.faults import Faults
from player.outputs.base import LinkLost
from player.outputs.serial_line import LineLost, SerialLine


class Terminal:
    """A pseudo-terminal whose far end the test holds."""

    def __init__(self):
        self.far, near = pty.openpty()
        tty.setraw(near)
        self.near = near
        self.path = os.ttyname(near)
        os.set_blocking(self.far, False)

    def close(self):
        for handle in (self.near, self.far):
            with suppress(OSError):
                os.close(handle)


@pytest.fixture
def terminal() -> Iterator[Terminal]:
    one = Terminal()
    yield one
    one.close()


def until(what, seconds=5.0):
    end = time.monotonic() + seconds
    got = b""
    while time.monotonic() < end:
        got += what() or b""
        if got.endswith(b"\0"):
            return got
        time.sleep(0.001)
    return got


def test_every_byte_goes_through_both_ways_unchanged(terminal):
    line = SerialLine(terminal.path)
    line.open()
    data = bytes(range(1, 256)) + b"\r\n\x03\x04\x11\x13\x1a\x7f\0"
    assert line.write(data) == 0
    assert until(lambda: os.read(terminal.far, 4096)) == data
    os.write(terminal.far, data)
    assert until(line.read) == data
    line.close()


def test_reading_returns_at_once_where_nothing_has_come(terminal):
    line = SerialLine(terminal.path, 2_000_000)
    line.open()
    assert line.read() == b""
    line.close()


def test_what_the_port_does_not_take_is_kept_and_goes_later(terminal):
    line = SerialLine(terminal.path)
    line.open()
    sent = bytes([1]) * 200_000 + b"\0"
    kept = line.write(sent)
    assert kept > 0

    def pump():
        line.write(b"")
        try:
            return os.read(terminal.far, 65536)
        except BlockingIOError:
            return b""

    assert until(pump) == sent
    line.close()


def test_what_goes_first_goes_instead_of_what_was_kept(terminal):
    line = SerialLine(terminal.path)
    line.open()
    line.write(bytes([1]) * 200_000)
    os.read(terminal.far, 65536)
    line.write(b"vent\0", first=True)
    got = until(lambda: (line.write(b""), _read(terminal.far))[1])
    assert got.endswith(b"vent\0")
    assert len(got) < 100_000
    line.close()


def _read(handle):
    try:
        return os.read(handle, 65536)
    except BlockingIOError:
        return b""


def test_a_port_that_vanishes_raises_line_lost_on_reading_and_on_writing(terminal):
    line = SerialLine(terminal.path)
    line.open()
    terminal.close()
    with pytest.raises(LineLost, match="has vanished"):
        line.read()
    with pytest.raises(LinkLost, match=f"{terminal.path} has vanished"):
        line.write(b"x")
    line.close()
    line.close()


def test_what_came_before_a_port_vanished_is_still_read_or_the_loss_is_told(terminal):
    line = SerialLine(terminal.path)
    line.open()
    os.write(terminal.far, b"last\0")
    time.sleep(0.02)
    assert line.read() == b"last\0"
    terminal.close()
    with pytest.raises(LineLost):
        line.read()
    line.close()


def test_a_port_is_held_by_one_alone_and_free_again_after_closing(terminal):
    first, second = SerialLine(terminal.path), SerialLine(terminal.path)
    first.open()
    with pytest.raises(Faults, match="the port is busy: another program holds it"):
        second.open()
    first.close()
    second.open()
    second.close()


def test_a_port_that_does_not_exist_is_named_with_those_that_do(tmp_path):
    with pytest.raises(Faults, match=r"no such port; expected the path of a serial port\n   (ports found: |no port was found)"):
        SerialLine(str(tmp_path / "ttyUSB7")).open()


def test_a_file_or_a_folder_is_no_serial_port(tmp_path):
    file = tmp_path / "plain"
    file.write_text("x")
    for path in (file, tmp_path):
        with pytest.raises(Faults, match="this is no serial port"):
            SerialLine(str(path)).open()
    assert file.read_text() == "x"


@pytest.mark.parametrize("baud", [9600, 0, -1, 3_000_000])
def test_a_baud_rate_outside_the_protocols_is_refused_with_the_range(terminal, baud):
    with pytest.raises(Faults, match=f"{baud} baud; expected 115200 to 2000000 baud"):
        SerialLine(terminal.path, baud).open()


def test_a_port_that_is_not_permitted_says_whose_it_is_and_how_to_join(terminal, monkeypatch):
    import serial

    def forbidden(*_, **__):
        raise serial.SerialException(errno.EACCES, "could not open port")

    monkeypatch.setattr(serial, "Serial", forbidden)
    with pytest.raises(Faults, match=r"you may not use this port\n   it belongs to") as refused:
        SerialLine(terminal.path).open()
    assert "usermod -aG" in str(refused.value) or "udev rule" in str(refused.value)
