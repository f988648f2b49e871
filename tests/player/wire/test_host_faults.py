"""The host: what happens to a line or a board in mid-run, boards of others, and anything at all."""

from random import Random

import pytest
from hypothesis import given
from hypothesis import strategies as st

from player.wire import link
from player.wire import messages as m
from player.wire.frames import frame
from player.wire.host import Host

from .lines import RIG, Line, Stranger, flip, lose, stranger


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
