"""`drawcord preview --movie`: what of a piece is filmed, checked before any work, and the filming."""

import sys
from dataclasses import dataclass
from typing import Any

import click

SIZE = "1280x720"
FPS = 30.0


@dataclass(frozen=True, slots=True)
class Wanted:
    """A movie as the command line asks for it; `start` and `end` as written, None for the piece's own."""

    path: str
    width: int
    height: int
    fps: float
    view: str
    start: str | None
    end: str | None


def check_call(wanted: Wanted) -> None:
    """Refuse what cannot be filmed, whatever the piece. Raises click.BadParameter."""
    from composer.picture.film.movie_form import FASTEST_GIF_FPS, form_of
    from composer.picture.size import FASTEST_FPS, LARGEST_MOVIE, SLOWEST_FPS, SMALLEST_MOVIE

    form = form_of(wanted.path)
    small, large = SMALLEST_MOVIE, LARGEST_MOVIE
    if not (small[0] <= wanted.width <= large[0] and small[1] <= wanted.height <= large[1]):
        raise click.BadParameter(
            f"{wanted.width}x{wanted.height} is out of range; {small[0]}x{small[1]} to {large[0]}x{large[1]} can be filmed.",
            param_hint="--size",
        )
    if form == ".mp4" and (wanted.width % 2 or wanted.height % 2):
        raise click.BadParameter(
            f"{wanted.width}x{wanted.height} has an odd side; an mp4 wants even ones, such as {SIZE}.", param_hint="--size"
        )
    fastest = min(FASTEST_FPS, FASTEST_GIF_FPS) if form == ".gif" else FASTEST_FPS
    if not SLOWEST_FPS <= wanted.fps <= fastest:
        raise click.BadParameter(
            f"{wanted.fps:g} is out of range; {SLOWEST_FPS:g} to {fastest:g} frames a second can be filmed.", param_hint="--fps"
        )


def take_of(wanted: Wanted, piece: Any) -> Any:
    """What is filmed of a piece. Raises Faults where its start or end is nowhere in it, or it would be too long."""
    from composer.commands.places import seconds_of
    from composer.faults import fault
    from composer.picture.film.movie import MOST_KEPT, Take
    from composer.picture.film.movie_file import EncoderFailedError, encoder

    try:
        encoder()
    except EncoderFailedError as wrong:
        found = f"there is no encoder for movies here: {wrong}"
        raise fault(wanted.path, found, hint="install imageio-ffmpeg again, which brings one along") from None
    start_s = 0.0 if wanted.start is None else seconds_of(piece, wanted.start, "--from")
    end_s = piece.tracks.duration_s if wanted.end is None else seconds_of(piece, wanted.end, "--to")
    if end_s <= start_s:
        begins, ends = piece.tempo.say_place(start_s), piece.tempo.say_place(end_s)
        raise fault(f"--to {wanted.end or ends}", f"it ends at {ends}, and begins at {begins}", "an end after the start")
    take = Take(start_s, end_s, wanted.fps, wanted.width, wanted.height, wanted.view)
    most = MOST_KEPT // max(1, piece.tracks.fibers)
    if take.frames > most:
        raise fault(
            wanted.path,
            f"{take.frames} frames of {piece.tracks.fibers} fibers are more than a movie can hold",
            f"at most {most} frames",
            "film a part of it with --from and --to, or fewer frames a second with --fps",
        )
    return take


def film(wanted: Wanted, piece: Any, take: Any, strains: Any) -> None:
    """Draw and write the movie, with progress on a terminal. Raises Faults, or ClickException where the encoder fails."""
    from composer.picture import png
    from composer.picture.film.movie import Film
    from composer.picture.film.movie_file import EncoderFailedError, write_movie

    if not png.has_letters():
        click.echo("this machine has no fonts, so the movie comes out without words; install one, such as DejaVu", err=True)
    made = Film(piece, take, strains)
    with click.progressbar(
        length=take.frames, label="filming", file=sys.stderr, hidden=not sys.stderr.isatty(), show_pos=False
    ) as bar:
        try:
            write_movie(wanted.path, made, lambda frame: bar.update(1))
        except EncoderFailedError as wrong:
            said = str(wrong).splitlines()[-1] if str(wrong) else "it said nothing"
            failed = click.ClickException(f"{wanted.path}: the movie was not written, as the encoder failed: {said}")
            failed.exit_code = 2
            raise failed from None
