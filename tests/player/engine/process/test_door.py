"""Who is attached, who commands, what is asked: with front ends that behave, and with those that do not."""

import mmap
import os
import socket

import pytest

from player.engine.process import messages, peers
from player.engine.process.door import MOST_FRONTS, MOST_SILENT, NOTES_MOST, QUEUE_BYTES, STANDS_S, UNFIT_MOST
from player.engine.process.layout import Reader
from player.engine.process.room import listen


def names(heard):
    return [name for name, _ in heard]


def test_hello_is_answered_with_a_welcome_and_who_commands(visit):
    (name, welcome), (_, who) = visit().hello(commands=True)
    assert name == "welcome" and welcome["commands"] and welcome["about"] == {"title": "Bench piece"}
    assert (who["commands"], who["taken"], who["rule"]) == (True, True, "rest")


def test_the_memory_comes_with_the_welcome_and_can_be_read(door):
    ours, theirs = socket.socketpair()
    door.adopt(theirs)
    ours.sendall(messages.packed("hello", version=messages.VERSION, commands=False, answers=False))
    door.serve()
    _, (descriptor,), _, _ = socket.recv_fds(ours, 65536, 1)
    with mmap.mmap(descriptor, 0, mmap.MAP_SHARED, mmap.PROT_READ) as memory:
        reader = Reader(memory)
        assert (reader.fibers, reader.boards) == (4, 1)
        del reader
    os.close(descriptor)
    ours.close()


def test_one_front_end_commands_and_any_number_watch(door, visit):
    first, second = visit(), visit()
    first.hello(commands=True, answers=True)
    assert dict(second.hello(commands=True))["welcome"]["commands"] is False
    assert door.commanded and door.answers and door.attached == 2
    (refused,) = second.say("rest")
    assert refused[0] == "refused" and "watches" in refused[1]["why"] and door.taken == []
    first.say("rest")
    assert door.taken == [("rest", {})]


def test_everybody_can_vent(door, visit):
    visit().hello(commands=True)
    watcher = visit()
    watcher.hello()
    watcher.say("vent")
    assert door.taken == [("vent", {})]


def test_before_hello_nothing_but_a_vent_is_taken(door, visit):
    (refused,) = visit().say("rest")
    assert refused[0] == "refused" and door.taken == []


def test_a_vent_needs_no_hello(door, visit):
    visit().say("vent")
    assert door.taken == [("vent", {})]


def test_a_welcome_comes_whole_behind_what_was_answered_before(visit):
    hello = messages.packed("hello", version=messages.VERSION, commands=False, answers=False)
    heard = visit().send(b"nonsense\n" + messages.packed("rest") + hello)
    assert names(heard) == ["refused", "refused", "welcome", "command"]


def test_another_version_is_refused_and_stays_unattached(door, visit):
    (refused,) = visit().hello(commands=True, version=99)
    assert "another version" in refused[1]["why"] and door.attached == 0 and not door.commanded


def test_what_the_state_has_no_place_for_is_refused_and_changes_nothing(door, visit):
    one = visit()
    one.hello(commands=True)
    door.state = lambda: "playing"
    (refused,) = one.say("arm")
    assert "means nothing while the player is playing" in refused[1]["why"] and door.taken == []
    assert door.notes[-1]["what"] == "refused"


def test_when_the_one_that_commands_is_gone_the_run_is_told_and_another_can_command(door, visit):
    first, second = visit(), visit()
    first.hello(commands=True)
    second.hello()
    first.socket.close()
    door.serve()
    assert door.lefts == 1 and not door.commanded
    assert second.hear()[-1] == ("command", {"commands": False, "taken": False, "rule": "rest"})
    second.say("command", answers=True)
    assert door.commanded and door.answers


def test_a_watcher_that_goes_is_nothing_to_the_run(door, visit):
    visit().hello(commands=True)
    watcher = visit()
    watcher.hello()
    watcher.say("leave")
    assert door.lefts == 0 and door.commanded and door.attached == 1


def test_the_rule_can_be_changed_by_the_one_that_commands(door, visit):
    one = visit()
    one.hello(commands=True)
    assert one.say("when_left", rule="go-on")[-1][1]["rule"] == "go-on" == door.rule


def test_nonsense_is_refused_noted_and_in_the_end_let_go(door, visit):
    one = visit()
    one.hello(commands=True)
    for _ in range(UNFIT_MOST):
        assert names(one.send(b"\x00\xff nonsense\n")) == ["refused"]
    one.send(b"nonsense\n")
    assert door.attached == 0 and door.taken == [] and door.lefts == 1
    assert "no message" in door.notes[-1]["what"]


