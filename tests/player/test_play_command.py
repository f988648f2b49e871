"""`drawcord play`, as it is called."""

import json
import os
import signal
import subprocess
import sys
import time

import numpy as np
import pytest

from player.commands.main import run
from player.engine.run_log import records
from player.engine.trim import LEVELS, MOST
from player.outputs.recording import read


@pytest.fixture
def score(tmp_path, monkeypatch, rig_text, score_text):
    """Writes a score of half a second a nod, or one that is too fast, in a folder of its own; returns its name."""
    monkeypatch.chdir(tmp_path)
    (tmp_path / "bench.rig.toml").write_text(rig_text)

    def make(name="bench.score", times=1, fast=False):
        up, down = ("0.2", "1.2") if fast else ("0.6", "1.2")
        (tmp_path / name).write_text(score_text.format(times=times, length="1.5", up=up, down=down))
        return name

    return make


def started(*arguments):
    """The command in a process of its own."""
    command = [sys.executable, "-m", "player.commands.main", "play", *arguments]
    return subprocess.Popen(command, stdout=subprocess.PIPE, stderr=subprocess.PIPE, stdin=subprocess.DEVNULL, text=True)


def engine_of(process):
    """The process of the run that a command has started."""
    found = subprocess.run(["pgrep", "-P", str(process.pid)], capture_output=True, text=True, check=True)
    return int(found.stdout)


def when_moving(log):
    """Wait until the log has sets in it."""
    for _ in range(600):
        if os.path.exists(log):
            with open(log, "rb") as file:
                if sum(record.kind in ("set", "sent") for record in records(file.read())[0]) > 10:
                    return
        time.sleep(0.05)
    raise AssertionError("the run did not begin")


def told(text):
    """The one JSON object on stdout."""
    assert text.count("\n") == 1
    return json.loads(text)


def test_a_score_played_to_the_simulated_rig_ends_well_and_says_how_far_off_it_was(score, capsys):
    assert run(["play", score(), "--to", "sim", "--json"]) == 0
    found = told(capsys.readouterr().out)
    assert (found["ended"], found["exit"], found["state"], found["faults"]) == ("end", 0, "idle", [])
    assert found["ticks"] == found["outputs"][0]["sets"] == 151
    assert 0.0 < found["largest_error"]["error"] < 0.01 and found["largest_error"]["fiber"].startswith("r.")
    assert set(found["lateness_ms"]) == {"p50", "p99", "p99.9", "max"}


def test_without_json_it_ends_in_a_few_sentences_and_no_control_characters(score, capsys):
    assert run(["play", score(), "--to", "sim"]) == 0
    found = capsys.readouterr()
    assert "Played to its end at 1:2.5" in found.out
    assert "\x1b" not in found.out + found.err and "\r" not in found.out + found.err


def test_a_score_with_snags_is_refused_with_the_list(score, capsys):
    assert run(["play", score(fast=True), "--to", "file:a.rec"]) == 1
    found = capsys.readouterr()
    assert "r.1-4 are asked to fill" in found.out and "--retime" in found.err
    assert not os.path.exists("a.rec")


def test_the_refusal_as_json_has_the_snags(score, capsys):
    assert run(["play", score(fast=True), "--to", "sim", "--json"]) == 1
    found = told(capsys.readouterr().out)
    assert (found["ended"], found["exit"]) == ("refused", 1) and {snag["kind"] for snag in found["snags"]} == {"rate"}


def test_with_retime_it_is_mended_and_played(score, capsys):
    assert run(["play", score(fast=True), "--to", "sim", "--retime", "--json"]) == 0
    assert told(capsys.readouterr().out)["ended"] == "end"


def test_a_play_file_is_played(score, capsys):
    assert run(["retime", score(fast=True), "-o", "a.play"]) == 0
    capsys.readouterr()
    assert run(["play", "a.play", "--to", "sim", "--json"]) == 0
    assert told(capsys.readouterr().out)["largest_error"]["error_of_stroke"] < 0.05


