"""The host: from greeting to rest, and lines that answer wrongly from the start."""

import pytest

from player.wire import link
from player.wire import messages as m
from player.wire.frames import FrameReader
from player.wire.host import Host

from .lines import RIG, Line, Stranger, flip


def test_hello_configure_and_arm_lead_to_armed():
    line = Line().armed()
    assert line.states() == ["greeting", "configuring", "ready", "arming", "armed"]
    assert (line.host.board.name, line.host.board.channels, line.host.supply_kPa) == ("Bench", 4, 600.0)
    assert line.device.watchdog_us == 250_000


def test_sets_are_applied_at_the_hosts_due_time_by_the_devices_clock():
    line = Line(jitter_s=0.002).armed()
    line.run(5.0)
    begin = line.now + 0.05
    dues = [begin + n * 0.005 for n in range(200)]
    line.moved.clear()
    for n, due in enumerate(dues):
        while line.now < due - 0.03:
            line.run(0.001)
        assert line.host.set(due, 0, [n + 1] * 4, line.now)
    line.run(0.5)
    assert [values[0] for _, _, values in line.moved] == list(range(1, 201))
    assert max(abs(at - due) for (at, _, _), due in zip(line.moved, dues, strict=True)) <= line.tick_s + 1e-4
    assert line.host.late == 0


def test_nothing_is_set_before_arming_and_what_is_skipped_is_counted():
    line = Line().ready()
    assert not line.host.set(line.now + 0.1, 0, [1] * 4, line.now)
    assert line.host.skipped == 1
    assert line.host.to_send() == b""


def test_no_more_sets_are_sent_than_the_queue_has_room_for():
    line = Line().armed()
    line.run(1.0)
    sent = [line.host.set(line.now + 0.1, 0, [n] * 4, line.now) for n in range(70)]
    assert sent == [True] * 64 + [False] * 6
    line.run(0.05)
    assert line.device.queued == 64
    line.run(0.1)
    assert line.host.room(line.now) == 64
    assert not any(isinstance(event, link.Trouble) for event in line.events)


def test_a_set_larger_than_a_body_is_split_into_frames_of_one_due_time():
    line = Line(channels=2500).armed()
    line.run(1.0)
    line.moved.clear()
    assert line.host.set(line.now + 0.05, 0, list(range(2500)), line.now)
    assert line.host.room(line.now) == 61
    line.run(0.1)
    assert [(first, len(values)) for _, first, values in line.moved] == [(0, 1020), (1020, 1020), (2040, 460)]
    assert line.device.values == list(range(2500))
    assert len({at for at, _, _ in line.moved}) == 1


def test_rest_leads_back_to_ready_when_the_board_is_at_rest():
    line = Line().armed()
    line.run(1.0)
    line.host.set(line.now + 0.01, 0, [60000] * 4, line.now)
    line.run(0.1)
    assert line.host.rest(0.5, line.now)
    line.run(0.3)
    assert line.host.state == "resting"
    line.run(0.5)
    assert line.host.state == "ready"
    assert line.device.values == [0] * 4


def test_vent_goes_ahead_of_all_that_is_not_sent_yet():
    line = Line().armed()
    line.run(1.0)
    for n in range(10):
        line.host.set(line.now + 0.1, 0, [n] * 4, line.now)
    line.host.vent(line.now)
    sent = [m.decode(payload) for payload in FrameReader().feed(line.host.to_send())]
    assert sent == [m.Vent()]


@pytest.mark.parametrize("state", ["greeting", "configuring", "ready", "arming", "armed", "resting"])
def test_vent_is_possible_in_every_state(state):
    line = Line(delay_s=0.01)
    line.host.open(line.now)
    for _ in range(300):
        if line.host.state == state:
            break
        if line.host.state == "ready":
            line.host.arm(line.now)
        elif line.host.state == "armed":
            line.host.rest(1.0, line.now)
        else:
            line.run(0.001)
    assert line.host.state == state
    assert line.host.vent(line.now)
    line.run(0.2)
    assert (line.host.state, line.device.status) == ("vented", m.VENTED)


def test_a_board_that_is_armed_already_is_disarmed_by_the_greeting():
    line = Line().armed()
    line.host = Host(4, RIG)
    line.ready()
    assert (line.host.state, line.device.status) == ("ready", m.IDLE)


def test_pings_feed_the_watchdog_while_nothing_moves():
    line = Line(watchdog_ms=100).armed()
    line.run(5.0)
    assert (line.host.state, line.device.status) == ("armed", m.ARMED)


def test_a_host_that_stops_lets_the_device_vent_and_hears_of_it_when_it_goes_on():
    line = Line().armed()
    for _ in range(500):
        line.now += 0.001
        line.device.advance(line.us())
    assert line.device.status == m.VENTED
    line.run(0.2)
    assert line.host.state == "vented"
    troubles = [event for event in line.events if isinstance(event, link.Trouble)]
    assert troubles[0].name == "watchdog"


def test_a_wrong_rig_is_refused_in_words():
    line = Line()
    line.device = line.new_device(rig=RIG ^ 1)
    line.ready()
    assert line.host.state == "failed"
    assert line.why() == "the board tells of a fault, rig mismatch: this device serves another rig"


def test_a_board_with_too_few_channels_is_refused_with_both_numbers():
    line = Line(channels=5)
    line.device = line.new_device(4)
    line.ready()
    assert line.why() == "the board has 4 channels, the rig wants 5"


def test_a_line_without_a_board_fails_after_its_tries_and_says_so():
    line = Line(reply_s=0.2, tries=5)
    line.cut = True
    line.ready()
    assert line.host.state == "failed"
    assert line.why() == "no answer to hello in 1.0 s"


def test_a_line_that_echoes_is_named_as_one():
    line = Line(reply_s=0.2, tries=3)
    line.device = Stranger(lambda message, now_us: [(None, message)])
    line.ready()
    assert "the line sends back what it is sent" in line.why()


def test_a_line_of_noise_asks_about_the_baud_rate():
    line = Line(reply_s=0.2, tries=3, spoil=flip(1.0))
    line.ready()
    assert line.host.state == "failed"
    assert "is the baud rate that of the board?" in line.why()
