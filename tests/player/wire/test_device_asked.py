"""The device: how it is greeted, configured, armed, brought to rest, and what it makes of anything else."""

from itertools import pairwise
from random import Random

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from player.wire import messages as m
from player.wire.device import Build, Changed, Device, Told
from player.wire.frames import FrameReader, frame
from player.wire.rules import STATE_EVERY_US

from .desk import RIG, WATCHDOG_MS, Desk, faults, refusal


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
