"""The benches, how each is run in full and small, and every target that Drawcord is held to: one table for report.py."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Bench:
    """A script beside this file. full, small: its arguments, FOLDER a folder of its own; small None: run in full alone."""

    name: str
    script: str
    full: tuple[str, ...] = ()
    small: tuple[str, ...] | None = ("--small",)


@dataclass(frozen=True, slots=True)
class Target:
    """Something that a bench finds, and what it is held to.

    says: finds the figures in what the bench prints; of: which of them it is; small: whether a small run says it too
    """

    what: str
    bench: str
    says: str
    holds: str
    bound: float
    unit: str = ""
    of: Callable[[Sequence[float]], float] = max
    small: bool = True


def last(values: Sequence[float]) -> float:
    """The one that was said last."""
    return values[-1]


def first(values: Sequence[float]) -> float:
    """The one that was said first."""
    return values[0]


BENCHES = (
    Bench("starting", "starting"),
    Bench("reading", "reading"),
    Bench("expansion", "expansion"),
    Bench("checking", "checking"),
    Bench("retiming", "retiming"),
    Bench("retiming-million", "retiming", ("--million",), None),
    Bench("retiming-growth", "retiming_growth", ("--to", "FOLDER/growth.png"), ("--most", "3000", "--to", "FOLDER/growth.png")),
    Bench("physics", "physics"),
    Bench("landing", "landing", (), ("--scores", "gannet", "--rigs", "0")),
    Bench("fitting", "fitting", (), ("1",)),
    Bench("governor", "governor"),
    Bench("inputs", "inputs"),
    Bench("takes", "takes", ("10", "--exact"), ("0.2",)),
    Bench("edits", "edits"),
    Bench("cloth", "cloth"),
    Bench("compose", "compose", ("--threads", "4096", "--moves", "1000000")),
    Bench("filming", "filming", (), ("0.5",)),
    Bench("rehearse-vent", "rehearse", ("vent",), ("vent", "--small")),
    Bench("rehearse-frames", "rehearse", ("frames",), ("frames", "--small")),
    Bench("rehearse-engine", "rehearse", ("engine", "--pairs", "5"), ("engine", "--small")),
    Bench("clocks", "clocks", (), ("--lines", "4", "--seconds", "20")),
    Bench("following", "following", (), ("--short",)),
    Bench("wire", "wire", ("--portable",), ("--portable", "--seconds", "2")),
    Bench("lateness", "lateness", (), ("--seconds", "4")),
    Bench("many", "many", (), ("--seconds", "2")),
    Bench("soak", "soak", (), ("--virtual-minutes", "0.2", "--minutes", "0.05")),
    Bench("hand-to-wire-midi", "hand_to_wire", ("midi",), None),
    Bench("hand-to-wire-osc", "hand_to_wire", ("osc",), ("osc", "--jumps", "6")),
)

_ROW = r"^\s*\d+\s+\d+\s+"

TARGETS = (
    Target("--help over a Python that imports argparse", "starting", r"argparse = ([\d.]+)", "at most", 3.0),
    Target("checking: cost a move, most over fewest moves", "checking", _ROW + r"[\d.]+\s+([\d.]+)\s", "at most", 2.0, of=last),
    Target("expansion: cost a move, most over fewest moves", "expansion", _ROW + r"\w+\s+[\d.]+\s+([\d.]+)", "at most", 2.0),
    Target("retiming over one whole solve by HiGHS", "retiming", r"ours / whole solve = ([\d.]+)", "at most", 0.2),
    Target("retiming: cost apart from the whole solve's", "retiming", r"apart ([\d.e+-]+)", "at most", 1e-6),
    Target(
        "retiming again after an edit, over the first",
        "retiming",
        r"edit of Estuary / first retiming = ([\d.]+)",
        "at most",
        0.1,
    ),
    Target("retiming where coils bind, over plenty", "retiming", r"duty: ([\d.]+) x", "at most", 3.0),
    Target("retiming where air binds, over plenty", "retiming", r"air: ([\d.]+) x", "at most", 3.0),
    Target("one path: toppra over retiming", "retiming", r"toppra / ours = ([\d.]+)", "at least", 20.0),
    Target("10⁶ moves over one whole solve of 33 000", "retiming-million", r"33 000 moves = ([\d.]+)", "at most", 10.0),
    Target("10⁶ moves: memory", "retiming-million", r"at most ([\d.]+) GB", "at most", 2.0, "GB"),
    Target("rate tables of many fibers over those of their 16 makes", "physics", r"over 16 fibers: ([\d.]+)", "at most", 2.0),
    Target("simulated rig over real time, 48 fibers", "physics", r"rig, 48 fibers at 500 Hz: ([\d.]+)", "at least", 20.0),
    Target("simulated rig over real time, 512 fibers", "physics", r"rig, 512 fibers at 500 Hz: ([\d.]+)", "at least", 2.0),
    Target("LSODA over the simulated rig", "physics", r"48 fibers as one: ([\d.]+)", "at least", 50.0),
    Target("simulated rig: strain apart from LSODA's", "physics", r"difference of strain: ([\d.]+)", "at most", 1.0, "%"),
    Target("checking modelled fibers over rated ones", "physics", r"over rated ones: ([\d.]+)", "at most", 3.0),
    Target("governor, 48 fibers: a tick", "governor", r"^(?:Estuary, )?48.*µs\s+([\d.]+) µs", "at most", 100.0, "µs"),
    Target("governor, 4096 fibers: a tick", "governor", r"^4096.*µs\s+([\d.]+) µs", "at most", 1000.0, "µs"),
    Target("a take of 48 fibers, 10 minutes, as a score", "takes", r"faders.*min: ([\d.]+) s", "at most", 10.0, "s"),
    Target("a take: knots over the fewest", "takes", r"places \(([\d.]+) times", "at most", 1.1, small=False),
    Target(
        "cloth: frames a second of many threads",
        "cloth",
        r"second, ([\d.]+) by",
        "at least",
        30.0,
        "/s",
        lambda all: min(all[5:]),
    ),
    Target("cloth: memory", "cloth", r"peak of memory: ([\d.]+)", "at most", 1.5, "GB"),
    Target("compose window over an empty one", "compose", r"with a plot: ([\d.]+)", "at most", 1.5),
    Target("compose: a key's echo, p95", "compose", r"echo\s+[\d.]+\s+([\d.]+) ms", "at most", 16.0, "ms"),
    Target("compose: a key's cloth, p95", "compose", r"cloth\s+[\d.]+\s+([\d.]+) ms", "at most", 100.0, "ms"),
    Target("compose: check and retiming, p95", "compose", r"retiming\s+[\d.]+\s+([\d.]+) ms", "at most", 300.0, "ms"),
    Target("a movie at 720p over its length", "filming", r"all ([\d.]+) of the movie", "at most", 1.0),
    Target("512 hanging fibers: a frame over a thirtieth of a second", "filming", r"a frame takes ([\d.]+)", "at most", 1.0),
    Target("VENT, from the key to the wire, p99, over 20 ms", "rehearse-vent", r"p99 is ([\d.]+) times", "at most", 1.0),
    Target("rehearse: 512 fibers, frames over 30 a second", "rehearse-frames", r"([\d.]+) times 30;", "at least", 1.0),
    Target("ticks late, p99.9, with the window over without", "rehearse-engine", r"middle of \d+: ([\d.]+)", "at most", 1.2),
    Target("a board's clock is known to", "clocks", r"off by .*100 %: ([\d.]+) us", "at most", 200.0, "µs"),
    Target(
        "a followed clock's tempo after 4 counts, off by", "following", r"tempo .*100 %: ([\d.]+) percent", "at most", 0.2, "%"
    ),
    Target("hits under a followed clock, off by", "following", r"hits land .*100 %: ([\d.]+) ms", "at most", 3.0, "ms"),
    Target("sets late at a board in C", "wire", r"(\d+) came after their due", "at most", 0.0, "sets"),
    Target("ticks late, p99.9, a busy process beside", "lateness", r"player: .*99.9 %: ([\d.]+)", "at most", 1.0, "ms", first),
    Target("valves late, p99.9", "lateness", r"valves: .*99.9 %: ([\d.]+)", "at most", 200.0, "µs", first),
    Target("sets late at the valves", "lateness", r"(\d+) sets came too late", "at most", 0.0, "sets", first),
    Target(
        "sets late, the player stopped 50 ms each second", "lateness", r"(\d+) sets came too late", "at most", 0.0, "sets", last
    ),
    Target("4096 channels to sim at 100 Hz: of a core", "many", r"4096 fibers to sim.*: ([\d.]+) % of", "at most", 25.0, "%"),
    Target("512 fibers over 8 lines: ticks late, p99.9", "many", r"player: .*99.9 %: ([\d.]+)", "at most", 1.0, "ms"),
    Target("memory grown over an hour in virtual time", "soak", r"to the last \+?(-?[\d.]+) %", "at most", 1.0, "%", first),
    Target("memory grown over ten minutes in real time", "soak", r"to the last \+?(-?[\d.]+) %", "at most", 1.0, "%", last),
    Target("log over wire, bytes", "soak", r": ([\d.]+) times as much", "at most", 2.0),
    Target("MIDI in to wire out, p99 over a tick and 2 ms", "hand-to-wire-midi", r": ([\d.]+) times that", "at most", 1.0),
    Target("OSC in to wire out, p99 over a tick and 2 ms", "hand-to-wire-osc", r": ([\d.]+) times that", "at most", 1.0),
)
