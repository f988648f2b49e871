from itertools import pairwise
from random import Random

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from player.wire import messages as m
from player.wire.device import Applied, Build, Changed, Device, Told
from player.wire.frames import FrameReader, frame
from player.wire.rules import REFUSALS, STATE_EVERY_US

WATCHDOG_MS = 200
RIG = 0x1234ABCD


class Desk:
    """A device in virtual time, with what it has sent and moved."""

    def __init__(self, drives=("strain",) * 4, rig=RIG, now=0, **build):
        self.now = now
        self.moved = []
        self.reader = FrameReader()
        self.device = Device(
            Build("Bench", drives, rig=rig, **build), now, lambda first, values: self.moved.append((first, list(values)))
        )
        self.events = []

    def _move(self, first, values):
        self.moved.append((first, list(values)))

    def say(self, message, seq=9, at=None):
        """Say one message at a time; returns the answers to it, with their seq."""
        return [answer for answer in self.bytes(frame(m.encode(message, seq)), at) if answer[0] == seq]

    def bytes(self, data, at=None):
        self.now = self.now if at is None else at
        self.events += self.device.receive(data, self.now)
        return self.heard()

    def wait(self, until):
        """Let time pass as a timer would; returns all that was sent unasked."""
        while self.device.next_us() <= until:
            self.now = max(self.now, self.device.next_us())
            self.events += self.device.advance(self.now)
        self.now = until
        self.events += self.device.advance(until)
        return [answer for seq, answer in self.heard() if seq == 0]

    def heard(self):
        return [(payload[1], m.decode(payload)) for payload in self.reader.feed(self.device.to_send())]

    def state(self):
        return self.device.status

    def armed(self):
        self.say(m.Hello(1))
        self.say(m.Configure(len(self.device.values), WATCHDOG_MS, RIG))
        self.say(m.Arm(m.ARM_KEY))
        assert self.state() == m.ARMED
        return self


def refusal(name, channel=m.NO_CHANNEL):
    code, text = REFUSALS[name]
    return m.Faulted(code, channel, text)


def faults(answers):
    return [answer for _, answer in answers if isinstance(answer, m.Faulted)]


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


def test_a_new_hello_drops_the_queue_disarms_exhausts_and_forgets_the_configuration():
    desk = Desk().armed()
    desk.say(m.Set(0, 0, (9, 9)))
    desk.say(m.Set(5_000, 0, (8, 8)))
    desk.say(m.Hello(1))
    assert (desk.state(), desk.device.queued, desk.device.values) == (m.IDLE, 0, [0, 0, 0, 0])
    assert faults(desk.say(m.Arm(m.ARM_KEY))) == [refusal("configure")]


def test_a_hello_of_another_version_disarms_and_is_no_greeting():
    desk = Desk().armed()
    answers = [answer for _, answer in desk.say(m.Hello(2))]
    assert [type(answer) for answer in answers] == [m.Board, m.Faulted, m.State]
    assert answers[1] == refusal("version")
    assert desk.state() == m.IDLE
    assert faults(desk.say(m.Configure(4, 200, RIG))) == [refusal("hello")]


@pytest.mark.parametrize(
    ("message", "name"),
    [
        (m.Configure(0, 200, RIG), "channels"),
        (m.Configure(5, 200, RIG), "channels"),
        (m.Configure(4, 0, RIG), "watchdog"),
    ],
)
def test_what_cannot_be_configured_is_fault_4_and_leaves_it_unconfigured(message, name):
    desk = Desk()
    desk.say(m.Hello(1))
    assert faults(desk.say(message)) == [refusal(name)]
    assert faults(desk.say(m.Arm(m.ARM_KEY))) == [refusal("configure")]


