"""A run's process: forked, or begun anew where threads run; its welcome, its end, and its life without a front end."""

import os
import subprocess
import sys
import threading
import time
from pathlib import Path

import pytest

from player.engine.process.start import start

ABOUT = {"played": "bench.score", "title": "Bench piece", "fibers": ["r.1", "r.2"], "boards": ["main"]}
PATIENCE_S = 60.0


@pytest.fixture(params=["forked", "begun anew"])
def way(request, monkeypatch):
    """Both ways in which a process comes about; the tests' own threads count as threads."""
    if request.param == "forked":
        monkeypatch.setattr(threading, "active_count", lambda: 1)
        yield request.param
        return
    ends = threading.Event()
    thread = threading.Thread(target=ends.wait)
    thread.start()
    # Where this file lies no program looks for modules; a body of a command is found by itself.
    monkeypatch.setenv("PYTHONPATH", str(Path(__file__).parent))
    monkeypatch.setattr(sys, "path", [str(Path(__file__).parent), *sys.path])
    yield request.param
    ends.set()
    thread.join()


def body(name):
    """The body as a module finds it that has no package."""
    sys.path.insert(0, str(Path(__file__).parent))
    try:
        import bodies as found
    finally:
        sys.path.pop(0)
    return getattr(found, name)


def last_of(client):
    end = time.monotonic() + PATIENCE_S
    while time.monotonic() < end:
        for name, fields in client.hear(0.1):
            if name in ("ended", "failed"):
                return name, fields
        if client.gone:
            return None
    raise AssertionError("the run did not end")


def test_a_run_is_a_process_and_a_session_of_its_own_and_commanded_by_its_starter(way):
    client = start(body("echoes"), ABOUT, "rest", "a word")
    assert client.commands and client.about == ABOUT and client.run == f"bench-{client.pid}"
    assert client.pid != os.getpid()
    while client.snapshot().count < 2:
        pass
    assert client.snapshot().number("position_s") == 4.5
    client.say("stop")
    name, fields = last_of(client)
    told = fields["report"]
    assert (name, told["word"], told["pid"], told["session"]) == ("ended", "a word", client.pid, client.pid)
    assert told["out"] == "nowhere"
    client.close()


def test_a_run_outlives_the_front_end_that_started_it_and_knows_its_rule(way, tmp_path):
    client = start(body("outlives"), ABOUT, "go-on", str(tmp_path / "seen"))
    client.close()
    end = time.monotonic() + PATIENCE_S
    while not (tmp_path / "seen").exists() or not (tmp_path / "seen").read_text():
        assert time.monotonic() < end
        time.sleep(0.01)
    assert (tmp_path / "seen").read_text() == "go-on False"


def test_what_is_wrong_with_a_file_is_told_to_the_front_end_in_its_words(way):
    client = start(body("wrong"), ABOUT, "rest")
    name, fields = last_of(client)
    assert (name, fields["exit"]) == ("failed", 2) and "bench.rig.toml: it has no fibers" in fields["lines"][0]
    client.close()


def test_a_fault_of_its_own_is_no_traceback(way, monkeypatch):
    monkeypatch.delenv("DRAWCORD_TRACEBACK", raising=False)
    client = start(body("broken"), ABOUT, "rest")
    name, fields = last_of(client)
    assert (name, fields["exit"]) == ("failed", 2)
    assert "a fault of its own: ZeroDivisionError" in fields["lines"][0] and "Traceback" not in "".join(fields["lines"])
    client.close()


def test_a_run_that_is_killed_is_seen_to_be_gone(way):
    client = start(body("killed"), ABOUT, "rest")
    assert last_of(client) is None and client.gone and not client.is_there()
    assert client.say("vent") is False
    client.close()


def test_the_starters_end_does_not_end_the_run(tmp_path):
    seen = tmp_path / "seen"
    script = f"""
import os, sys
sys.path.insert(0, {str(Path(__file__).parent)!r})
import bodies
from player.engine.process.start import start
client = start(bodies.outlives, {ABOUT!r}, "rest", {str(seen)!r})
print(client.pid, flush=True)
os.kill(os.getpid(), 9)
"""
    done = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, timeout=PATIENCE_S)
    assert done.returncode == -9 and int(done.stdout) > 0
    end = time.monotonic() + PATIENCE_S
    while not seen.exists() or not seen.read_text():
        assert time.monotonic() < end
        time.sleep(0.01)
    assert seen.read_text() == "rest False"
