"""A run between its engine and its front ends, in virtual time."""

import numpy as np
import pytest

from player.engine.process import layout
from player.engine.process.conduct import HOLD_S, QUIET_S, Conduct
from player.engine.process.show import Show


class Run:
    """An engine with a door and shared memory; `play` goes through it, calling `meanwhile` with every snapshot."""

    def __init__(self, engine, door, rig, asked=None):
        buffer = bytearray(layout.size_of(len(rig.fibers), 1))
        memory = layout.Writer(buffer, len(rig.fibers), 1)
        self.engine, self.door, self.reader = engine, door, layout.Reader(buffer)
        self.conduct = Conduct(engine, door, Show(memory, engine, rig, lambda s: f"{s:.1f}s"), asked)

    def play(self, meanwhile=lambda status: None):
        self.conduct.preflight()
        if not self.conduct.wait_for_arm():
            return None
        self.engine.arm()
        for status in self.engine.run(self.conduct.wait_for_play()):
            self.conduct.after(status)
            meanwhile(status)
        self.conduct.after(self.engine.status())
        return self.engine.ending


@pytest.fixture
def board(kept):
    return kept(must_arm=True)


@pytest.fixture
def make_run(make_engine, make_rig, make_tracks, board, door):
    def make(asked=None, seconds=3.0):
        rig = make_rig()
        tracks = make_tracks(4, [(0.5, 1.5, 0.2)], duration_s=seconds)
        return Run(make_engine(rig, tracks, [board], armed=False), door, rig, asked)

    return make


@pytest.fixture
def commander(visit):
    def make():
        one = visit()
        one.hello(commands=True, answers=True)
        return one

    return make


def armed(run, commander):
    """Whoever commands has armed and played, after a pre-flight."""
    one = commander()
    run.conduct.preflight()
    heard = [*one.say("arm"), *one.say("play", from_s=0.0)]
    assert [name for name, _ in heard] == ["marks"]
    return one


def test_a_run_that_is_armed_and_played_goes_to_its_end_and_shows_it(make_run, commander, board):
    run = make_run()
    one = armed(run, commander)
    seen = []
    ending = run.play(lambda status: seen.append(run.reader.snapshot()))
    assert ending.how == "end" and [deed for deed in board.deeds if deed in ("arm", "rest")] == ["arm", "rest"]
    states = list(dict.fromkeys(snapshot.state for snapshot in seen))
    assert states == ["playing", "resting", "idle"] and run.reader.snapshot().state == "idle"
    highest = max(float(snapshot.array("wanted").max()) for snapshot in seen)
    assert highest == pytest.approx(0.2) and seen[0].texts("link") == ("armed",)
    assert np.isnan(seen[-1].array("sensed")).all() and seen[-1].number("commanded") == 1
    assert ("marks", True) in [(name, fields.get("ok")) for name, fields in one.hear()]


def test_nothing_is_armed_before_a_preflight_in_which_all_is_in_order(make_run, commander, board):
    run = make_run()
    one = commander()
    (refused,) = one.say("arm")
    assert "pre-flight" in refused[1]["why"]
    board.ready = False
    run.conduct.preflight()
    assert one.say("arm")[-1][0] == "refused"
    (refused,) = one.say("play", from_s=0.0)
    assert "arming" in refused[1]["why"]
    one.say("stop")
    assert run.conduct.wait_for_arm() is False and "arm" not in board.deeds


def test_the_preflight_can_be_gone_through_again(make_run, commander, board):
    run = make_run()
    one = commander()
    board.ready = False
    run.conduct.preflight()
    board.ready = True
    one.say("preflight")
    assert one.say("arm")[-1][0] == "refused"
    run.conduct._wants.add("preflight")
    waits = run.engine.tend

    def tend():
        waits()
        if run.engine.safety.checked:
            one.say("arm")

    run.engine.tend = tend
    assert run.conduct.wait_for_arm() is True


def test_a_front_end_that_is_gone_before_arming_leaves_nothing_armed(make_run, commander, board):
    run = make_run()
    commander().socket.close()
    assert run.play() is None and "arm" not in board.deeds


def test_a_vent_before_arming_vents_the_boards_and_ends_it(make_run, visit, commander, board):
    run = make_run()
    commander()
    watcher = visit()
    watcher.hello()
    run.conduct.preflight()
    watcher.say("vent")
    assert run.conduct.wait_for_arm() is False and "vent" in board.deeds and "arm" not in board.deeds


