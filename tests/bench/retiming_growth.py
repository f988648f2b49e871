"""How the cost of retiming grows with the score: the time it takes over moves, 10³ to 10⁶, as a picture for the manual.

python tests/bench/retiming_growth.py [--to FILE.png] [--most 1000000]

Processor time over that of a thousand moves, in passages of twelve moves a fiber with rests between, a few of them too
fast, with plenty of air; and the same solved all at once, as far as that goes in a minute. Both axes are powers of ten.
"""

import argparse
import platform
import sys
import time
from pathlib import Path

import numpy as np
from PySide6.QtCore import QRectF

sys.path.insert(0, str(Path(__file__).parents[1]))
sys.path.insert(0, str(Path(__file__).parent))

from conftest import make_rig
from retiming import with_rests

from composer.limits.abilities import abilities_of
from composer.picture import palette
from composer.picture.look import Look, colour
from composer.picture.plots.plot import Axis, Curve, paint
from composer.picture.png import drawn, png_bytes
from composer.retime.retiming import retime

SIZES = ((1_000, 16), (3_000, 32), (10_000, 64), (30_000, 128), (100_000, 512), (300_000, 1024), (1_000_000, 4096))
TO = Path(__file__).parents[2] / "composer" / "manual" / "retiming-growth.png"
WIDTH, HEIGHT, ENOUGH_S = 1280, 640, 60.0


def seconds(moves: int, fibers: int, whole: bool) -> tuple[int, float]:
    """Moves made, and processor seconds of one retiming of them."""
    rig = make_rig.__wrapped__()(fibers, receiver_L=1000.0, compressor_L_min=4000.0)
    tracks, abilities = with_rests(moves, fibers, 0.034), abilities_of(rig)
    began = time.process_time()
    retime(tracks, abilities, rig, np.empty(0), whole=whole)
    return tracks.moves, time.process_time() - began


def main() -> None:
    parser = argparse.ArgumentParser()
    parser.add_argument("--to", type=Path, default=TO)
    parser.add_argument("--most", type=int, default=SIZES[-1][0])
    options = parser.parse_args()
    print(f"{platform.machine()}, Python {platform.python_version()}")
    seconds(*SIZES[0], False)
    lines: list[list[tuple[int, float]]] = [[], []]
    for whole, line in zip((False, True), lines, strict=True):
        for moves, fibers in SIZES:
            if moves > options.most or (whole and line and line[-1][1] * 3.0 > ENOUGH_S):
                break
            line.append(seconds(moves, fibers, whole))
            how, over = "all at once" if whole else "round the snags", line[-1][1] / lines[0][0][1]
            print(f"{how}: {line[-1][0]} moves take {over:.3g} x")
    unit = lines[0][0][1]
    curves = []
    for line, of, name in zip(lines, (palette.DUTY, palette.MISS), ("round the snags", "all at once"), strict=True):
        counts, times = np.log10(np.array(line, dtype=float).T / np.array([[1.0], [unit]]))
        curves.append(Curve(counts, times, of, name))
    top = np.ceil(max(float(curve.y.max()) for curve in curves))
    x = Axis(2.9, np.log10(options.most) + 0.1, "moves, as a power of ten")
    y = Axis(-0.5, max(top, 1.0), "time over that of a thousand moves, as a power of ten")

    def draw(painter) -> None:
        look = Look(1.3)
        painter.fillRect(QRectF(0, 0, WIDTH, HEIGHT), colour(palette.GROUND))
        paint(painter, look, QRectF(30, 30, WIDTH - 60, HEIGHT - 60), x, y, curves)

    options.to.write_bytes(png_bytes(drawn(draw, WIDTH, HEIGHT)))
    print(f"{options.to}: written")


if __name__ == "__main__":
    main()
