"""Edits: what colours, offers, explanations and drags cost on *Estuary*, over reading it once in the same run; asking threads.

A keystroke costs its line: colours again after one, offers and an explanation at the caret, in shares of one reading of the
whole score. A drag re-expands what it moves. Asking threads is by bisection: a million moves over a thousand.

    python tests/bench/edits.py
"""

import sys
import time
from collections.abc import Callable
from pathlib import Path

sys.path.insert(0, str(Path(__file__).parents[1]))

from conftest import make_rig

from composer.edits.colouring import colour_line, colours_of
from composer.edits.completion import complete
from composer.edits.dragging import drag, grip
from composer.edits.hover import explain
from composer.edits.threads import moved_by, source_at, threads_of
from composer.load import load_score, made_from
from composer.score.grammar import parse_line, parse_partly
from composer.score.reading import parse_score, read_score

SCORE = "tempo 96\nphrase surge 8\n  2 0.6 swell\n  3 0.5 linear\n  5 0.9 smooth over 1\n  6 0.3\n  8 rest\nsection s at 1:1\n"
SMALL = "--small" in sys.argv
ASKED = 200 if SMALL else 2000


def least(work: Callable[[], object], times: int = 5) -> float:
    """The least time of several, in s."""
    best = float("inf")
    for _ in range(times):
        begun = time.perf_counter()
        work()
        best = min(best, time.perf_counter() - begun)
    return best


def afresh(work: Callable[[], object]) -> Callable[[], object]:
    """The work with nothing remembered from before."""

    def done() -> object:
        for memory in (parse_line, parse_partly, colour_line):
            memory.cache_clear()
        return work()

    return done


def main() -> None:
    """Print the tables."""
    path = Path(__file__).parents[2] / "scores_demo" / "estuary.score"
    text, state = path.read_text(encoding="utf-8"), load_score(path)
    lines = text.split("\n")
    read = least(afresh(lambda: parse_score(text, str(path))))
    known = colours_of(text)
    at = next(n for n, line in enumerate(lines, 1) if "gather" in line and line.startswith(" "))
    edits = [text.replace("3      full", f"3      ful{n}") for n in range(5)]
    knot = int(state.tracks.first[3]) + 3
    held = grip(state, 3, knot)
    print(f"{'on Estuary':<34} {'of one reading':>14}")
    for name, work in (
        ("colours of the whole, afresh", afresh(lambda: colours_of(text))),
        ("colours after a keystroke", lambda: [colours_of(one, known) for one in edits[:1]]),
        ("offers at the caret", lambda: complete(text, at, 20, state)),
        ("an explanation", lambda: explain(text, at, 18, state)),
        ("a grip", lambda: grip(state, 3, knot)),
        ("a drag", lambda: drag(text, state, held, time_s=held.at_s + 0.4)),
        ("threads made ready", lambda: threads_of(state)),
    ):
        print(f"{name:<34} {least(work) / read:>14.3f}")
    print(f"\n{'threads':<12} {'moves':>9} {'a question over the first':>26}")
    first: dict[str, float] = {}
    for fibers, times in ((16, 12), (64, 48) if SMALL else (512, 390)):
        rig = make_rig.__wrapped__()(fibers)
        big = SCORE + f"  r.* surge times {times} every 9 canon 1/64\n"
        threads = threads_of(made_from(read_score(big, "bench.score"), rig))
        end = threads.tracks.duration_s
        for name, ask in (
            ("a fiber", lambda t=threads, e=end, f=fibers: [source_at(t, n % f, e * n / ASKED) for n in range(ASKED)]),
            ("a line", lambda t=threads: moved_by(t, 3)),
        ):
            took = least(ask, 3)
            each = took / (ASKED if name == "a fiber" else threads.tracks.moves)
            print(f"{name:<12} {threads.tracks.moves:>9} {each / first.setdefault(name, each):>26.2f}")


if __name__ == "__main__":
    main()