def gone_at(one, at_s):
    def meanwhile(status):
        if status.position_s >= at_s and one.socket.fileno() >= 0:
            one.socket.close()

    return meanwhile


def test_by_the_rule_rest_all_comes_to_rest_where_the_front_end_is_gone(make_run, commander, board):
    run = make_run(seconds=10.0)
    ending = run.play(gone_at(armed(run, commander), 1.0))
    assert (ending.how, ending.state, ending.faults) == ("stopped", "idle", ())
    assert "the rule is rest" in ending.why and ending.position_s < 2.0 and board.deeds[-1] == "rest"


def test_by_the_rule_go_on_it_goes_on_to_the_end(make_run, commander):
    run = make_run()
    run.door.rule = "go-on"
    ending = run.play(gone_at(armed(run, commander), 1.0))
    assert (ending.how, ending.position_s) == ("end", 3.0)
    told = b"".join(run.reader.snapshot().of["lines"])
    assert b"the run goes on" in told


def test_a_run_that_goes_on_can_be_commanded_by_another(make_run, commander, visit):
    run = make_run(seconds=20.0)
    run.door.rule = "go-on"
    first = armed(run, commander)
    late = []

    def meanwhile(status):
        if status.position_s >= 1.0 and not late:
            first.socket.close()
            run.door.serve()
            late.append(visit())
            late[0].hello(commands=True)
            late[0].say("rest")

    ending = run.play(meanwhile)
    assert ending.how == "stopped" and ending.position_s < 2.0


def test_armed_and_not_yet_played_it_is_disarmed_whatever_the_rule(make_run, commander, board):
    run = make_run()
    run.door.rule = "go-on"
    one = commander()
    run.conduct.preflight()
    one.say("arm")
    assert run.conduct.wait_for_arm()
    one.socket.close()
    run.engine.arm()
    statuses = list(run.engine.run(run.conduct.wait_for_play()))
    assert statuses == [] and board.sets == [] and run.engine.safety.state in ("idle", "resting")
    assert "rest" in board.deeds


def test_a_watcher_vents_a_run_in_mid_move(make_run, commander, visit, board):
    run = make_run(seconds=10.0)
    armed(run, commander)
    watcher = visit()
    watcher.hello()

    def meanwhile(status):
        if status.position_s >= 1.0 and "vent" not in board.deeds:
            watcher.say("vent")

    assert run.play(meanwhile).state == "vented" and "vent" in board.deeds


def test_a_front_end_that_says_nothing_for_ever_is_nothing_to_the_run(make_run, commander):
    run = make_run()
    armed(run, commander)
    assert run.play().how == "end"


def test_a_hold_that_is_not_said_anew_is_up(make_run, commander):
    asked = []
    run = make_run(asked=asked.append)
    one = armed(run, commander)
    held = []

    def meanwhile(status):
        if not held:
            one.say("hold", down=True)
            held.append(run.engine.clock.now())
        elif "held" in asked and len(held) == 1:
            held.append(run.engine.clock.now())

    run.play(meanwhile)
    assert asked == ["hold", "held"] and held[1] - held[0] == pytest.approx(HOLD_S, abs=0.02)


def test_a_hold_that_is_said_anew_stays_down_and_ends_with_its_front_end(make_run, commander):
    asked = []
    run = make_run(asked=asked.append)
    run.door.rule = "go-on"
    one = armed(run, commander)

    def meanwhile(status):
        if status.position_s < 2.0:
            one.say("hold", down=True)
        elif one.socket.fileno() >= 0:
            assert asked == ["hold"]
            one.socket.close()

    run.play(meanwhile)
    assert asked == ["hold", "held"]


def test_a_run_that_waits_for_its_boards_shows_itself_meanwhile_and_names_those_that_do_not_answer(
    make_run, commander, board, monkeypatch
):
    run = make_run()
    armed(run, commander)
    monkeypatch.setattr(board, "rest", lambda over_s: None)
    monkeypatch.setattr(board, "vent", lambda: None)
    quiet_s = []
    listen = run.engine.listen

    def listening():
        listen()
        if run.conduct._stage == "running":
            quiet_s.append(run.engine.clock.now() - run.reader.snapshot().number("at_s"))

    run.engine.listen = listening
    ending = run.play(lambda status: status.state == "vented" and run.engine.ask("stop"))
    assert len(quiet_s) > 500 and max(quiet_s) < QUIET_S + 0.02
    assert [fault.say for fault in ending.faults] == [
        "main: the board did not say that it has disarmed; it is told to vent",
        "main: the board did not say that it has vented; shut its supply by hand",
    ]