def test_a_play_file_for_another_rig_is_refused(score, capsys):
    assert run(["retime", score(), "-o", "a.play"]) == 0
    with open("bench.rig.toml", "a") as file:
        file.write("\n[driver.more]\nchannels = 1\n")
    assert run(["play", "a.play", "--to", "main=sim", "--to", "more=sim"]) == 2
    assert "another" not in (says := capsys.readouterr().err) and "fingerprint" in says


def test_a_recording_played_back_gives_the_same_sets_at_the_same_times(score, capsys):
    assert run(["play", score(times=2), "--to", "file:a.rec", "--rate", "250"]) == 0
    assert run(["play", "a.rec", "--to", "file:b.rec"]) == 0
    with open("a.rec", "rb") as one, open("b.rec", "rb") as other:
        a, b = read(one.read(), "a.rec"), read(other.read(), "b.rec")
    assert a.rate_Hz == b.rate_Hz == 250.0 and a.complete and b.complete
    assert np.array_equal(a.values, b.values) and np.allclose(a.time_s, b.time_s, atol=2e-6)


def test_a_recording_for_another_rig_is_refused(score, capsys):
    assert run(["play", score(), "--to", "file:a.rec"]) == 0
    with open("bench.rig.toml", "a") as file:
        file.write("\n[driver.more]\nchannels = 1\n")
    assert run(["play", "a.rec", "--to", "sim"]) == 2
    assert "recorded for a rig with the fingerprint" in capsys.readouterr().err


def test_from_a_cue_and_from_a_place_start_alike(score, capsys):
    for start in ("middle", "1:2", "0.5s", "500ms"):
        assert run(["play", score(), "--to", "sim", "--from", start, "--json"]) == 0
        found = told(capsys.readouterr().out)
        assert found["ticks"] < 150 and found["position_s"] == 0.75, start


def test_the_log_has_head_states_sets_and_end(score):
    assert run(["play", score(), "--to", "sim", "--log", "run.log"]) == 0
    with open("run.log", "rb") as file:
        found, left = records(file.read())
    kinds = [record.kind for record in found]
    assert left == 0 and kinds[0] == "head" and kinds[-1] == "end" and kinds.count("set") == 151
    states = [record.told["state"] for record in found if record.kind == "state"]
    assert states == ["armed", "playing", "resting", "idle"]
    assert found[0].told["fibers"] == ["r.1", "r.2", "r.3", "r.4"]
    assert found[-1].told["ended"] == "end"


@pytest.mark.parametrize(
    ("arguments", "says"),
    [
        ([], "where to?"),
        (["--to", "sim", "--rate", "nan"], "expected 20 to 1000"),
        (["--to", "sim", "--rate", "19"], "expected 20 to 1000"),
        (["--to", "sim", "--rate", "1e9"], "expected 20 to 1000"),
        (["--to", "smi"], "did you mean 'sim'?"),
        (["--to", "sim", "--from", "midle"], "did you mean 'middle'?"),
        (["--to", "sim", "--from", "900:1"], "the score ends before"),
        (["--to", "sim", "--from", "1:9"], "no count 9"),
        (["--to", "sim", "--from", "1/0s"], "divides by 0"),
        (["--to", "sim", "--log", "nowhere/run.log"], "no folder"),
        (["--to", "file:nowhere/a.rec"], "no folder"),
        (["--to", "file:bench.score"], "is read"),
        (["--to", "sim", "--log", "bench.rig.toml"], "there is a rig file of this name already"),
        (["--to", "file:a.rec", "--log", "a.rec"], "is written already"),
        (["--to", "serial:/dev/no-such-port", "--arm"], "no such port"),
        (["--to", "sim", "--rig", "nowhere.rig.toml"], "no such file"),
    ],
)
def test_a_wrong_call_ends_with_two_and_a_sentence_and_leaves_nothing(score, capsys, arguments, says):
    name = score()
    before = {entry: os.stat(entry).st_mtime_ns for entry in os.listdir()}
    assert run(["play", name, *arguments]) == 2
    found = capsys.readouterr()
    assert says in found.err and "Traceback" not in found.err and found.out == ""
    assert {entry: os.stat(entry).st_mtime_ns for entry in os.listdir()} == before


