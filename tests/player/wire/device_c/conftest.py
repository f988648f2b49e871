"""The device in C, compiled with a driver that plays scripts to it: as a board would compile it, and with every check on."""

import shutil
import subprocess
from importlib.resources import files
from pathlib import Path

import pytest

SOURCES = Path(str(files("player.wire") / "device_c"))
STRICT = ("-std=c99", "-pedantic", "-Wall", "-Wextra", "-Werror")
BUILDS = {
    "plain": ("-O2",),
    "checked": ("-O1", "-g", "-fsanitize=address,undefined", "-fno-sanitize-recover=all"),
}
CHANNELS = 1100
"""More than one frame of sense carries."""


class Driver:
    """One build of the device: a script in, what the device did out."""

    def __init__(self, path: Path):
        self._path = path

    def __call__(self, script: bytes) -> bytes:
        done = subprocess.run([self._path], input=script, capture_output=True, timeout=600)
        assert done.returncode == 0, done.stderr.decode()[-3000:]
        return done.stdout


@pytest.fixture(scope="session")
def compiler() -> str:
    """The machine's C compiler."""
    found = shutil.which("gcc") or shutil.which("cc")
    assert found, "the tests of the device in C want a C compiler: gcc or cc"
    return found


@pytest.fixture(scope="session", params=BUILDS)
def build(request) -> str:
    """Each way to compile it."""
    return request.param


@pytest.fixture(scope="session")
def driver(build, compiler, tmp_path_factory) -> Driver:
    """The device and its driver, compiled one way."""
    made = tmp_path_factory.mktemp(build) / "driver"
    sources = [str(SOURCES / name) for name in ("device.c", "frames.c")] + [str(Path(__file__).parent / "driver.c")]
    call = [compiler, *STRICT, *BUILDS[build], f"-DDC_CHANNELS={CHANNELS}", f"-I{SOURCES}", *sources, "-o", str(made)]
    done = subprocess.run(call, capture_output=True, text=True, timeout=120)
    assert done.returncode == 0, done.stderr
    assert done.stderr == ""
    return Driver(made)
