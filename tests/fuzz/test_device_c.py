"""The device in C under hostile conversations, compiled with every check that the compiler has: it breaks at none."""

import subprocess
from importlib.resources import files
from pathlib import Path
from random import Random

import pytest

from .streams import CHANNELS, conversations, hostile_c, script_of

SOURCES = Path(str(files("player.wire") / "device_c"))
DRIVER = Path(__file__).parents[1] / "player" / "wire" / "device_c" / "driver.c"
CHECKS = ("-std=c99", "-O1", "-g", "-fsanitize=address,undefined", "-fno-sanitize-recover=all")
SHORT, BATCH = 1000, 2000
CORPUS = Path(__file__).parent / "corpus" / "device-c"


@pytest.fixture(scope="module")
def driver(tmp_path_factory) -> Path:
    """The device and its driver, checked at every access and every sum."""
    made = tmp_path_factory.mktemp("checked") / "driver"
    sources = [str(SOURCES / "device.c"), str(SOURCES / "frames.c"), str(DRIVER)]
    call = ["cc", *CHECKS, f"-DDC_CHANNELS={CHANNELS}", f"-I{SOURCES}", *sources, "-o", str(made)]
    done = subprocess.run(call, capture_output=True, text=True, timeout=120)
    assert done.returncode == 0, done.stderr
    return made


def played(driver: Path, script: bytes) -> bytes:
    done = subprocess.run([driver], input=script, capture_output=True, timeout=600)
    assert done.returncode == 0, done.stderr.decode(errors="replace")[-3000:]
    return done.stdout


def test_hostile_conversations_break_nothing_in_the_device_in_c(driver, seed):
    chance = Random(f"device-c {seed}")
    said = played(driver, b"".join(hostile_c(chance) for _ in range(SHORT)))
    # Every script begins with a device that says so; the last one, played alone, says what it said as one of many.
    assert said.count(b"V") > SHORT
    last = script_of(conversations()[0])
    assert played(driver, b"".join(hostile_c(chance) for _ in range(5)) + last).endswith(played(driver, last))


@pytest.mark.soak
@pytest.mark.timeout(0)
def test_a_million_hostile_conversations_break_nothing_in_the_device_in_c(driver, long_inputs, seed):
    chance, done = Random(f"device-c long {seed}"), 0
    while done < long_inputs:
        count = min(BATCH, long_inputs - done)
        assert played(driver, b"".join(hostile_c(chance) for _ in range(count)))
        done += count
    print(f"device-c: {done} inputs")


def test_good_conversations_and_what_once_broke_it_are_played_to_their_end(driver):
    for script in (*map(script_of, conversations()), *(path.read_bytes() for path in sorted(CORPUS.glob("*")))):
        assert played(driver, script)
