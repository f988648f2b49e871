"""The window killed -9 at random moments, also in mid-save: no edit is lost, and the score's file is always whole."""

import os
import random
import signal
import subprocess
import sys
import time

import pytest

from composer.editor import disk
from tests.composer.editor import typist

SHORT, LONG = 20, 100
"""Random moments: in every run of the tests, and in the long form (-m soak)."""


@pytest.mark.timeout(600)
@pytest.mark.parametrize("moments", [SHORT, pytest.param(LONG, marks=pytest.mark.soak)])
def test_killed_at_random_moments_not_one_edit_is_lost(tmp_path, moments):
    environment = {**os.environ, "QT_QPA_PLATFORM": "offscreen"}
    forks = subprocess.Popen(
        [sys.executable, typist.__file__], stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True, env=environment
    )
    dice = random.Random(1)
    lost, typed, in_mid_save = [], 0, 0
    for seed in range(moments):
        folder = tmp_path / str(seed)
        folder.mkdir()
        score, done = folder / "a.score", folder / "done"
        score.write_text(typist.START)
        print(folder, seed, file=forks.stdin, flush=True)
        child = int(forks.stdout.readline())
        begun = time.monotonic()
        while not (done.exists() and done.stat().st_size) and time.monotonic() - begun < 60.0:
            time.sleep(0.002)
        time.sleep(dice.random() * 0.25)
        os.kill(child, signal.SIGKILL)
        while os.path.exists(f"/proc/{child}"):
            time.sleep(0.001)
        count = int(done.read_text().split()[-1])
        in_mid_save += any(name.endswith(".part") for name in os.listdir(folder))
        # The edit after the last one told of may be there already.
        after = typist.texts(seed, count + 1)
        saved = score.read_text()
        assert saved in after, f"moment {seed}: the score's file is none of the texts that were typed"
        left = [read.text for _, read in disk.left_behind([disk.recovery_path(str(score))])]
        best = max(after.index(text) for text in [saved, *left] if text in after)
        typed += count
        if best < count:
            lost.append((seed, count - best))
    forks.stdin.close()
    forks.wait(10)
    print(f"{typed} edits, {in_mid_save} moments in mid-save")
    assert lost == []
    assert typed > 10 * moments
