"""The simulated board in C: compiled by the machine's compiler into the user's cache, and run behind its pseudo-terminal."""

import hashlib
import os
import platform
import shutil
import signal
import subprocess
import sys
import tempfile
from contextlib import suppress
from pathlib import Path

from platformdirs import user_cache_dir

from composer.faults import fault
from player.wire.mishaps import STRIKES_AFTER_S

SOURCES = Path(__file__).parents[1] / "wire" / "device_c"
COMPILERS = ("cc", "gcc", "clang")
FLAGS = ("-std=c99", "-O2")
COMPILES_AT_MOST_S = 120.0

_AFTER = f"{STRIKES_AFTER_S:g}"
MISHAP_OPTIONS: dict[str, tuple[str, ...]] = {
    "mute": ("--mute",),
    "silent": ("--silent-after", _AFTER),
    "garbles": ("--garble", "10"),
    "garbles-much": ("--garble", "100"),
    "garbles-later": ("--garble", "100", "--garble-after", _AFTER),
    "noise-later": ("--garble", "1000", "--garble-after", _AFTER),
    "noise": ("--garble", "1000"),
    "loses": ("--lose", "10"),
    "cuts": ("--cut", "50"),
    "misreads": ("--misread-after", _AFTER),
    "echoes": ("--echo",),
    "late-answers": ("--late-ms", "700"),
    "resets": ("--reset-after", _AFTER),
    "full-queue": ("--room", "1"),
    "over-pressure": ("--over-pressure-after", _AFTER),
    "sensor": ("--sensor-after", _AFTER),
    "wrong-rig": (),
    "few-channels": (),
    "slow-clock": ("--clock-ppm", "-10000"),
    "fast-clock": ("--clock-ppm", "10000"),
    "jumping-clock": ("--jump-after", _AFTER),
    "stuck-valve": ("--stuck-valve-after", _AFTER),
    "railed": ("--railed-after", _AFTER),
    "leak": ("--leak-after", _AFTER),
    "low-supply": ("--low-supply-after", _AFTER),
}
"""How each row of MISHAPS is said to the board in C; those without options are said by what the board is."""


def compiled(channels: int, cache: Path | None = None) -> Path:
    """The program for boards of so many channels, compiled unless it is in the cache already.

    Raises Faults where there is no compiler, where it fails, or where the cache cannot be written.
    """
    compiler = next((found for name in COMPILERS if (found := shutil.which(name))), None)
    if compiler is None:
        raise fault(
            "--portable",
            "no C compiler on this machine",
            f"one of {', '.join(COMPILERS)}",
            "install one (gcc is in every distribution), or leave --portable out: then the board runs in Python",
        )
    sources = sorted(SOURCES.glob("*.c")) + sorted((SOURCES / "posix").glob("*.c"))
    headers = sorted(SOURCES.glob("*.h")) + sorted((SOURCES / "posix").glob("*.h"))
    call = [compiler, *FLAGS, f"-DDC_CHANNELS={channels}", f"-I{SOURCES}", *map(str, sources), "-lpthread"]
    known = hashlib.sha256(repr((call, platform.platform())).encode())
    for source in sources + headers:
        known.update(source.read_bytes())
    folder = cache or Path(user_cache_dir("drawcord"))
    program = folder / f"board-{known.hexdigest()[:16]}"
    if program.exists():
        return program
    try:
        folder.mkdir(parents=True, exist_ok=True)
        # Beside its place, then renamed: of two that compile at once, each finds a whole program.
        handle, made = tempfile.mkstemp(dir=folder, prefix="making-")
        os.close(handle)
    except OSError as error:
        raise fault(str(folder), f"the compiled board cannot be kept there: {error.strerror}", "a folder to write in") from None
    try:
        done = subprocess.run([*call, "-o", made], capture_output=True, text=True, errors="replace", timeout=COMPILES_AT_MOST_S)
        if done.returncode:
            first = next((line for line in done.stderr.splitlines() if "error" in line), done.stderr[:300])
            raise fault("--portable", f"{compiler} does not compile the board: {first}", "a C99 compiler and POSIX threads")
        os.chmod(made, 0o755)
        os.replace(made, program)
    except subprocess.TimeoutExpired:
        raise fault("--portable", f"{compiler} took more than {COMPILES_AT_MOST_S:g} s", "a compiler that ends") from None
    finally:
        with suppress(OSError):
            os.unlink(made)
    return program


class PortableBoard:
    """The program running; `path` is the terminal that a player opens. `run` lives until `stop` is called or the program ends.

    plant: the text of its parameters; log: a path, or None; options: what goes wrong on purpose
    """

    def __init__(self, program: Path, plant: str, log: str | None, options: tuple[str, ...]):
        with tempfile.NamedTemporaryFile("w", encoding="utf-8", prefix="drawcord-plant-", suffix=".txt") as file:
            file.write(plant)
            file.flush()
            call = [str(program), "--plant", file.name, "--parent", str(os.getpid()), *options]
            self._process = subprocess.Popen(
                [*call, "--log", log] if log is not None else call, stdin=subprocess.DEVNULL, stdout=subprocess.PIPE, text=True
            )
            # It prints its path once it has read the file and is ready.
            self.path = self._process.stdout.readline().strip()
        if not self.path:
            raise fault("--portable", f"the board ended at once, with code {self._process.wait(10.0)}", "a board that runs")

    def stop(self) -> None:
        """End `run` soon, every channel vented."""
        with suppress(ProcessLookupError):
            self._process.send_signal(signal.SIGTERM)

    def run(self) -> int:
        """Wait until it has ended; returns 0, or 1 where it did not end by being asked to."""
        code = self._process.wait()
        if code:
            print(f"the board ended by itself, with code {code}", file=sys.stderr)
        return int(code != 0)
