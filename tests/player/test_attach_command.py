"""`drawcord attach`, and what becomes of a run whose front end is gone: on terminals, with a board behind another."""

import json
import os
import signal
import subprocess
import sys
import time

import pytest

from player.commands.attending import GONE
from player.commands.main import run
from player.engine.run_log import records

from .test_front import OnTerminal
from .test_play_command import engine_of, started, when_moving

MAIN = [sys.executable, "-m", "player.commands.main"]


@pytest.fixture
def score(tmp_path, monkeypatch, rig_text, score_text, own_runs):
    monkeypatch.chdir(tmp_path)
    (tmp_path / "bench.rig.toml").write_text(rig_text)
    (tmp_path / "bench.score").write_text(score_text.format(times=100, length="1.5", up="0.6", down="1.2"))
    yield "bench.score"
    assert list(runs()) == []


def runs():
    """This user's runs as --list has them."""
    return {row["run"]: row for row in json.loads(attach("--list", "--json").stdout)["runs"]}


def attach(*arguments):
    command = [*MAIN, "attach", *arguments]
    return subprocess.run(command, capture_output=True, text=True, stdin=subprocess.DEVNULL, timeout=60)


def until(true, what):
    """Wait until something is so; the time is only there so that a failure ends."""
    end = time.monotonic() + 60.0
    while not true():
        assert time.monotonic() < end, what
        time.sleep(0.05)


def end_of(log):
    """How the run ended, by its log; None where it has not."""
    with open(log, "rb") as file:
        last = records(file.read())[0][-1]
    return last.told if last.kind == "end" else None


def playing(score, *more):
    process = started(score, "--to", "sim", "--log", "run.log", *more)
    when_moving("run.log")
    return process


def killed(process):
    process.kill()
    process.communicate(timeout=30)


def test_a_front_end_that_is_killed_leaves_the_run_to_come_to_rest(score):
    killed(playing(score))
    until(lambda: end_of("run.log"), "the run did not end")
    ended = end_of("run.log")
    assert (ended["ended"], ended["state"], ended["faults"]) == ("stopped", "idle", []) and "the rule is rest" in ended["why"]
    until(lambda: not runs(), "the process did not end")


def test_by_the_rule_go_on_it_plays_on_until_somebody_attaches_and_ends_it(score):
    killed(playing(score, "--when-left", "go-on"))
    (name,) = runs()
    assert not runs()[name]["commanded"] and runs()[name]["state"] == "playing"
    terminal = OnTerminal(name, command="attach")
    terminal.see("it is commanded from here now")
    terminal.see("bar ")
    assert runs()[name]["commanded"]
    terminal.type(b" ")
    terminal.see("paused")
    terminal.type(b"\x03")
    terminal.see("Stopped and brought to rest")
    assert terminal.end() == 0
    told = [record.told["what"] for record in log("run.log") if record.kind == "front"]
    assert told[:3] == ["commands", "gone", "attached"] and end_of("run.log")["ended"] == "stopped"


def log(path):
    with open(path, "rb") as file:
        return records(file.read())[0]


def test_a_run_can_be_left_and_come_back_to_again_and_again(score):
    first = OnTerminal(score, "--to", "sim", "--when-left", "go-on")
    first.see("bar 1:")
    first.type(b"d")
    first.see("comes back to it")
    assert first.end() == 0
    (name,) = runs()
    for _ in range(2):
        again = OnTerminal(command="attach")
        again.see("commanded from here")
        again.see("bar ")
        again.type(b"d")
        again.see("comes back to it")
        assert again.end() == 0
    assert attach(name, "--vent").returncode == 0
    until(lambda: not runs(), "the process did not end")


def test_by_the_rule_rest_leaving_by_key_is_refused_as_it_would_bring_all_to_rest(score):
    terminal = OnTerminal(score, "--to", "sim")
    terminal.see("bar 1:")
    terminal.type(b"d")
    terminal.see("press r for that")
    terminal.see("bar ")
    terminal.type(b"\x03")
    terminal.see("Stopped and brought to rest")
    assert terminal.end() == 0


