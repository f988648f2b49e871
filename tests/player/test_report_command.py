"""`drawcord report`, as it is called."""

import json

import pytest

from player.commands.main import run
from player.engine.run_log import RunLog


@pytest.fixture
def log(tmp_path, monkeypatch, rig_text, score_text):
    """The log of a nod of all four fibers, played to the simulated rig."""
    monkeypatch.chdir(tmp_path)
    (tmp_path / "bench.rig.toml").write_text(rig_text)
    (tmp_path / "bench.score").write_text(score_text.format(times=1, length="1.5", up="0.6", down="1.2"))
    assert run(["play", "bench.score", "--to", "sim", "--log", "run.log"]) == 0
    return "run.log"


def test_a_whole_log_is_told_with_its_landings_and_lateness(log, capsys):
    capsys.readouterr()
    assert run(["report", log, "--json", "--png", "run.png"]) == 0
    found = json.loads(capsys.readouterr().out)
    assert found["sound"] and found["ended"] == "end" and found["faults"] == [] and found["left_bytes"] == 0
    # Two landings for each of four fibers: up and down.
    assert len(found["hits"]) == 8 and {one["fiber"] for one in found["hits"]} == {"r.1", "r.2", "r.3", "r.4"}
    sizes = [abs(one["error"]) for one in found["hits"]]
    assert sizes == sorted(sizes, reverse=True) and sizes[0] < 0.03
    assert sum(one["ticks"] for one in found["lateness"]) == found["sets"] == 151
    with open("run.png", "rb") as picture:
        assert picture.read(8) == b"\x89PNG\r\n\x1a\n"
    assert run(["report", log, "--png", "run.png"]) == 0
    said = capsys.readouterr().out
    assert said.endswith("\nwritten: run.png\n") and "+0.00 %" not in said and "-0.00 %" not in said
    assert "8 landings sensed" in said and "Ticks by how late they came" in said and "No faults." in said
    lines = said.splitlines()
    assert "Played to its end at 1:2.5." in lines
    # Heads of columns end where the numbers below them end.
    head = next(n for n, line in enumerate(lines) if line.startswith("  place"))
    for name in ("wanted", "sensed", "off by"):
        end = lines[head].index(name) + len(name)
        assert all(line[:end].endswith(" %") for line in lines[head + 1 : head + 9])


def test_a_log_cut_off_is_told_up_to_there_and_says_so(log, capsys):
    with open(log, "rb") as file:
        data = file.read()
    with open("cut.log", "wb") as file:
        file.write(data[: len(data) // 2])
    capsys.readouterr()
    assert run(["report", "cut.log"]) == 1
    assert "The log breaks off" in capsys.readouterr().out


@pytest.mark.parametrize("content", [b"", b"no log", b"drawclog\x02\x00", b"drawclog\x02\x00" + b"\xff" * 100])
def test_what_is_no_log_is_refused_with_a_sentence_and_no_picture(tmp_path, monkeypatch, capsys, content):
    monkeypatch.chdir(tmp_path)
    (tmp_path / "a.log").write_bytes(content)
    assert run(["report", "a.log", "--png", "a.png"]) == 2
    assert "cannot be told" in capsys.readouterr().err and not (tmp_path / "a.png").exists()


def kept(name, day, held, fingerprint="0a", whole=True):
    """The log of a run on which the second of two fibers stood so far off while it was held."""
    data = bytearray()
    log = RunLog(data.extend)
    head = {"fibers": ["a", "b"], "stroke": [0.3, 0.3], "rate_Hz": 100.0, "lead_s": 0.0, "played": "x.score", "title": "X"}
    log.tell(
        "head", 0.0, **head, rig="x.rig.toml", fingerprint=fingerprint, targets=["sim"], date=f"2026-03-{day:02}T19:00:00Z"
    )
    log.tell("end", 1.0, ended="end", exit=0, stood={"at_rest": [0.0, None], "held": [0.001, held]})
    with open(name, "wb") as file:
        file.write(data if whole else data[:-3])
    return name


def test_a_fiber_that_stands_further_off_from_run_to_run_is_told_with_the_logs_that_show_it(tmp_path, monkeypatch, capsys):
    monkeypatch.chdir(tmp_path)
    for day in range(1, 5):
        kept(f"night-{day}.log", day, -0.01 * day)
    # None of these is a run of this rig before: another rig's, one cut off, one that came after, and no log.
    kept("other.log", 1, 0.5, fingerprint="0b")
    kept("cut.log", 2, 0.5, whole=False)
    kept("after.log", 9, 0.5)
    (tmp_path / "notes.txt").write_text("no log")
    last = kept("night-5.log", 5, -0.05)
    assert run(["report", last, "--json"]) == 0
    told = json.loads(capsys.readouterr().out)["drift"]
    assert told["logs"] == [f"night-{day}.log" for day in range(1, 5)]
    assert told["fibers"] == [{"fiber": "b", "where": "held", "now": -0.05, "a_run": -0.01, "runs": 5}]
    assert run(["report", last]) == 0
    said = capsys.readouterr().out
    assert "b stands further off from run to run: -5.0 % of stroke held, -1.0 % a run over 5 runs; its fit is old" in said


@pytest.mark.parametrize("stood", [None, 5, {}, {"at_rest": [0.0]}, {"at_rest": [0.0, "x"], "held": [0.0, 1e300]}])
def test_ends_that_say_nonsense_of_how_fibers_stood_are_passed_over(tmp_path, monkeypatch, capsys, stood):
    monkeypatch.chdir(tmp_path)
    data = bytearray()
    log = RunLog(data.extend)
    log.tell("head", 0.0, fibers=["a", "b"], stroke=[0.3, 0.3], rate_Hz=100.0, lead_s=0.0, date="2026-01-01", fingerprint="0a")
    log.tell("end", 1.0, ended="end", exit=0, stood=stood)
    (tmp_path / "odd.log").write_bytes(data)
    last = kept("night.log", 1, 0.0)
    assert run(["report", last, "--json"]) == 0
    assert json.loads(capsys.readouterr().out)["drift"] == {"logs": [], "fibers": []}


def test_a_run_keeps_how_its_fibers_stood(log, capsys):
    capsys.readouterr()
    assert run(["report", log, "--json"]) == 0
    assert json.loads(capsys.readouterr().out)["drift"] == {"logs": [], "fibers": []}
    with open(log, "rb") as file:
        assert b'"stood":{"at_rest":[' in file.read()
