"""The device: its sets, its vent and its watchdog."""

import pytest

from player.wire import messages as m
from player.wire.device import Applied
from player.wire.frames import frame

from .desk import RIG, WATCHDOG_MS, Desk, faults, refusal


def test_it_starts_vented_with_every_channel_exhausting():
    desk = Desk()
    assert desk.state() == m.VENTED
    assert desk.moved == [(0, [0, 0, 0, 0])]


def test_hello_is_answered_by_hello_and_state_with_its_seq_and_leaves_it_idle():
    desk = Desk(senses_strain=True, senses_supply=True, queue=99)
    assert desk.say(m.Hello(1), seq=33, at=1234) == [
        (33, m.Board(1, 3, 4, 99, 1234, "Bench")),
        (33, m.State(1234, m.IDLE, 0, 0, 0, m.NOT_SENSED)),
    ]


@pytest.mark.parametrize("message", [m.Configure(4, 200, RIG), m.Arm(m.ARM_KEY), m.Vent(), m.Rest(100)])
def test_each_request_is_answered_by_one_state_with_its_seq(message):
    desk = Desk()
    desk.say(m.Hello(1))
    states = [answer for _, answer in desk.say(message, seq=200) if isinstance(answer, m.State)]
    assert len(states) == 1


def test_a_ping_is_answered_by_a_pong_with_its_seq_both_clocks_and_no_state():
    assert Desk().say(m.Ping(77), seq=5, at=4321) == [(5, m.Pong(77, 4321))]


def test_a_state_counts_what_was_dropped_before_its_frame_and_not_after_in_whatever_pieces_the_bytes_came():
    ask, dross = frame(m.encode(m.Vent(), 1)), b"dross\0"
    whole = [answer.bad for _, answer in Desk().bytes(dross + ask + dross + dross + ask)]
    desk = Desk()
    for byte in dross + ask + dross + dross:
        pieces = desk.bytes(bytes((byte,)))
    assert whole == [1, 3]
    assert [answer.bad for _, answer in desk.bytes(ask)] == [3]
    assert pieces == []


def test_the_clock_wraps_at_2_to_the_32():
    desk = Desk(now=(1 << 32) - 10)
    assert desk.say(m.Ping(1), at=(1 << 32) + 5) == [(9, m.Pong(1, 5))]


def test_a_set_before_arm_is_fault_3_and_changes_nothing():
    desk = Desk()
    for before in (m.Ping(0), m.Hello(1), m.Configure(4, 200, RIG)):
        desk.say(before)
        desk.moved.clear()
        assert desk.say(m.Set(0, 0, (1, 2, 3, 4))) == [(9, refusal("unarmed"))]
        assert desk.moved == []
        assert desk.device.queued == 0


def test_a_set_for_now_is_applied_at_once_and_is_not_late():
    desk = Desk().armed()
    desk.moved.clear()
    assert desk.say(m.Set(0, 1, (10, 20)), at=500) == []
    assert desk.moved == [(1, [10, 20])]
    assert desk.events[-1] == Applied(500, 0, 1, 2, False)
    assert desk.device.late == 0


def test_a_set_waits_for_its_due_time_to_the_microsecond():
    desk = Desk().armed()
    desk.say(m.Set(10_000, 0, (5,)), at=1000)
    assert desk.device.next_us() == 10_000
    desk.wait(9_999)
    assert desk.device.values[0] == 0
    desk.wait(10_000)
    assert desk.device.values[0] == 5
    assert desk.events[-1] == Applied(1000, 10_000, 0, 1, False)


def test_a_set_already_past_is_applied_at_once_and_counted_late():
    desk = Desk().armed()
    desk.say(m.Set(49_000, 0, (5,)), at=50_001)
    assert desk.device.values[0] == 5
    assert desk.device.late == 1
    assert desk.events[-1] == Applied(50_001, 49_000, 0, 1, True)


def test_a_set_due_at_this_very_microsecond_is_not_late():
    desk = Desk().armed()
    desk.say(m.Set(3000, 0, (5,)), at=3000)
    assert (desk.device.values[0], desk.device.late) == (5, 0)


def test_due_times_are_understood_across_the_wrap():
    turn = 1 << 32
    desk = Desk(now=turn - 5_000).armed()
    desk.say(m.Set(3_000, 0, (7,)))
    desk.say(m.Set(turn - 1_000, 0, (6,)))
    desk.wait(turn - 1_000)
    assert desk.device.values[0] == 6
    desk.wait(turn + 3_000)
    assert desk.device.values[0] == 7
    assert desk.device.late == 0


def test_sets_are_applied_in_the_order_of_their_times_and_those_of_one_time_as_they_came():
    desk = Desk().armed()
    for due, value in ((3000, 1), (2000, 2), (3000, 3), (2000, 4)):
        desk.say(m.Set(due, 0, (value,)), at=1000)
    desk.moved.clear()
    desk.wait(4000)
    assert [values[0] for _, values in desk.moved] == [2, 4, 1, 3]