def test_a_line_without_an_end_is_bounded(door, visit):
    one = visit()
    one.hello()
    for _ in range(2):
        one.socket.sendall(b"x" * 4000)
        door.serve()
    assert door.attached == 0


def test_a_front_end_that_does_not_read_costs_a_bounded_queue_and_is_told_how_much_it_missed(door, visit):
    stopped, other = visit(), visit()
    stopped.hello()
    other.hello()
    line = "x" * 1000
    for _ in range(3000):
        door.tell((line,))
        door.serve()
        other.hear()
    front = door._fronts[0]
    assert len(front.waits) <= QUEUE_BYTES and front.missed > 0
    # It wakes up, and reads: everything that was kept, then that some was not.
    told = []
    for _ in range(3000):
        told += stopped.hear()
        door.serve()
    door.tell(("the last",))
    door.serve()
    told += stopped.hear()
    assert told[-1][1]["lines"] == ["the last"]
    told = [(name, fields) for name, fields in told if name == "told"]
    lines = sum(len(fields["lines"]) for _, fields in told)
    assert lines + sum(fields["missed"] for _, fields in told) == 3001


def test_what_the_log_is_told_is_bounded(door, visit):
    one = visit()
    one.hello()
    for _ in range(NOTES_MOST + 50):
        one.say("rest")
    assert [note["what"] for note in door.notes].count("refused") == NOTES_MOST


@pytest.fixture
def listening(door):
    """The door listens; a maker of connections to it."""
    door._listener = listen("crowd-1")
    door._poll.register(door._listener)
    path, made = door._listener.getsockname(), []

    def connect():
        made.append(socket.socket(socket.AF_UNIX))
        made[-1].connect(path)
        door.serve()
        return made[-1]

    yield connect
    for one in made:
        one.close()
    door.close()
    assert not os.path.exists(path)


def test_no_more_front_ends_than_there_is_room_for_and_the_next_can_vent_all_the_same(door, visit, listening):
    for _ in range(MOST_FRONTS):
        visit().hello()
    late = listening()
    late.sendall(messages.packed("vent") + messages.packed("hello", version=messages.VERSION, commands=True, answers=True))
    door.serve()
    assert b"attached already" in late.recv(4096) and door.taken == [("vent", {})] and not door.commanded


def test_connections_that_never_say_a_word_keep_nobody_out(door, visit, listening):
    for _ in range(5 * MOST_SILENT):
        listening()
    assert len(door._fronts) <= MOST_SILENT
    one = visit()
    assert names(one.hello(commands=True)) == ["welcome", "command"] and door.commanded


def test_the_end_is_told_to_everybody_who_reads(door, visit):
    one, other = visit(), visit()
    one.hello(commands=True)
    other.hello()
    door.finish("ended", exit=0, report={}, lines=["done"])
    assert one.hear()[-1][1]["lines"] == other.hear()[-1][1]["lines"] == ["done"]
    assert one.socket.recv(10) == b""


def test_another_users_process_is_turned_away(door, listening, monkeypatch):
    monkeypatch.setattr(peers, "peer_uid", lambda connection: os.geteuid() + 1)
    assert b"belongs to another user" in listening().recv(4096) and door._fronts == []


def test_a_front_end_that_said_it_was_here_and_stands_still_leaves_and_may_command_again(door, visit):
    clock = [0.0]
    door._now = lambda: clock[0]
    first = visit()
    first.hello(commands=True, answers=True)
    first.say("here")
    clock[0] = STANDS_S
    door.serve()
    assert door.commanded and door.lefts == 0
    clock[0] = STANDS_S + 0.1
    door.serve()
    assert not door.commanded and door.lefts == 1 and door.attached == 1
    door.serve()
    (who,) = first.hear()
    assert who == ("command", {"commands": False, "taken": False, "rule": "rest"})
    assert any(note["what"] == "stands still" for note in door.notes)
    first.say("command", answers=True)
    assert door.commanded and door.answers


def test_a_run_that_stood_still_itself_does_not_put_that_down_to_its_front_end(door, visit):
    clock = [0.0]
    door._now = lambda: clock[0]
    first = visit()
    first.hello(commands=True)
    first.say("here")
    first.socket.sendall(messages.packed("here"))
    clock[0] = 60.0
    door.serve()
    assert door.commanded and door.lefts == 0


def test_one_that_never_said_it_was_here_may_be_silent_for_ever(door, visit):
    door._now = lambda: 1e6
    visit().hello(commands=True)
    door.serve()
    assert door.commanded
