"""`drawcord preflight`, as it is called, against simulated boards on pseudo-terminals."""

import json
import subprocess
import sys

import pytest

from player.commands.main import run


@pytest.fixture
def board(tmp_path, monkeypatch, rig_text):
    """A maker of simulated boards in a folder with a rig; returns the path of its terminal."""
    monkeypatch.chdir(tmp_path)
    (tmp_path / "bench.rig.toml").write_text(rig_text)
    started = []

    def make(*more):
        command = [sys.executable, "-m", "player.commands.main", "device", "bench.rig.toml", *more]
        started.append(subprocess.Popen(command, stdout=subprocess.PIPE, text=True))
        return started[-1].stdout.readline().strip()

    yield make
    for process in started:
        process.terminate()
        process.wait(10)
        process.stdout.close()


def test_a_board_in_order_passes_every_mark_and_is_left_disarmed(board, capsys):
    assert run(["preflight", "bench.rig.toml", "--to", f"serial:{board()}", "--json"]) == 0
    found = json.loads(capsys.readouterr().out)
    assert found["ok"] and all(mark["ok"] for mark in found["marks"])
    asked = " ".join(mark["asked"] for mark in found["marks"])
    for what in ("answers", "channels", "set up for this rig", "baud carry", "clock", "sensors are alive", "supply"):
        assert what in asked


def test_a_board_of_another_rig_is_marked_and_told_what_to_do(board, capsys):
    assert run(["preflight", "bench.rig.toml", "--to", f"serial:{board('--fault', 'wrong-rig')}"]) == 1
    said = capsys.readouterr().out
    assert "NO  main: it is set up for this rig" in said and "rig file that it has" in said and "Not ready" in said


def test_a_port_that_is_not_there_is_a_wrong_call(board, capsys):
    board_path = board()
    assert run(["preflight", "bench.rig.toml", "--to", "serial:/dev/no-such-port"]) == 2
    said = capsys.readouterr().err
    assert "no such port" in said and board_path in said


def test_a_simulated_rig_is_always_ready(board, capsys):
    board()
    assert run(["preflight", "bench.rig.toml", "--to", "sim"]) == 0
    assert capsys.readouterr().out.endswith("Ready to arm.\n")
