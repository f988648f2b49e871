from random import Random

import pytest
from hypothesis import given
from hypothesis import strategies as st

from player.wire import link
from player.wire import messages as m
from player.wire.device import Build, Device
from player.wire.frames import FrameReader, frame
from player.wire.host import Host

RIG = 0x1234ABCD


class Line:
    """A host and a device joined by a line in virtual time, which may delay, lose or change bytes."""

    def __init__(self, *, channels=4, delay_s=0.0005, jitter_s=0.0, spoil=None, seed=1, device=None, tick_s=0.001, **host):
        self.chance = Random(seed)
        self.delay_s, self.jitter_s, self.spoil, self.tick_s = delay_s, jitter_s, spoil, tick_s
        self.now = 10.0
        self.host = Host(channels, RIG, **host)
        self.moved = []
        self.device = device or self.new_device(channels)
        self.there, self.back = [], []
        self.events = []
        self.device_events = []
        self.cut = False

    def new_device(self, channels=4, rig=RIG, drives=None):
        build = Build("Bench", drives or ("strain",) * channels, rig=rig, senses_strain=True, senses_supply=True)
        return Device(
            build, self.us(), lambda first, values: self.moved.append((self.now, first, list(values))), supply=lambda: 6000
        )

    def us(self):
        return round(self.now * 1e6)

    def run(self, seconds, until=None):
        end = self.now + seconds
        while self.now < end:
            self.now += self.tick_s
            self._carry(self.there, self.host.to_send())
            data = self._arrived(self.there)
            if data:
                self.device_events += self.device.receive(data, self.us())
            self.device_events += self.device.advance(self.us())
            self._carry(self.back, self.device.to_send())
            self.events += self.host.receive(self._arrived(self.back), self.now)
            self.events += self.host.tick(self.now)
            if until and self.host.state in until:
                return self
        return self

    def _carry(self, way, data):
        if not data or self.cut:
            return
        if self.spoil:
            data = self.spoil(data, self.chance)
        at = self.now + self.delay_s + self.chance.random() * self.jitter_s
        way.append((max(at, way[-1][0] if way else 0.0), data))

    def _arrived(self, way):
        data = b""
        while way and way[0][0] <= self.now:
            data += way.pop(0)[1]
        return data

    def ready(self):
        self.host.open(self.now)
        return self.run(30.0, {"ready", "failed"})

    def armed(self):
        self.ready()
        assert self.host.arm(self.now)
        return self.run(10.0, {"armed", "failed"})

    def why(self):
        """Why the link last changed its state."""
        return [event.why for event in self.events if isinstance(event, link.Moved)][-1]

    def states(self):
        return [event.now for event in self.events if isinstance(event, link.Moved)]


class Stranger:
    """A board written by someone else, who has read the page and no more: answers by a script."""

    def __init__(self, answers, unasked=()):
        self.answers, self.unasked = answers, list(unasked)
        self.reader, self.out, self.asked = FrameReader(), b"", []

    def receive(self, data, now_us):
        for payload in self.reader.feed(data):
            message = m.decode(payload)
            self.asked.append(message)
            self.say(*((payload[1] if seq is None else seq, answer) for seq, answer in self.answers(message, now_us)))
        return []

    def advance(self, now_us):
        if self.unasked and now_us >= self.unasked[0][0]:
            self.say((0, self.unasked.pop(0)[1]))
        return []

    def say(self, *frames):
        for seq, message in frames:
            self.out += message if isinstance(message, bytes) else frame(m.encode(message, seq))

    def to_send(self):
        out, self.out = self.out, b""
        return out


def flip(share):
    return lambda data, chance: bytes(b ^ chance.randrange(1, 256) if chance.random() < share else b for b in data)


def lose(share):
    return lambda data, chance: bytes(b for b in data if chance.random() >= share)


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


def test_a_cut_line_is_told_as_silent_once_and_back_once():
    line = Line().armed()
    line.cut = True
    line.run(2.0)
    line.cut = False
    line.run(0.5)
    told = [type(event) for event in line.events if isinstance(event, link.Silent | link.Back)]
    assert told == [link.Silent, link.Back]
    assert line.host.state == "vented"


def test_a_device_that_starts_anew_ends_the_run():
    line = Line().armed()
    line.run(2.0)
    line.device = line.new_device()
    line.run(0.5)
    assert line.host.state in ("vented", "failed")
    assert not line.host.set(line.now + 0.1, 0, [1] * 4, line.now)


def test_a_clock_that_jumps_while_armed_ends_the_run_and_vents():
    line = Line().armed()
    line.run(2.0)
    us = line.us
    line.us = lambda: us() + 1_000_000
    line.device._heard_us += 1_000_000
    line.run(0.5)
    assert line.host.state == "failed"
    assert "clock has jumped" in next(
        event.why for event in line.events if isinstance(event, link.Moved) and event.now == "failed"
    )
    assert line.device.status == m.VENTED


def test_over_pressure_is_told_with_its_channel_and_ends_the_run():
    line = Line().armed()
    line.device.fail(m.OVER_PRESSURE, 2, "610 kPa", line.us())
    line.run(0.1)
    assert line.host.state == "failed"
    assert link.Trouble(m.OVER_PRESSURE, 2, "610 kPa", 0) in line.events
    assert line.why() == "the board tells of a fault, over-pressure on channel 2: 610 kPa"


def test_sensed_strains_come_with_a_time_of_the_host():
    line = Line().armed()
    line.run(2.0)
    last = [event for event in line.events if isinstance(event, link.Sensed)][-1]
    assert last.strain == (0, 0, 0, 0)
    assert line.now - 0.1 < last.at_s <= line.now