@pytest.mark.parametrize("start", [b"drawcrec", b"PK\x03\x04", b"\x00\xff", b""])
def test_a_file_that_is_nothing_is_refused_in_words(score, capsys, tmp_path, start):
    score()
    (tmp_path / "odd").write_bytes(start + b"\x07" * 40)
    assert run(["play", "odd", "--to", "sim"]) == 2
    assert "odd" in capsys.readouterr().err


def test_files_made_for_playing_are_not_retimed(score, capsys):
    run(["play", score(), "--to", "file:a.rec"])
    assert run(["play", "a.rec", "--to", "sim", "--retime"]) == 2
    assert "--retime mends scores" in capsys.readouterr().err
    assert run(["play", "a.rec", "--to", "sim", "--from", "1:1"]) == 2
    assert "from its first set" in capsys.readouterr().err


@pytest.mark.parametrize("number", [signal.SIGINT, signal.SIGTERM, signal.SIGHUP])
def test_a_signal_brings_all_to_rest_and_disarms(score, number):
    playing = started(score(times=100), "--to", "file:a.rec", "--log", "run.log", "--json")
    when_moving("run.log")
    playing.send_signal(number)
    out, _ = playing.communicate(timeout=30)
    found = told(out)
    assert (playing.returncode, found["ended"], found["state"]) == (0, "stopped", "idle")
    with open("a.rec", "rb") as file:
        recording = read(file.read(), "a.rec")
    assert recording.complete and recording.ended == "rest" and np.all(recording.values[-1] == 0)


def test_a_vent_by_a_second_signal_is_recorded_as_such(score):
    playing = started(score(times=100), "--to", "file:a.rec", "--log", "run.log", "--json")
    when_moving("run.log")
    playing.send_signal(signal.SIGINT)
    time.sleep(0.05)
    playing.send_signal(signal.SIGINT)
    out, _ = playing.communicate(timeout=30)
    assert (playing.returncode, told(out)["state"]) == (1, "vented")
    with open("a.rec", "rb") as file:
        assert read(file.read(), "a.rec").ended == "vent"


def test_a_run_killed_outright_leaves_a_log_that_can_be_read(score):
    playing = started(score(times=100), "--to", "sim", "--log", "run.log")
    when_moving("run.log")
    os.kill(engine_of(playing), signal.SIGKILL)
    playing.communicate(timeout=30)
    assert playing.returncode == 1
    with open("run.log", "rb") as file:
        found, _ = records(file.read())
    assert found[0].kind == "head" and sum(record.kind == "set" for record in found) > 5


def test_what_the_trim_learned_is_kept_in_the_log_and_the_next_run_begins_with_it(score, capsys):
    name = score(times=2)
    assert run(["play", name, "--to", "sim", "--trim", "--log", "first.log"]) == 0
    assert "the trim begins" not in "".join(capsys.readouterr())
    with open("first.log", "rb") as file:
        kept = np.array(next(one.told["trim"] for one in records(file.read())[0] if one.kind == "end"), dtype=float)
    assert kept.shape[1] == len(LEVELS) and np.abs(kept).max() <= MOST
    assert run(["play", name, "--to", "sim", "--trim", "--log", "second.log"]) == 0
    assert "the trim begins with what was learned up to the end of first.log" in "".join(capsys.readouterr())
    assert run(["play", name, "--to", "sim", "--log", "third.log"]) == 0
    assert "the trim begins" not in "".join(capsys.readouterr())