def test_it_keeps_64_sets_and_refuses_the_next_as_fault_5():
    desk = Desk().armed()
    for n in range(64):
        assert desk.say(m.Set(10_000 + n, 0, (n,)), at=1000) == []
    assert desk.say(m.Set(20_000, 0, (1,))) == [(9, refusal("full"))]
    assert desk.device.queued == 64
    assert desk.say(m.Set(0, 0, (9,))) == []
    assert desk.device.values[0] == 9


@pytest.mark.parametrize(
    ("message", "expected"),
    [
        (m.Set(0, 0, ()), refusal("empty")),
        (m.Set(0, 4, (1,)), refusal("channel", 4)),
        (m.Set(0, 3, (1, 2)), refusal("channel", 4)),
        (m.Set(0, 60_000, (1,) * 9), refusal("channel", 60_000)),
    ],
)
def test_a_set_of_nothing_or_of_a_channel_that_is_not_configured_is_fault_4_and_changes_nothing(message, expected):
    desk = Desk().armed()
    desk.moved.clear()
    assert desk.say(message) == [(9, expected)]
    assert desk.moved == []


def test_vent_exhausts_at_once_in_every_state_and_drops_what_is_queued():
    for before in (
        (),
        (m.Hello(1),),
        (m.Hello(1), m.Configure(4, 200, RIG)),
        (m.Hello(1), m.Configure(4, 200, RIG), m.Arm(m.ARM_KEY)),
    ):
        desk = Desk()
        for message in before:
            desk.say(message)
        desk.say(m.Set(0, 0, (9, 9, 9, 9)))
        desk.say(m.Set(2_000, 0, (8, 8, 8, 8)))
        answers = desk.say(m.Vent(), seq=3)
        assert answers[-1] == (3, m.State(0, m.VENTED, 0, 0, 0, m.NOT_SENSED))
        desk.wait(10_000)
        assert desk.device.values == [0, 0, 0, 0]


def test_after_a_vent_only_hello_configure_arm_bring_it_back():
    desk = Desk().armed()
    desk.say(m.Vent())
    assert faults(desk.say(m.Arm(m.ARM_KEY))) == [refusal("hello")]
    assert faults(desk.say(m.Configure(4, 200, RIG))) == [refusal("hello")]
    assert faults(desk.say(m.Set(0, 0, (1,)))) == [refusal("unarmed")]
    assert desk.state() == m.VENTED
    assert desk.armed().state() == m.ARMED


def test_the_watchdog_vents_after_its_time_without_a_frame_and_says_so():
    desk = Desk().armed()
    desk.say(m.Set(0, 0, (9, 9, 9, 9)), at=1_000)
    desk.wait(1_000 + WATCHDOG_MS * 1000 - 1)
    assert desk.state() == m.ARMED
    told = desk.wait(1_000 + WATCHDOG_MS * 1000)
    assert told[0] == refusal("silence")
    assert told[1].status == m.VENTED
    assert desk.device.values == [0, 0, 0, 0]
    assert faults(desk.say(m.Arm(m.ARM_KEY))) == [refusal("hello")]


def test_bytes_at_the_very_end_of_the_watchdogs_time_come_too_late():
    desk = Desk().armed()
    desk.bytes(frame(m.encode(m.Ping(1), 1)), at=WATCHDOG_MS * 1000)
    assert desk.state() == m.VENTED


def test_sets_queued_beyond_the_watchdogs_time_never_open_a_valve_again():
    desk = Desk().armed()
    desk.say(m.Set(WATCHDOG_MS * 1000 + 1, 0, (9,)))
    desk.say(m.Set(WATCHDOG_MS * 1000 - 1, 0, (8,)))
    desk.events += desk.device.advance(WATCHDOG_MS * 5000)
    assert [e for e in desk.events if isinstance(e, Applied)] == [Applied(0, WATCHDOG_MS * 1000 - 1, 0, 1, False)]
    assert desk.device.values == [0, 0, 0, 0]


def test_every_good_frame_feeds_the_watchdog_and_nothing_else_does():
    good = frame(m.encode(m.Ping(1), 1))
    unknown = frame(b"\x33\x01\x00")
    wrong_size = frame(m.encode(m.Ping(1), 1) + b"\x00")
    own = frame(m.encode(m.State(0, 1, 0, 0, 0, 0), 0))
    for data, feeds in (
        (good, True),
        (good[:3] + b"\x7f" + good[4:], False),
        (unknown, False),
        (wrong_size, False),
        (own, False),
    ):
        desk = Desk().armed()
        for turn in range(1, 11):
            desk.bytes(data, at=turn * 50_000)
        assert (desk.state() == m.ARMED) is feeds


def test_the_watchdog_does_not_run_while_nothing_is_armed():
    desk = Desk()
    desk.say(m.Hello(1))
    desk.say(m.Configure(4, 1, RIG))
    assert all(not isinstance(message, m.Faulted) for message in desk.wait(10_000_000))
    assert desk.state() == m.IDLE
