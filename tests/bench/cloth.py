"""How smoothly the living cloth scrolls and zooms, few threads beside many, and what it holds in memory.

    python tests/bench/cloth.py [THREADS MOVES]

Prints frames a second of a 1280 by 800 window without a screen, over a second of scrolling, zooming and moving the play head,
the worst frame, how long a slice between frames took at most, and the peak of memory. On a busy machine the frames by the
processor's own time are those to look at. The last line says whether the number of threads matters: frames a second by
processor time of many over few.
"""

import os
import resource
import sys
import time

os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")

import numpy as np
from PySide6.QtWidgets import QApplication

from composer.limits.abilities import Abilities
from composer.picture.bands import Band
from composer.picture.cloth.cloth_view import ClothView
from composer.picture.cloth.weave import Weave
from composer.picture.scene import Lane, Stretch
from composer.score.tempo import TempoMap
from composer.shapes import PROGRESS
from composer.tracks import HOLD, MOVE, Tracks


def weave_of(threads: int, moves: int) -> Weave:
    """Threads that rise and fall again and again, each a little later than the one above, with some snags and two lanes."""
    rng = np.random.default_rng(1)
    each = max(moves // threads, 2)
    lasts = 240.0 / each
    knots = each + 1
    start = rng.uniform(0.0, lasts, threads)
    times = np.concatenate([np.zeros((threads, 1)), start[:, None] + np.arange(1, knots) * lasts], axis=1)
    up = np.arange(knots) % 2 == 0
    curve = np.where(up[:, None], 0.3 * PROGRESS["smooth"], 0.3 * (np.eye(6)[0] - PROGRESS["smooth"]))
    curve[-1] = 0.3 * np.eye(6)[0] * (not up[-1])
    count = threads * knots
    manner = np.full((threads, knots), MOVE, np.int8)
    manner[:, -1] = HOLD
    tracks = Tracks(
        np.arange(threads + 1) * knots, times.ravel(), np.tile(curve, (threads, 1)), manner.ravel(),
        np.zeros(count, np.int8), np.tile(np.arange(knots, dtype=np.int32) % 40 + 1, threads), np.zeros(count, np.int32),
        float(times.max()),
    )  # fmt: skip
    by_fiber = np.full(threads, 0.3)
    abilities = Abilities(
        capabilities=(), which=np.zeros(threads, np.int64), stroke=by_fiber, accel=by_fiber, length_mm=400.0 * by_fiber,
        turn_deg=np.full(threads, np.nan), max_hold_s=np.full(threads, np.inf), strain=np.array([[0.0, 0.3]]),
        fill=np.array([[0.6, 0.6]]), exhaust=np.array([[0.3, 0.3]]), air_L=np.zeros((1, 2)),
    )  # fmt: skip
    object.__setattr__(abilities, "capabilities", (type("Way", (), {"direction": "contract"})(),))
    size = max(threads // 8, 1)
    bands = tuple(Band(f"row{n}", first, min(first + size, threads)) for n, first in enumerate(range(0, threads, size)))
    zero = np.zeros(1)
    tempo = TempoMap(zero, zero, np.ones(1), zero, zero, zero, np.array([4.0]))
    at = rng.uniform(0.0, tracks.duration_s, 2000)
    snags = tuple(Stretch(int(fiber), one, one + 0.4) for fiber, one in zip(rng.integers(threads, size=2000), at, strict=True))
    wave = 100.0 + 20.0 * np.sin(np.linspace(0.0, 60.0, 4096))
    lanes = tuple(Lane(name, "kPa", wave, 60.0, 140.0, "supply") for name in ("receiver", "top duty"))
    names = tuple(f"t.{n + 1}" for n in range(threads))
    return Weave(tracks, abilities, bands, names, tempo, snags, (), (), lanes)


LASTS_S = 0.2 if "--small" in sys.argv else 2.0


def frames(app: QApplication, view: ClothView, change, seconds: float = LASTS_S) -> tuple[float, float, float]:
    """Frames a second while `change(n)` alters the view before each, the same by the processor's time, the longest in ms."""
    took = []
    end = time.perf_counter() + seconds
    worked = time.process_time()
    while time.perf_counter() < end:
        begin = time.perf_counter()
        change(len(took))
        view.repaint()
        app.processEvents()
        took.append(time.perf_counter() - begin)
    return len(took) / sum(took), len(took) / (time.process_time() - worked), 1e3 * max(took)


def settle(app: QApplication, view: ClothView) -> tuple[float, float]:
    """Seconds until the picture is whole, and the longest time in ms that events had to wait meanwhile."""
    begin, longest = time.perf_counter(), 0.0
    view.repaint()
    while not view.complete:
        before = time.perf_counter()
        app.processEvents()
        longest = max(longest, time.perf_counter() - before)
    return time.perf_counter() - begin, 1e3 * longest


def bench(app: QApplication, threads: int, moves: int) -> float:
    """Print the figures of one size; returns frames a second by processor time while scrolling."""
    weave = weave_of(threads, moves)
    begin = time.perf_counter()
    view = ClothView()
    view.resize(1280, 800)
    view.set_weave(weave)
    view.show()
    app.processEvents()
    print(
        f"{threads} threads, {weave.tracks.moves} moves: first frame after {1e3 * (time.perf_counter() - begin):.0f} ms", end=""
    )
    whole, wait = settle(app, view)
    print(f", whole after {whole:.2f} s, slices up to {wait:.0f} ms")
    view.show_stretch(20.0, 60.0)
    settle(app, view)
    ways = {
        "scrolling in time": lambda n: view.scroll_time(0.25 if n % 200 < 100 else -0.25),
        "zooming in time": lambda n: view.zoom_time(0.96 if n % 60 < 30 else 1 / 0.96, 40.0),
        "zooming in threads": lambda n: view.zoom_threads(1.05 if n % 60 < 30 else 1 / 1.05),
        "scrolling in threads": lambda n: view.scroll_threads(9.0 if n % 80 < 40 else -9.0),
        "moving the play head": lambda n: view.set_head(20.0 + n % 40),
    }
    found = {}
    for way, change in ways.items():
        if way == "scrolling in threads":
            view.zoom_threads(8.0)
            settle(app, view)
        by_clock, found[way], worst = frames(app, view, change)
        print(f"  {way}: {by_clock:.0f} frames a second, {found[way]:.0f} by processor time, the longest {worst:.0f} ms")
    view.close()
    return found["scrolling in time"]


def main() -> None:
    """Bench few and many."""
    app = QApplication.instance() or QApplication(sys.argv[:1])
    threads, moves = (int(one) for one in sys.argv[1:3]) if len(sys.argv) == 3 else (4096, 1_000_000)
    if "--small" in sys.argv:
        threads, moves = 512, 20_000
    few = bench(app, 48, 2000)
    many = bench(app, threads, moves)
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 2**20
    print(f"peak of memory: {peak:.2f} GB, score and all")
    print(f"{threads} threads over 48, frames a second by processor time while scrolling: {many / few:.2f}")


if __name__ == "__main__":
    main()
