"""Takes on disk."""

import os
import signal
import subprocess
import sys
import time

import numpy as np
import pytest

from composer.faults import Faults
from player.takes.file import TakeFile, load_take, rig_of

PLAYING = """
import sys, time
import numpy as np
from composer.load import load_rig
from player.takes.file import TakeFile
take = TakeFile(sys.argv[1], load_rig("bench.rig.toml"))
print("playing", flush=True)
for k in range(1_000_000):
    now = 0.3 * min(1.0, 0.001 * k) * np.ones(4)
    take.sample(0.005 * k, now, now)
    time.sleep(0.0002)
"""


@pytest.fixture
def rig(tmp_path, monkeypatch, rig_text):
    from composer.load import load_rig

    monkeypatch.chdir(tmp_path)
    (tmp_path / "bench.rig.toml").write_text(rig_text)
    return load_rig("bench.rig.toml")


def test_a_take_is_read_back_from_its_file(rig):
    take = TakeFile("a.take", rig)
    for k in range(10):
        assert take.sample(0.005 * k, np.full(4, 0.02 * k), np.full(4, 0.01 * k))
    take.input(0.03, "box", "cc 1", 0.5)
    take.close()
    take.close()
    found = load_take("a.take")
    assert found.strain(found.governed, 3) == pytest.approx(0.01 * np.arange(10))
    assert (found.rig, found.complete) == ("bench.rig.toml", True)
    assert rig_of(found, "a.take", rig) is rig


def test_a_take_that_is_killed_can_be_read_up_to_there(rig):
    player = subprocess.Popen([sys.executable, "-c", PLAYING, "a.take"], stdout=subprocess.PIPE)
    try:
        assert player.stdout.readline() == b"playing\n"
        while os.path.getsize("a.take") < 20_000:
            time.sleep(0.01)
        os.kill(player.pid, signal.SIGKILL)
    finally:
        player.kill()
        player.wait()
        player.stdout.close()
    found = load_take("a.take")
    assert not found.complete and len(found.time_s) > 100
    assert found.strain(found.governed, 0) == pytest.approx(0.3 * np.minimum(1.0, 0.001 * np.arange(len(found.time_s))))


def test_a_take_is_never_written_over_a_file(rig, tmp_path):
    (tmp_path / "a.take").write_text("precious")
    with pytest.raises(Faults, match="never written over another"):
        TakeFile("a.take", rig)
    assert (tmp_path / "a.take").read_text() == "precious"
    with pytest.raises(Faults, match=r"nowhere/a\.take: cannot write"):
        TakeFile("nowhere/a.take", rig)


def test_a_take_of_another_rig_is_refused(rig, make_rig):
    TakeFile("a.take", rig).close()
    take = TakeFile("b.take", rig)
    take.sample(0.0, np.zeros(4), np.zeros(4))
    take.close()
    with pytest.raises(Faults, match="another rig"):
        rig_of(load_take("b.take"), "b.take", make_rig(4))
    with pytest.raises(Faults, match="not one whole sample"):
        load_take("a.take")
