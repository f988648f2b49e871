"""`drawcord preview`: how the fibers would really move, as a picture, a table, a report or a window."""

import json
import os
import sys
from collections.abc import Callable
from contextlib import ExitStack
from typing import Any

import click

from composer.commands.movies import FPS, Wanted, check_call, film, take_of
from composer.commands.movies import SIZE as MOVIE_SIZE
from composer.commands.outputs import MadeFile, outputs_apart
from composer.picture.film.movie_form import FORMS

SIZE = "1920x1080"


@click.command()
@click.argument("score", metavar="SCORE|PLAY")
@click.option("--png", type=MadeFile(".png"), metavar="FILE.png", help="Write the picture to FILE.png.")
@click.option(
    "--csv",
    type=MadeFile(".csv"),
    metavar="FILE.csv",
    help="Write target, strain and pressure of every fiber at every tick to FILE.csv.",
)
@click.option("--json", "as_json", is_flag=True, help="Print the report as JSON on stdout, and nothing else.")
@click.option("--rate", "rate_Hz", type=float, default=200.0, show_default=True, metavar="HZ", help="Ticks a second.")
@click.option(
    "--movie",
    type=MadeFile(*FORMS),
    metavar="FILE",
    help="Film the fibers where they hang, as simulated, into FILE.mp4 or FILE.gif.",
)
@click.option("--from", "start", metavar="CUE|PLACE", help="Where the movie begins: a cue, or a place such as 5:1 or 12.4s.")
@click.option("--to", "end", metavar="CUE|PLACE", help="Where the movie ends.")
@click.option("--fps", type=float, default=FPS, show_default=True, metavar="N", help="Frames of the movie a second.")
@click.option(
    "--view",
    type=click.Choice(["front", "side", "three-quarter"]),
    default="front",
    show_default=True,
    help="From where the movie sees the fibers.",
)
@click.option("--size", metavar="WxH", help=f"Size in pixels; of the picture {SIZE}, of the movie {MOVIE_SIZE} unless given.")
@click.option("--rig", metavar="RIG", help="The rig file, where it is not where SCORE or PLAY says.")
@click.option("--no-inverse", is_flag=True, help="Send without the lead that makes fibers land on the count.")
def command(
    score: str,
    png: str | None,
    csv: str | None,
    as_json: bool,
    rate_Hz: float,
    movie: str | None,
    start: str | None,
    end: str | None,
    fps: float,
    view: str,
    size: str | None,
    rig: str | None,
    no_inverse: bool,
) -> int:
    """Simulate how the fibers would really move.

    A score is taken as it is, snags and all, so that you see what they would do. Without --png, --movie, --csv or --json a
    window opens.
    """
    if not 20.0 <= rate_Hz <= 2000.0:
        raise click.BadParameter(f"{rate_Hz:g} is out of range; 20 to 2000 Hz can be simulated.", param_hint="--rate")
    width, height = _size(size or SIZE, bounded=png is not None or movie is None)
    if movie is None and (start is not None or end is not None):
        raise click.UsageError("--from and --to say what of it is filmed; they need --movie FILE.")
    filmed = None if movie is None else Wanted(movie, *_size(size or MOVIE_SIZE, bounded=False), fps, view, start, end)
    if filmed is not None:
        check_call(filmed)
    window = not (png or csv or as_json or movie)
    if window and not _has_screen():
        raise click.UsageError(
            "there is no screen here for a window; --png FILE writes the picture, --movie FILE the movie, --csv FILE the"
            " table, --json prints the report."
        )
    # Here, so that a wrong call is answered at once.
    from composer.commands.piece import load_piece
    from composer.files import check_writable, replacing
    from composer.picture import material
    from composer.report import preview, tonight

    outputs = {"--png": png, "--csv": csv, "--movie": movie}
    outputs_apart(outputs, [score, rig], "what is previewed")
    piece = load_piece(score, rig)
    outputs_apart(outputs, [score, piece.rig.file], "what is previewed")
    take = None if filmed is None else take_of(filmed, piece)
    for path in outputs.values():
        if path:
            check_writable(path)
    if window:
        from composer.commands.piece import is_play
        from composer.picture.preview.showing import show

        return show(piece, None if is_play(score) else score, rig)
    if take is not None and not (png or csv or as_json):
        return _film_alone(filmed, piece, take, rate_Hz, not no_inverse)
    watch = tonight.Watch(piece.rig, piece.abilities)
    watches: list[Callable[[Any], None]] = [watch.add]
    if take is not None:
        from composer.picture.film.movie import Keeping

        keeping = Keeping(piece, take)
        watches.append(keeping.add)
    columns = 2
    if png:
        from composer.picture.cloth.still import layout

        columns = layout(width, height).width
    with ExitStack() as open_files:
        if csv:
            table = open_files.enter_context(replacing(csv))
            table.write(preview.csv_header(piece.names) + "\n")

            def tabulate(block: Any) -> None:
                table.writelines(row + "\n" for row in preview.csv_rows(block, piece.tracks.duration_s))

            watches.append(tabulate)

        def each(block: Any) -> None:
            for watch in watches:
                watch(block)

        with _progress() as bar:
            seen = material.run(
                piece, columns, rate_Hz, not no_inverse, each, lambda share: bar.update(int(1000 * share) - bar.pos)
            )
        if png:
            _write_png(png, piece, seen, width, height)
        if filmed is not None:
            film(filmed, piece, take, keeping.strains)
    if as_json:
        head = {
            "score": score,
            "rig": piece.rig.file,
            "rate_Hz": rate_Hz,
            "inverse": not no_inverse,
            "duration_s": round(piece.tracks.duration_s, 9),
            "fibers": piece.tracks.fibers,
            "air": {"lowest_kPa": round(seen.lowest_kPa, 3), "used_L": round(seen.used_L, 6)},
        }
        report = preview.as_json(seen.landings, piece.tracks, piece.abilities, piece.tempo.say_place, piece.names, head)
        report["tonight"] = tonight.as_json(watch.tonight(seen.landings, piece.tempo.say_place, piece.tracks))
        click.echo(json.dumps(report, ensure_ascii=False, allow_nan=False))
        return 0
    for line in preview.sentences(
        seen.landings, piece.tracks, piece.abilities, piece.tempo.say_place, piece.names, seen.lowest_kPa
    ):
        click.echo(line)
    for path in outputs.values():
        if path:
            click.echo(f"written: {path}")
    return 0


