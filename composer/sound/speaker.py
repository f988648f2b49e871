"""The way to the machine's audio: a program of the system that plays what is written to it, where there is one."""

import os
import shutil
import subprocess
from contextlib import suppress

from composer.sound.clicks import RATE_HZ

TOOLS: tuple[tuple[str, ...], ...] = (
    ("paplay", "--raw", f"--rate={RATE_HZ}", "--format=s16le", "--channels=1", "--latency-msec=60"),
    ("aplay", "-q", "-t", "raw", "-f", "S16_LE", "-r", str(RATE_HZ), "-c", "1", "--buffer-time=80000", "-"),
)
"""Programs that play raw samples from their input, the first that is there is taken; a further one is one row."""


def tool() -> tuple[str, ...] | None:
    """The command that plays sound here, None where there is none."""
    return next((each for each in TOOLS if shutil.which(each[0])), None)


class Speaker:
    """Plays samples, 16 bits, one channel, as they are written; never waits, never complains where there is no sound."""

    def __init__(self) -> None:
        self._playing: subprocess.Popen[bytes] | None = None

    @property
    def open(self) -> bool:
        """Whether what is written is played."""
        return self._playing is not None and self._playing.poll() is None

    def start(self) -> bool:
        """Begin to play; false where there is nothing to play with."""
        self.stop()
        command = tool()
        if command is None:
            return False
        try:
            self._playing = subprocess.Popen(
                command, stdin=subprocess.PIPE, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL, start_new_session=True
            )
        except OSError:
            return False
        os.set_blocking(self._playing.stdin.fileno(), False)
        return True

    def write(self, samples: bytes) -> bool:
        """Play these next; false, and all is closed, where they are not taken."""
        if self._playing is None:
            return False
        try:
            taken = os.write(self._playing.stdin.fileno(), samples)
        except OSError:
            taken = -1
        if taken != len(samples):
            self.stop()
            return False
        return True

    def stop(self) -> None:
        """Be silent at once."""
        playing, self._playing = self._playing, None
        if playing is None:
            return
        with suppress(OSError):
            playing.kill()
        with suppress(OSError):
            playing.stdin.close()
        playing.wait()
