"""What the simulated board in C does wrong when asked to."""

import time

import pytest

from player.outputs.portable_board import MISHAP_OPTIONS
from player.wire import messages as m
from player.wire.frames import frame
from player.wire.mishaps import MISHAPS
from player.wire.rules import TURN


def test_every_mishap_of_the_simulated_board_can_be_had_in_c_too():
    assert set(MISHAP_OPTIONS) == set(MISHAPS)


def test_a_reset_begins_anew_vented_with_its_clock_at_0(board, rows):
    with board("--reset-after", "0.2") as (_, talk):
        talk.armed()
        talk.heard.clear()
        vented = talk.state(m.VENTED)
        states = [said for _, said in talk.heard if isinstance(said, m.State)]
        before = states[states.index(vented) - 1]
        assert before.status == m.ARMED
        assert vented.device_us < 200_000 <= before.device_us
    assert "mishap" in [row["event"] for row in rows()]


def test_a_silent_board_says_nothing_more(board):
    with board("--silent-after", "0.2") as (_, talk):
        talk.armed().listen(1.0)
        talk.forget()
        talk.say(m.Hello(1))
        talk.listen(0.5)
        assert talk.heard == []


def test_a_mute_board_hears_and_says_nothing(board, rows):
    with board("--mute") as (_, talk):
        talk.say(m.Hello(1))
        talk.listen(0.5)
        assert talk.raw == b""
    assert "vented to idle: hello" in [row["note"] for row in rows()]


def test_a_clock_jumps_ahead(board):
    with board("--jump-after", "0.3") as (_, talk):
        talk.armed()
        bounds = []
        end = time.monotonic() + 1.0
        while time.monotonic() < end:
            before_s = time.monotonic()
            board_us = talk.ask(m.Ping(1), m.Pong).device_us
            bounds.append((board_us - time.monotonic() * 1e6, board_us - before_s * 1e6))
        # Offset of the two clocks, bounded from below and above by when each answer was asked and had.
        least = bounds[-1][0] - bounds[0][1]
        most = bounds[-1][1] - bounds[0][0]
        assert 0 < least <= 100_000 <= most + 2


@pytest.mark.parametrize("ppm", [-100_000, 100_000])
def test_a_clock_runs_fast_or_slow(board, ppm):
    with board("--clock-ppm", str(ppm)) as (_, talk):
        before_s = time.monotonic()
        first = talk.ask(m.Ping(1), m.Pong).device_us
        between_s = time.monotonic()
        talk.listen(1.0)
        later_s = time.monotonic()
        passed = talk.ask(m.Ping(1), m.Pong).device_us - first
        least, most = (later_s - between_s) * (1e6 + ppm), (time.monotonic() - before_s) * (1e6 + ppm)
        assert least - 10 <= passed <= most + 10


@pytest.mark.parametrize(("option", "code"), [("--over-pressure-after", m.OVER_PRESSURE), ("--sensor-after", m.SENSOR)])
def test_it_finds_a_fault_by_itself(board, option, code):
    with board(option, "0.2") as (_, talk):
        assert talk.armed().fault(code).channel == 0
        assert talk.state(m.FAULT)


def test_a_queue_keeps_less_than_it_says(board):
    with board("--room", "1") as (_, talk):
        talk.armed()
        now = talk.ask(m.Ping(1), m.Pong).device_us
        for n in range(2):
            talk.say(m.Set((now + 40_000_000 + n) % TURN, 0, (1,)))
        assert talk.board.queue == 64
        assert talk.fault(m.QUEUE_FULL)


def test_an_echoing_line_sends_back_what_it_carries(board):
    with board("--echo") as (_, talk):
        sent = frame(m.encode(m.Ping(0x1234567), 77))
        talk.line.write(sent)
        talk.until(lambda seq, said: seq == 77 and isinstance(said, m.Pong))
        assert sent in talk.raw


@pytest.mark.parametrize(("option", "share"), [("--garble", "20"), ("--lose", "20"), ("--cut", "50")])
def test_a_line_spoils_bytes_each_way(board, option, share):
    with board(option, share) as (_, talk):
        for _ in range(300):
            talk.say(m.Ping(5))
        talk.listen(1.0)
        assert talk.reader.bad > 0
        assert talk.until(lambda _, said: isinstance(said, m.State) and said.bad > 0)


def test_a_line_begins_to_spoil_bytes_some_time_after_arming(board):
    with board("--garble", "1000", "--garble-after", "0.3") as (_, talk):
        talk.armed().listen(0.1)
        assert talk.reader.bad == 0
        talk.listen(0.6)
        talk.forget().listen(0.3)
        assert talk.raw and talk.heard == []


def test_a_command_that_makes_no_sense_is_told_and_changes_nothing(board):
    with board("--misread-after", "0.2") as (_, talk):
        assert talk.armed().fault(m.BAD_COMMAND).text == "set of a channel that is not configured"
        assert talk.forget().state(m.ARMED)


def test_answers_leave_late(board):
    with board("--late-ms", "300") as (_, talk):
        began = time.monotonic()
        talk.ask(m.Hello(1))
        assert time.monotonic() - began >= 0.3


def test_a_valve_sticks(board):
    with board("--stuck-valve-after", "0.2") as (_, talk):
        talk.armed().listen(0.6)
        talk.say(m.Set(0, 0, (65535, 65535)))
        talk.until(lambda _, said: isinstance(said, m.Sense) and said.strain[1] == 65535)
        assert all(said.strain[0] == 0 for _, said in talk.heard if isinstance(said, m.Sense))


def test_a_sensor_reads_full_stroke(board):
    with board("--railed-after", "0.2") as (_, talk):
        talk.armed()
        assert talk.until(lambda _, said: isinstance(said, m.Sense) and said.strain[0] == 65535).strain == (65535, 0, 0, 0)


def test_a_fiber_leaks(board):
    with board("--leak-after", "0.2") as (_, talk):
        talk.armed().say(m.Set(0, 0, (65535, 65535)))
        leaked = talk.until(lambda _, said: isinstance(said, m.Sense) and said.strain[1] == 65535 and said.strain[0] < 30_000)
        assert leaked.strain[0] > 0


def test_the_supply_reads_low(board):
    with board("--low-supply-after", "0.2") as (_, talk):
        talk.armed()
        assert talk.until(lambda _, said: isinstance(said, m.State) and said.supply == 3600)