def test_whoever_watches_sees_and_can_vent_and_no_more(score):
    process = playing(score, "--json")
    watcher = OnTerminal("--watch", command="attach")
    watcher.see("only watched")
    watcher.see("bar ")
    watcher.type(b" ")
    watcher.see("only watches, and can vent")
    watcher.type(b"v")
    watcher.see("Vented at")
    assert watcher.end() == 1
    out, _ = process.communicate(timeout=30)
    assert (process.returncode, json.loads(out)["state"]) == (1, "vented")


def test_a_second_front_end_watches_where_the_first_commands_and_its_end_is_nothing_to_the_run(score):
    process = playing(score, "--json")
    second = OnTerminal(command="attach")
    second.see("another front end commands it")
    second.type(b"\x03")
    second.see("comes back to it")
    assert second.end() == 0
    assert [row["state"] for row in runs().values()] == ["playing"]
    process.send_signal(signal.SIGINT)
    out, _ = process.communicate(timeout=30)
    assert json.loads(out)["faults"] == [] and process.returncode == 0


def test_a_vent_without_a_name_vents_every_run_of_this_user(score):
    one, other = playing(score, "--json"), started(score, "--to", "sim", "--log", "other.log", "--json")
    when_moving("other.log")
    done = attach("--vent", "--json")
    assert done.returncode == 0, done.stderr
    assert sorted(row["state"] for row in json.loads(done.stdout)["runs"]) == ["vented", "vented"]
    for process in (one, other):
        out, _ = process.communicate(timeout=30)
        assert json.loads(out)["ended"] == "vented"


def test_a_stopped_front_end_is_nothing_to_the_run(score):
    process = playing(score, "--json")
    process.send_signal(signal.SIGSTOP)
    (name,) = runs()
    before = [record.kind for record in log("run.log")].count("set")
    until(lambda: [record.kind for record in log("run.log")].count("set") > before + 200, "it does not go on")
    assert attach(name, "--vent").returncode == 0
    process.send_signal(signal.SIGCONT)
    out, _ = process.communicate(timeout=30)
    told = json.loads(out)
    assert (told["ended"], told["stalls"], process.returncode) == ("vented", 0, 1)


def test_an_engine_that_is_killed_is_told_and_its_board_vents_by_itself(score):
    device = subprocess.Popen(
        [*MAIN, "device", "bench.rig.toml", "--log", "board.csv"], stdout=subprocess.PIPE, stdin=subprocess.DEVNULL, text=True
    )
    port = device.stdout.readline().strip()
    process = started(score, "--to", f"serial:{port}", "--arm", "--log", "run.log")
    when_moving("run.log")
    os.kill(engine_of(process), signal.SIGKILL)
    _, err = process.communicate(timeout=30)
    assert process.returncode == 1 and GONE in err
    until(lambda: "watchdog" in read("board.csv"), "the board did not vent")
    assert attach().returncode == 2
    device.terminate()
    device.wait(30)
    device.stdout.close()


def read(path):
    with open(path) as file:
        return file.read()


def test_the_terminals_end_leaves_a_run_to_go_on_where_that_is_the_rule(score):
    terminal = OnTerminal(score, "--to", "sim", "--log", "run.log", "--when-left", "go-on")
    terminal.see("bar 1:")
    os.close(terminal.master)
    terminal.process.wait(timeout=60)
    (row,) = runs().values()
    assert row["state"] == "playing" and not row["commanded"]
    assert attach("--vent").returncode == 0
    until(lambda: not runs(), "the process did not end")


@pytest.mark.parametrize(
    ("arguments", "says"),
    [((), "none of your runs is on"), (("nothing-1",), "no run answers"), (("--vent",), "none of your runs is on")],
)
def test_where_there_is_no_run_that_is_said(score, capsys, arguments, says):
    assert run(["attach", *arguments]) == 2
    found = capsys.readouterr()
    assert says in found.err and found.out == ""


def test_a_list_of_none_is_no_fault(score, capsys):
    assert run(["attach", "--list"]) == 0
    assert capsys.readouterr().out == "none of your runs is on\n"


def test_a_run_that_stands_still_is_said_to(score):
    terminal = OnTerminal(score, "--to", "sim")
    terminal.see("bar 1:")
    engine = engine_of(terminal.process)
    os.kill(engine, signal.SIGSTOP)
    terminal.see("stands still")
    os.kill(engine, signal.SIGCONT)
    terminal.type(b"\x03")
    terminal.see("Stopped and brought to rest")
    assert terminal.end() == 0
