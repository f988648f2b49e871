"""A JACK server of one's own with its dummy driver, and a sender in a process of its own that knows nothing but mido."""

import os
import shutil
import subprocess
import sys
import time
from collections.abc import Iterator
from contextlib import contextmanager

SENDER = """
import sys, time
import mido
mido.set_backend("mido.backends.rtmidi/UNIX_JACK")
port = mido.open_output("faders", virtual=True, client_name=sys.argv[1])
lights = mido.open_input("lights", virtual=True, client_name=sys.argv[1] + "-in")
print("ready", flush=True)
for line in sys.stdin:
    words = line.split()
    if words[0] == "heard":
        print(lights.receive().hex(), flush=True)
        continue
    if words[0] == "timecode":
        # Code, frames a second as numerator and denominator, numbers in a second, the first label, quarter frames.
        code, top, under, numbers, h, m, s, f, quarters = map(int, words[1:])
        begin = time.perf_counter()
        for quarter in range(quarters):
            piece = quarter % 8
            if piece == 0:
                values = (f & 15, f >> 4, s & 15, s >> 4, m & 15, m >> 4, h & 15, h >> 4 | code << 1)
            while time.perf_counter() < begin + quarter * under / (4 * top):
                pass
            port.send(mido.Message("quarter_frame", frame_type=piece, frame_value=values[piece]))
            if piece in (3, 7):
                f += 1
                if f == numbers:
                    f, s = 0, s + 1
                    if s == 60:
                        s, m = 0, m + 1
                        if m == 60:
                            m, h = 0, h + 1
                        if code == 2 and m % 10:
                            f = 2
        print(begin, flush=True)
        continue
    if words[0] == "clock":
        count, period = int(words[1]), float(words[2])
        start = time.perf_counter()
        for number in range(count):
            while time.perf_counter() < start + number * period:
                pass
            port.send(mido.Message("clock"))
    else:
        for message in mido.parse_all(bytes.fromhex(line)):
            port.send(message)
    print("sent", flush=True)
port.close()
lights.close()
"""


def is_jack_there() -> bool:
    """Whether this machine has a JACK server to start."""
    return shutil.which("jackd") is not None


@contextmanager
def server(name: str, frames: int = 256, priority: int = 0) -> Iterator[str]:
    """A server of that name while the block runs; clients of this process and of those that it starts find it.

    frames: of a period, at 48 kHz; priority: real-time, of the server's threads and about that of its clients', 0 for none
    """
    was = os.environ.get("JACK_DEFAULT_SERVER")
    os.environ["JACK_DEFAULT_SERVER"] = name
    first = ["-R", "-P", str(priority)] if priority else ["-r"]
    command = ["jackd", *first, "-S", "-n", name, "-d", "dummy", "-r", "48000", "-p", str(frames)]
    with subprocess.Popen(command, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL) as process:
        try:
            yield name
        finally:
            process.terminate()
            try:
                process.wait(5)
            except subprocess.TimeoutExpired:
                process.kill()
            if was is None:
                del os.environ["JACK_DEFAULT_SERVER"]
            else:
                os.environ["JACK_DEFAULT_SERVER"] = was


class Sender:
    """The other process, a client of the JACK server with one port to send from and one to hear."""

    def __init__(self, client: str):
        self._process = subprocess.Popen(
            [sys.executable, "-c", SENDER, client],
            stdin=subprocess.PIPE, stdout=subprocess.PIPE, stderr=subprocess.DEVNULL, text=True,
        )  # fmt: skip
        assert self._process.stdout.readline() == "ready\n"

    def send(self, line: str) -> None:
        """Bytes in hex, or "clock COUNT PERIOD"; returns when they are sent."""
        self._process.stdin.write(line + "\n")
        self._process.stdin.flush()
        assert self._process.stdout.readline() == "sent\n"

    def timecode(
        self, code: int, per_s: tuple[int, int], numbers: int, label: tuple[int, int, int, int], seconds: float
    ) -> float:
        """Time code for so many seconds; returns once it is sent, with the monotonic time of its first quarter frame."""
        top, under = per_s
        self._process.stdin.write(
            f"timecode {code} {top} {under} {numbers} {' '.join(map(str, label))} {int(4 * seconds * top / under)}\n"
        )
        self._process.stdin.flush()
        return float(self._process.stdout.readline())

    def heard(self) -> str:
        """The next message that came to its other port, in hex; waits for it."""
        self._process.stdin.write("heard\n")
        self._process.stdin.flush()
        return self._process.stdout.readline().strip()

    def close(self) -> None:
        """End it, and with it its port."""
        self._process.stdin.close()
        self._process.wait(10)
        self._process.stdout.close()


def until(true, poll, seconds: float = 20.0) -> None:
    """Poll until something is true; the time is only there so that a failure ends."""
    end = time.monotonic() + seconds
    while not true():
        assert time.monotonic() < end, "it did not come to pass"
        poll()
        time.sleep(0.01)