def test_fewer_channels_than_there_are_may_be_configured_and_the_others_stay_exhausted():
    desk = Desk()
    desk.say(m.Hello(1))
    desk.say(m.Configure(2, 200, RIG))
    desk.say(m.Arm(m.ARM_KEY))
    assert faults(desk.say(m.Set(0, 0, (1, 1, 1)))) == [refusal("channel", 2)]
    assert desk.say(m.Set(0, 0, (1, 1))) == []


def test_another_rig_is_fault_2_and_status_3_until_the_next_hello():
    desk = Desk()
    desk.say(m.Hello(1))
    answers = desk.say(m.Configure(4, 200, RIG + 1))
    assert faults(answers) == [refusal("rig")]
    assert answers[-1][1].status == m.FAULT
    assert faults(desk.say(m.Configure(4, 200, RIG))) == [refusal("hello")]
    assert desk.armed().state() == m.ARMED


def test_a_device_that_knows_no_rig_takes_any():
    desk = Desk(rig=None)
    desk.say(m.Hello(1))
    assert faults(desk.say(m.Configure(4, 200, 0xFFFFFFFF))) == []


def test_configure_while_armed_is_fault_4_and_changes_nothing():
    desk = Desk().armed()
    assert faults(desk.say(m.Configure(2, 9, RIG))) == [refusal("armed")]
    assert (desk.state(), desk.device.channels, desk.device.watchdog_us) == (m.ARMED, 4, WATCHDOG_MS * 1000)


def test_a_wrong_key_arms_nothing():
    desk = Desk()
    desk.say(m.Hello(1))
    desk.say(m.Configure(4, 200, RIG))
    assert faults(desk.say(m.Arm(m.ARM_KEY ^ 1))) == [refusal("key")]
    assert desk.state() == m.IDLE


def test_arm_twice_is_answered_and_moves_nothing():
    desk = Desk().armed()
    desk.say(m.Set(0, 0, (7,)))
    assert [answer.status for _, answer in desk.say(m.Arm(m.ARM_KEY))] == [m.ARMED]
    assert desk.device.values[0] == 7