@pytest.mark.parametrize("seed", range(12))
@pytest.mark.parametrize("spoil", [flip(0.01), lose(0.01), flip(0.03)])
def test_a_line_that_loses_or_garbles_bytes_gets_armed_all_the_same(spoil, seed):
    line = Line(spoil=spoil, jitter_s=0.003, seed=seed, reply_s=0.1, tries=60, watchdog_ms=2000).armed()
    assert line.host.state == "armed"
    assert line.host.vent(line.now)
    line.run(1.0)
    assert line.host.state == "vented"
    assert line.device.status == m.VENTED


@pytest.mark.parametrize("seed", range(6))
def test_on_a_line_that_garbles_nothing_is_ever_set_that_was_not_sent(seed):
    line = Line(spoil=flip(0.01), seed=seed, reply_s=0.1, tries=60, watchdog_ms=2000).armed()
    sent = {0}
    for n in range(300):
        line.host.set(line.now + 0.02, 0, [n] * 4, line.now)
        sent.add(n)
        line.run(0.005)
        if line.host.state != "armed":
            break
    assert {value for _, _, values in line.moved for value in values} <= sent
    assert line.device.bad > 0


def stranger(message, now_us, *, after_arm=m.ARMED):
    """As the page asks, by someone who answers hello after state, stays vented until armed, and repeats itself."""
    us = now_us % (1 << 32)
    status = {m.Arm: after_arm, m.Rest: m.IDLE}.get(type(message), m.VENTED)
    state = m.State(us, status, 0, 900, 800, m.NOT_SENSED)
    if isinstance(message, m.Hello):
        return [(0, b"boot v3\r\n\0\xff\xff\0"), (None, m.Board(1, 0, 8, 64, us, "Own \u2713")), (None, state), (None, state)]
    if isinstance(message, m.Ping):
        return [(0, m.Pong(message.host_us, us)), (None, m.Pong(message.host_us, us)), (0, m.Pong(1, us))]
    return [(None, state)] if not isinstance(message, m.Set) else []


def test_a_strangers_board_that_stays_vented_until_armed_and_repeats_itself_is_played():
    line = Line(device=Stranger(stranger)).armed()
    line.run(1.0)
    assert line.host.state == "armed"
    assert (line.host.late, line.host.bad) == (0, 0)
    line.host.set(line.now + 0.1, 0, [5] * 4, line.now)
    line.host.rest(0.3, line.now)
    line.run(0.1)
    assert line.host.state == "ready"


def test_a_board_that_answers_arm_with_another_status_has_refused():
    line = Line(device=Stranger(lambda message, us: stranger(message, us, after_arm=m.IDLE))).armed()
    assert line.host.state == "failed"
    assert line.why() == "asked to arm, the board says idle"


def test_answers_that_come_after_the_next_asking_do_no_harm():
    line = Line(delay_s=0.35, reply_s=0.5, watchdog_ms=3000).armed()
    assert line.host.state == "armed"
    assert line.host.rest(1.0, line.now)
    line.run(4.0)
    assert line.host.state == "ready"
    assert line.states().count("armed") == 1


def test_a_board_that_says_it_is_armed_after_a_vent_is_vented_again():
    board = Stranger(stranger)
    line = Line(device=board).armed()
    line.host.vent(line.now)
    line.run(0.1)
    vents = board.asked.count(m.Vent())
    board.say((0, m.State(line.us() + 10, m.ARMED, 0, 0, 0, m.NOT_SENSED)))
    line.run(0.1)
    assert board.asked.count(m.Vent()) == vents + 1


def test_a_board_that_never_comes_to_rest_is_vented():
    def stubborn(message, us):
        return [(None, m.State(us, m.ARMED, 0, 0, 0, 0xFFFF))] if isinstance(message, m.Rest) else stranger(message, us)

    board = Stranger(stubborn)
    line = Line(device=board).armed()
    line.host.rest(0.5, line.now)
    line.run(2.0)
    assert line.host.state == "vented"
    assert m.Vent() in board.asked


def test_a_vent_that_nobody_answers_is_asked_often_and_then_told():
    line = Line().armed()
    line.cut = True
    line.host.vent(line.now)
    line.run(5.0)
    assert line.host.state == "failed"
    assert line.why().startswith("no answer to vent in 2.")


def test_a_ramp_longer_than_the_wire_can_say_is_told_as_what_it_becomes():
    line = Line().armed()
    line.host.rest(100.0, line.now)
    line.run(0.01)
    assert line.why() == "coming to rest in 65.5 s"


@given(st.lists(st.binary(max_size=200), max_size=20))
def test_random_bytes_never_raise_and_lead_nowhere(pieces):
    host = Host(4, RIG)
    host.open(0.0)
    host.tick(0.0)
    for n, piece in enumerate(pieces):
        host.receive(piece, n * 0.01)
        host.tick(n * 0.01)
    assert host.state == "greeting"


def test_random_messages_of_a_mad_board_never_raise():
    chance = Random(7)
    types = [spec.type for spec in m.SPECS] + [0x90, 0x10]
    for seed in range(30):
        line = Line(seed=seed).armed()
        for _ in range(300):
            size = chance.choice((1, 2, 5, 8, 13, 17, 19, 30))
            payload = bytes([chance.choice(types), chance.randrange(256)]) + chance.randbytes(size)
            line.host.receive(frame(payload), line.now)
            line.run(0.001)
        assert line.host.state in link.STATES


def test_every_happening_leads_from_states_to_states_of_the_table():
    for happens, row in link.TRANSITIONS.items():
        assert row, happens
        assert set(row) | set(row.values()) <= set(link.STATES)
    assert set(link.STATES[1:]) <= set(link.TRANSITIONS["vent"])
