"""How a movie's making compares to its length, and a hang view's frame to a thirtieth of a second.

    python tests/bench/filming.py [SECONDS]

Ratios of things timed in one run; below 1 is fast enough. Without SECONDS all of Estuary is filmed.
"""

import sys
import tempfile
import time
from dataclasses import replace
from pathlib import Path

import numpy as np
from PySide6.QtGui import QImage, QPainter

from composer.commands.piece import load_piece
from composer.limits.abilities import abilities_of
from composer.picture import png
from composer.picture.film.movie import Film, Take, simulated
from composer.picture.film.movie_file import write_movie
from composer.picture.hang import paint as hang_paint
from composer.picture.look import Look

DEMOS = Path(__file__).parents[2] / "scores_demo"
FRAME_S = 1.0 / 30.0


def movie(seconds: float) -> None:
    """Film Estuary at 1280 by 720, 30 frames a second."""
    piece = load_piece(str(DEMOS / "estuary.score"))
    take = Take(0.0, min(seconds, piece.tracks.duration_s), 30.0, 1280, 720)
    began = time.perf_counter()
    strains = simulated(piece, take)
    ran = time.perf_counter()
    film = Film(piece, take, strains)
    with tempfile.TemporaryDirectory() as folder:
        write_movie(str(Path(folder) / "estuary.mp4"), film)
    ended = time.perf_counter()
    long = take.to_s - take.from_s
    print(f"Estuary, {long:.0f} s at 720p: simulating {(ran - began) / long:.2f}, filming {(ended - ran) / long:.2f},")
    print(f"  all {(ended - began) / long:.2f} of the movie's length")


def frames(name: str, count: int = 512, shown: int = 40) -> None:
    """Draw a rig's fibers, so many of them, each with a ghost, in all views."""
    rig = load_piece(str(DEMOS / f"{name}.score")).rig
    fibers = []
    for n in range(count):
        like = rig.fibers[n % len(rig.fibers)]
        x, y, z = like.at_m
        row = n // len(rig.fibers)
        fibers.append(replace(like, name=f"f.{n}", at_m=(x + 0.7 * (row % 8), y + 0.4 * (row // 8), z), mirror=None))
    many = replace(rig, fibers=tuple(fibers), groups={})
    abilities = abilities_of(many)
    room, look = hang_paint.room_of(many, abilities), Look(1.0)
    picture = QImage(1280, 720, QImage.Format.Format_RGB32)
    phase = np.random.default_rng(1).uniform(0.0, 6.0, count)
    for view in ("front", "side", "three-quarter"):
        camera = hang_paint.camera_of(room, view, 1280, 720, look)
        wall, cpu = time.perf_counter(), time.process_time()
        for n in range(shown):
            wanted = abilities.stroke * (0.5 + 0.5 * np.sin(phase + 0.1 * n))
            painter = QPainter(picture)
            hang_paint.paint_fibers(painter, room, camera, look, wanted, 0.9 * wanted)
            painter.end()
        wall, cpu = (time.perf_counter() - wall) / shown, (time.process_time() - cpu) / shown
        said = f"of a thirtieth of a second ({cpu / FRAME_S:.2f} of processor time)"
        print(f"{count} fibers of {name}, {view}: a frame takes {wall / FRAME_S:.2f} {said}")


if __name__ == "__main__":
    png.ready()
    seconds = float(sys.argv[1]) if len(sys.argv) > 1 else float("inf")
    for rig in ("estuary", "gannet"):
        frames(rig, shown=4 if seconds < 1.0 else 40)
    movie(seconds)
