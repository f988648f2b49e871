"""`drawcord report`, as it is called."""

import json

import pytest

from player.commands.main import run


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
    assert run(["report", log]) == 0
    said = capsys.readouterr().out
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