def _progress() -> Any:
    """How far the simulation is, on a terminal."""
    return click.progressbar(length=1000, label="simulating", file=sys.stderr, hidden=not sys.stderr.isatty(), show_pos=False)


def _film_alone(filmed: Any, piece: Any, take: Any, rate_Hz: float, inverse: bool) -> int:
    """A movie and nothing else: what comes after its end need not be simulated."""
    from composer.picture.axes import say_seconds
    from composer.picture.film.movie import simulated

    with _progress() as bar:
        strains = simulated(piece, take, rate_Hz, inverse, lambda share: bar.update(int(1000 * share) - bar.pos))
    film(filmed, piece, take, strains)
    click.echo(f"written: {filmed.path}, {take.frames} frames, {say_seconds(take.frames / take.fps, 1)}")
    return 0


def _write_png(path: str, piece: Any, seen: Any, width: int, height: int) -> None:
    from composer.files import replacing
    from composer.picture import png
    from composer.picture.cloth import still as cloth
    from composer.picture.material import scene_of

    if not png.has_letters():
        click.echo("this machine has no fonts, so the picture comes out without words; install one, such as DejaVu", err=True)
    scene = scene_of(piece, seen)
    picture = png.drawn(lambda painter: cloth.paint(painter, scene, width, height), width, height)
    with replacing(path, "wb") as file:
        file.write(png.png_bytes(picture))


def _size(text: str, bounded: bool = True) -> tuple[int, int]:
    """Width and height in pixels of "1920x1080"; `bounded`: within what a picture may have."""
    from composer.picture.size import LARGEST, SMALLEST

    wide, cross, high = text.lower().partition("x")
    if not (cross and wide.isascii() and high.isascii() and wide.isdigit() and high.isdigit() and len(text) < 16):
        raise click.BadParameter(f"'{text}' is no size; write width x height in pixels, such as {SIZE}.", param_hint="--size")
    width, height = int(wide), int(high)
    if bounded and not (SMALLEST[0] <= width <= LARGEST[0] and SMALLEST[1] <= height <= LARGEST[1]):
        raise click.BadParameter(
            f"{width}x{height} is out of range; {SMALLEST[0]}x{SMALLEST[1]} to {LARGEST[0]}x{LARGEST[1]} can be drawn.",
            param_hint="--size",
        )
    return width, height


def _has_screen() -> bool:
    """Whether a window can be shown: asked in a process of its own, as Qt ends one whose screen cannot be reached."""
    import subprocess

    if sys.platform.startswith("linux") and not (os.environ.get("DISPLAY") or os.environ.get("WAYLAND_DISPLAY")):
        return False
    if os.environ.get("QT_QPA_PLATFORM", "").split(":")[0] in ("offscreen", "minimal", "vnc"):
        return False
    ask = "import sys; from PySide6.QtGui import QGuiApplication; QGuiApplication(sys.argv)"
    try:
        return subprocess.run([sys.executable, "-c", ask], capture_output=True, timeout=20, check=False).returncode == 0
    except (OSError, subprocess.TimeoutExpired):
        return False
