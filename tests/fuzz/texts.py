"""What people write, as targets: scores, rigs, maps, bench data."""

import re
from collections.abc import Callable, Sequence
from functools import cache
from pathlib import Path
from random import Random

from composer.faults import Faults
from composer.files import read_text
from composer.fit.reading import read_bench
from composer.limits.abilities import abilities_of
from composer.limits.check import check
from composer.load import load_rig, load_score, made_from
from composer.report.check import as_text
from composer.report.sentences import Teller
from composer.rig.select import Selector
from composer.score.names import groups_of
from composer.score.reading import parse_score
from composer.tracks import Tracks
from player.inputs.map_file import read_map

from .mutations import mutated_text
from .running import Target

EVERYTHING = b"""\
title "All of it"
rig gannet.rig.toml
meter 4/4
meter 3/4 at 4:1
tempo 72
tempo 72 to 96 from 5:1 to 9:1
group high = left.*
keep rhythm
pin 3:1 every 4 until 11:1 within 1/4
cue "dive" at 2:1 wait
phrase surge 9
  0 rest
  2 full swell
  3 50% linear
  5 0.9 smooth over 1
  6 0.3 sudden
  7 0.4 curve 0.3 0.5 hold full
  8 hold quiver 4Hz by 2%
  9 rest settle
phrase breath 4
  0 rest
  1.5s 12% sudden
  4 rest
section a at 2:1 times 3 every 12
  high surge canon 1/4 from edges
  right.1 surge stretch 3/2 scale 0.5 firm 2
  right.2-3 breath after 2 retrograde ripple -1.2 m/s along z
  high breath times 3 every 5 add
"""
"""Every statement and option of the language once."""

ROOT = Path(__file__).parents[2]
DEMOS = ROOT / "scores_demo"


def blocks(language: str, ending: str) -> list[bytes]:
    """Blocks of the manual in a language that are whole files of that ending."""
    found = []
    for page in sorted(ROOT.glob("*/manual/*.md")):
        for name, text in re.findall(rf"^```{language} (\S+)\n(.*?)^```$", page.read_text(), re.MULTILINE | re.DOTALL):
            if name.endswith(ending):
                found.append(text.encode())
    return found


@cache
def gannet():
    """The smaller demo, with what follows from its rig."""
    return load_score(DEMOS / "gannet.score")


def lines_of(score: bytes) -> bytes:
    """A score without its comments, so that mutations meet what is read."""
    return b"\n".join(line.split(b"#")[0].rstrip() for line in score.split(b"\n"))


def scores(folder: Path) -> tuple[Sequence[bytes], Callable[[bytes], object]]:
    """Scores on *Gannet*'s rig: read, expanded, checked, told."""
    known = gannet()
    examples = [lines_of((DEMOS / "gannet.score").read_bytes()), EVERYTHING]

    def read(data: bytes) -> int:
        path = folder / "fuzz.score"
        path.write_bytes(data)
        score, faults = parse_score(
            read_text(path, 8 << 20), str(path), lambda used: read_text(str(DEMOS / used.replace("\0", "")), 8 << 20)
        )
        if faults:
            raise Faults(faults)
        loaded = made_from(score, known.rig, known.abilities)
        if loaded.tracks.moves < 20_000:
            told = check(loaded.tracks, loaded.rig, loaded.abilities)
            assert as_text("fuzz.score", told, Teller(loaded.tracks, loaded.rig, loaded.tempo.say_place))
        return _asked(loaded.tracks)

    return examples, read


def rigs(folder: Path) -> tuple[Sequence[bytes], Callable[[bytes], object]]:
    """Rigs: read, and what their fibers can do worked out."""
    examples = [(DEMOS / f"{name}.rig.toml").read_bytes() for name in ("gannet", "estuary")] + blocks("toml", ".rig.toml")

    def read(data: bytes) -> None:
        path = folder / "fuzz.rig.toml"
        path.write_bytes(data)
        rig = load_rig(path)
        if len({(fiber.type.name, fiber.mounting) for fiber in rig.fibers}) <= 4:
            abilities_of(rig)

    return examples, read


def maps(folder: Path) -> tuple[Sequence[bytes], Callable[[bytes], object]]:
    """Maps on *Gannet*."""
    known = gannet()
    selector = Selector(known.rig, groups_of(known.score))
    examples = [(DEMOS / "gannet.map.toml").read_bytes()]

    def read(data: bytes) -> None:
        path = folder / "fuzz.map.toml"
        path.write_bytes(data)
        read_map(read_text(path, 2 << 20), str(path), selector, known.score.phrases)

    return examples, read


def benches(folder: Path) -> tuple[Sequence[bytes], Callable[[bytes], object]]:
    """Bench data; the fit itself gets numbers that have been looked at."""
    text = (DEMOS / "reed-bench.csv").read_bytes().split(b"\n")
    head = next(n for n, line in enumerate(text) if line.startswith(b"time_s"))
    few = text[: head + 1] + text[head + 1 :: 60]
    with_force = [b'# kind = "contractile"', b"time_s;pressure_kPa;strain;force_N"]
    with_force += [b"%.3f;%.1f;%.4f;%.2f" % (0.01 * n, 2.0 * n, 0.001 * n, 3.0) for n in range(80)]
    examples = [b"\n".join(few), b"\n".join(with_force)]

    def read(data: bytes) -> None:
        path = folder / "fuzz.csv"
        path.write_bytes(data)
        read_bench(read_text(path, 32 << 20), str(path))

    return examples, read


def on_disk(folder: Path) -> tuple[Sequence[bytes], Callable[[bytes], object]]:
    """A score and its rig from their files, both of them hostile: the first half of an input is the score, the rest the rig."""
    score, rig = (DEMOS / "gannet.score").read_bytes(), (DEMOS / "gannet.rig.toml").read_bytes()

    def read(data: bytes) -> int:
        text, _, table = data.partition(b"\0\0\0")
        (folder / "gannet.score").write_bytes(text)
        (folder / "gannet.rig.toml").write_bytes(table)
        return _asked(load_score(folder / "gannet.score").tracks)

    return [lines_of(score) + b"\0\0\0" + rig], read


def _asked(tracks: Tracks) -> int:
    """What a score asks for, in moves."""
    quivers = tracks.quivers
    swings = ((tracks.time_s[quivers.until] - tracks.time_s[quivers.knot]) * quivers.hertz).sum()
    return tracks.moves + SWING_MOVES * int(swings)


def nested(chance: Random, examples: Sequence[bytes]) -> bytes:
    """As texts are mutated, and now and then with tables within tables within tables."""
    data = mutated_text(chance, examples)
    if chance.random() < 0.02:
        deep = chance.choice((20, 200, 2000))
        opened, closed = chance.choice(((b"[", b"]"), (b"{a=", b"}"), (b"[{a=", b"}]")))
        data += b"\ndeep = " + opened * deep + b"1" + closed * deep
    return data


MOVE_S, SWING_MOVES = 5e-6, 10
"""A score may have four million moves and a million swings of quivers, which take as long as they are many, a swing as long
as ten moves; all else in it is done within a second.
"""

TARGETS = (
    Target("score", scores, (Faults,), 150, mutated_text, each_s=MOVE_S),
    Target("rig", rigs, (Faults,), 120, nested),
    Target("score-and-rig", on_disk, (Faults,), 25, mutated_text, each_s=MOVE_S),
    Target("map", maps, (Faults,), 500, nested),
    Target("bench", benches, (Faults,), 500, mutated_text),
)