def test_rest_brings_all_down_in_a_straight_line_then_disarms():
    desk = Desk().armed()
    desk.say(m.Set(0, 0, (1000, 500, 0, 65535)))
    desk.say(m.Set(30_000, 0, (9,) * 4))
    assert [answer.status for _, answer in desk.say(m.Rest(100))] == [m.ARMED]
    assert desk.device.queued == 0
    for part in range(1, 100):
        desk.wait(part * 1000)
        assert desk.device.values == [value - value * part // 100 for value in (1000, 500, 0, 65535)]
    last = desk.wait(100_000)[-1]
    assert isinstance(last, m.State)
    assert (last.status, desk.device.values, desk.state()) == (m.IDLE, [0, 0, 0, 0], m.IDLE)
    assert desk.events[-1] == Changed(m.ARMED, m.IDLE, "at rest")


def test_a_valve_that_fills_stops_filling_at_once_when_it_is_to_rest():
    desk = Desk(drives=("valve",) * 4).armed()
    desk.say(m.Set(0, 0, (65535, 40000, 32768, 16384)))
    desk.say(m.Rest(1000))
    assert desk.device.values == [32768, 32768, 32768, 16384]
    desk = Desk(drives=("valve",) * 2).armed()
    desk.say(m.Set(0, 0, (65535, 16384)))
    desk.say(m.Rest(100))
    desk.wait(50_000)
    assert desk.device.values == [16384, 8192]


def test_rest_of_0_ms_is_at_once():
    desk = Desk().armed()
    desk.say(m.Set(0, 0, (7,) * 4))
    assert [answer.status for _, answer in desk.say(m.Rest(0))] == [m.IDLE]
    assert desk.device.values == [0, 0, 0, 0]


def test_on_its_way_to_rest_it_takes_no_set_and_does_not_arm_and_a_vent_ends_it():
    desk = Desk().armed()
    desk.say(m.Set(0, 0, (800,) * 4))
    desk.say(m.Rest(100))
    assert faults(desk.say(m.Set(0, 0, (9,)), at=10_000)) == [refusal("unarmed")]
    assert faults(desk.say(m.Arm(m.ARM_KEY), at=20_000)) == [refusal("resting")]
    assert desk.device.values == [640] * 4
    assert desk.say(m.Vent())[-1][1].status == m.VENTED
    assert desk.device.values == [0] * 4


def test_a_second_rest_goes_on_from_where_the_first_has_come():
    desk = Desk().armed()
    desk.say(m.Set(0, 0, (1000,) * 4))
    desk.say(m.Rest(100))
    desk.say(m.Rest(100), at=50_000)
    assert desk.device.values == [500] * 4
    desk.wait(100_000)
    assert desk.device.values == [250] * 4


def test_the_watchdog_watches_on_the_way_to_rest_too():
    desk = Desk().armed()
    desk.say(m.Set(0, 0, (1000,) * 4))
    desk.say(m.Rest(1000))
    desk.wait(WATCHDOG_MS * 1000)
    assert (desk.state(), desk.device.values) == (m.VENTED, [0] * 4)


def test_rest_while_nothing_is_armed_is_answered_and_changes_nothing():
    desk = Desk()
    assert [answer.status for _, answer in desk.say(m.Rest(100))] == [m.VENTED]


def test_after_rest_arm_alone_is_enough():
    desk = Desk().armed()
    desk.say(m.Rest(0))
    desk.say(m.Arm(m.ARM_KEY))
    assert desk.state() == m.ARMED


def test_over_pressure_vents_and_says_on_which_channel():
    desk = Desk().armed()
    desk.say(m.Set(0, 0, (9,) * 4))
    desk.say(m.Set(3000, 0, (8,) * 4))
    desk.events += desk.device.fail(m.OVER_PRESSURE, 2, "610 kPa", 1000)
    said = [message for seq, message in desk.heard() if seq == 0]
    assert said == [m.Faulted(m.OVER_PRESSURE, 2, "610 kPa"), m.State(1000, m.FAULT, 0, 0, 0, m.NOT_SENSED)]
    desk.wait(10_000)
    assert desk.device.values == [0] * 4
    assert Told(m.OVER_PRESSURE, 2, "610 kPa") in desk.events
    assert faults(desk.say(m.Arm(m.ARM_KEY))) == [refusal("hello")]


def test_state_comes_unasked_ten_times_a_second_or_faster_with_seq_0():
    desk = Desk()
    states = [message for message in desk.wait(1_000_000) if isinstance(message, m.State)]
    gaps = [b.device_us - a.device_us for a, b in pairwise(states)]
    assert set(gaps) == {STATE_EVERY_US}
    assert STATE_EVERY_US <= 100_000


def test_states_missed_are_not_made_up_for():
    desk = Desk()
    desk.device.advance(10 * STATE_EVERY_US + 3)
    assert len(desk.heard()) == 1
    assert desk.device.next_us() == 11 * STATE_EVERY_US


def test_sense_comes_with_the_state_for_the_channels_configured_and_only_from_a_board_that_senses():
    def sensed(**build):
        device = Device(
            Build("B", ("strain",) * 3, **build), 0, lambda first, values: None, lambda f, n: range(f, f + n), lambda: 4321
        )
        device.receive(frame(m.encode(m.Hello(1), 1)) + frame(m.encode(m.Configure(2, 100, 0), 2)), 10)
        device.to_send()
        device.advance(STATE_EVERY_US)
        return [m.decode(payload) for payload in FrameReader().feed(device.to_send())]

    now = STATE_EVERY_US
    assert sensed(senses_strain=True, senses_supply=True) == [m.State(now, 0, 0, 0, 0, 4321), m.Sense(now, 0, (0, 1))]
    assert sensed() == [m.State(now, 0, 0, 0, 0, m.NOT_SENSED)]


def test_bad_frames_are_counted_and_an_echo_is_counted_and_never_answered():
    desk = Desk()
    desk.bytes(b"garbage\0\x05\x01\0")
    assert desk.device.bad == 2
    for spec in m.SPECS:
        if spec.direction == "to host":
            assert desk.bytes(frame(bytes([spec.type, 1]) + bytes(30))) == []
    assert desk.device.bad == 2 + sum(spec.direction == "to host" for spec in m.SPECS)


@pytest.mark.parametrize(
    "payload", [b"\x08\x05", b"\x7f\x05abc", b"\x01\x05", b"\x05\x05\x00", b"\x04\x05\x00\x00\x00\x00\x00\x00\x02\x00\x01\x00"]
)
def test_an_unknown_type_or_a_body_of_the_wrong_form_is_fault_4(payload):
    assert Desk().bytes(frame(payload)) == [(5, refusal("form"))]


def test_late_and_bad_outlive_a_hello():
    desk = Desk().armed()
    desk.bytes(b"x\0", at=100)
    desk.say(m.Set(50, 0, (1,)))
    assert [(a.late, a.bad) for _, a in desk.say(m.Hello(1)) if isinstance(a, m.State)] == [(1, 1)]


steps = st.lists(
    st.tuples(
        st.integers(0, 120_000),
        st.one_of(
            st.binary(max_size=40),
            st.sampled_from(
                [
                    frame(m.encode(message, 3))
                    for message in (
                        m.Hello(1), m.Configure(4, 200, RIG), m.Configure(4, 50, RIG), m.Arm(m.ARM_KEY), m.Vent(), m.Rest(30),
                        m.Ping(5),
                        m.Set(0, 0, (1, 2, 3, 4)), m.Set(200_000, 1, (5, 6)), m.Set(90_000, 2, (7, 8, 9)),
                    )
                ]
            ),
        ),
    ),
    max_size=40,
)  # fmt: skip


@given(steps)
@settings(max_examples=300)
def test_whatever_comes_nothing_is_open_unless_armed_and_same_bytes_at_same_times_do_the_same(stream):
    desks = [Desk(), Desk()]
    now = 0
    for after, data in stream:
        now += after
        answers = [desk.bytes(data, at=now) for desk in desks]
        assert answers[0] == answers[1]
        assert desks[0].moved == desks[1].moved
        if desks[0].state() != m.ARMED:
            assert desks[0].device.values == [0, 0, 0, 0]
        assert desks[0].device.queued <= 64


@given(st.lists(st.binary(max_size=300), max_size=20), st.integers(0, 2**32))
def test_random_bytes_never_raise_and_never_move_a_valve(pieces, seed):
    desk, chance = Desk(), Random(seed)
    now = 0
    for piece in pieces:
        now += chance.randrange(100_000)
        desk.bytes(piece, at=now)
    assert desk.device.values == [0, 0, 0, 0]
    assert all(values == [0, 0, 0, 0] for _, values in desk.moved)


def test_random_frames_with_good_crc_never_raise_and_never_move_a_valve_before_arm():
    desk, chance = Desk(), Random(4)
    for turn in range(20_000):
        kind = chance.choice((0x01, 0x02, 0x04, 0x05, 0x06, 0x07, chance.randrange(256)))
        payload = bytes([kind, chance.randrange(256)]) + chance.randbytes(chance.choice((0, 1, 2, 4, 8, 10, 12, 30)))
        desk.bytes(frame(payload), at=turn * 997)
        assert desk.device.values == [0, 0, 0, 0]


@pytest.mark.parametrize(
    "build", [{"drives": ()}, {"drives": ("strain",), "queue": 63}, {"drives": ("strain",), "name": "é" * 128}]
)
def test_a_build_that_a_hello_could_not_say_is_refused(build):
    with pytest.raises(ValueError, match="1 to 65535 channels"):
        Build(**{"name": "x", **build})
