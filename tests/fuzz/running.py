"""Inputs thrown at a reader: what it raises beyond its own faults is kept, once for each place that raised it."""

import resource
import signal
import traceback
from collections.abc import Callable, Sequence
from contextlib import contextmanager
from dataclasses import dataclass, field
from pathlib import Path
from random import Random
from time import process_time

from .mutations import mutated_bytes

MOST_FOUND = 25

HANGS_S = 30.0
"""Of the processor: what takes longer is interrupted, whatever an input asks for."""


class Hangs(BaseException):
    """An input has been worked on for too long; no reader catches it by accident."""


@dataclass(frozen=True, slots=True)
class Target:
    """Something that reads what may be hostile.

    make: given a folder of its own, good inputs and the reader; refusals: what the reader may raise
    short: inputs in the normal suite; mutate: how bad inputs are made of good ones; longest_s: of the processor, for one input
    each_s: of the processor as well, for each of what an input asks for, where the reader returns how many these are
    """

    name: str
    make: Callable[[Path], tuple[Sequence[bytes], Callable[[bytes], object]]]
    refusals: tuple[type[Exception], ...]
    short: int
    mutate: Callable[[Random, Sequence[bytes]], bytes] = mutated_bytes
    longest_s: float = 1.0
    each_s: float = 0.0


@dataclass(slots=True)
class Found:
    """What came of many inputs: how many there were and how many were refused, and the inputs that broke something."""

    inputs: int = 0
    refused: int = 0
    broken: dict[str, bytes] = field(default_factory=dict)

    def told(self, folder: Path) -> str:
        """What broke, each input written into the folder for the corpus."""
        lines = []
        for number, (why, data) in enumerate(self.broken.items(), 1):
            path = folder / f"found-{number}"
            path.write_bytes(data)
            lines.append(f"{path}: {why}")
        return "\n".join(lines)


def attempt(read: Callable[[bytes], object], refusals: tuple[type[Exception], ...], data: bytes) -> str | None:
    """Read one input: "" where it was taken, None where it was refused as it should be, else what broke and where."""
    try:
        read(data)
    except refusals:
        return None
    except (Exception, Hangs) as broke:
        trace = traceback.extract_tb(broke.__traceback__)
        ours = [frame for frame in trace if "/tests/" not in frame.filename] or list(trace)
        # A hang is where it is; so is a recursion, whose last frame is any of its own.
        last = ours[min(4, len(ours) - 1)] if isinstance(broke, Hangs | RecursionError) else ours[-1]
        return f"{type(broke).__name__} at {Path(last.filename).name}:{last.lineno}: {str(broke)[:200]}"
    return ""


def fuzz(target: Target, folder: Path, inputs: int, seed: int, alarm: bool = False) -> Found:
    """Throw so many inputs at a target; with `alarm` one that takes longer than it may is broken too."""
    examples, read = target.make(folder)
    chance, found = Random(f"{target.name} {seed}"), Found()
    for example in examples:
        # A reader that refuses the good ones is not tested by bad ones.
        why = attempt(read, (), example)
        assert why == "", f"a good input of {target.name}: {why}"
    for _ in range(inputs):
        data = target.mutate(chance, examples)
        why = in_time(target, read, data) if alarm else attempt(read, target.refusals, data)
        found.inputs += 1
        found.refused += why is None
        if why:
            found.broken.setdefault(why.split(": ")[0], data)
            if len(found.broken) >= MOST_FOUND:
                break
    return found


def in_time(target: Target, read: Callable[[bytes], object], data: bytes) -> str | None:
    """As `attempt`; an input that takes longer than it may has broken something too."""
    asked = 0

    def reading(data: bytes) -> None:
        nonlocal asked
        said = read(data)
        asked = int(said) if target.each_s and said else 0

    begun = process_time()
    with watched(HANGS_S if target.each_s else target.longest_s):
        why = attempt(reading, target.refusals, data)
    took, may = process_time() - begun, target.longest_s + asked * target.each_s
    if why or (why == "" and took <= may):
        return why
    return None if took <= may else f"Slow at {target.name}: {took:.2f} s, and may take {may:.2f} s"


@contextmanager
def watched(longest_s: float):
    """Interrupt what takes longer than that of this process's time on the processor; 0: nothing is interrupted."""

    def ring(number, frame):
        raise Hangs(f"longer than {longest_s:g} s")

    was = signal.signal(signal.SIGVTALRM, ring)
    signal.setitimer(signal.ITIMER_VIRTUAL, longest_s)
    try:
        yield
    except Hangs:
        pass
    finally:
        signal.setitimer(signal.ITIMER_VIRTUAL, 0.0)
        signal.signal(signal.SIGVTALRM, was)


def resident_KiB() -> int:
    """Memory of this process that is in the machine's now; the most that there was where the system tells no better."""
    try:
        return int(Path("/proc/self/statm").read_text().split()[1]) * resource.getpagesize() // 1024
    except OSError:
        return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
