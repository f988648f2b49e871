"""`drawcord retime`: the least change of times with which the rig can do a score."""

import json
import os
import sys
import time

import click

from composer.commands.outputs import MadeFile

LIMIT_S = 600.0
"""How long the search may take unless told otherwise."""

SIZE = (1600, 1000)
"""Pixels of the picture."""


@click.command("retime")
@click.argument("score", metavar="SCORE", type=click.Path(path_type=str))
@click.option("-o", "play", metavar="OUT.play", type=click.Path(path_type=str), help="Write the retimed score as a play file.")
@click.option(
    "--flat", metavar="OUT.score", type=click.Path(path_type=str), help="The same as a score, every move written out."
)
@click.option("--png", metavar="FILE.png", type=MadeFile(".png"), help="The score as written over the score retimed, drawn.")
@click.option("--shrink", is_flag=True, help="Where pins are too close, shrink the moves between them until they fit.")
@click.option("--keep", type=click.Choice(["clock", "rhythm"]), help="What to protect; what the score says unless given.")
@click.option(
    "--limit",
    "limit_s",
    type=click.FloatRange(min=0.1),
    default=LIMIT_S,
    show_default=True,
    metavar="SECONDS",
    help="How long to look for the least change before the best that is known is taken.",
)
@click.option("--json", "as_json", is_flag=True, help="Print one JSON object and nothing else.")
def command(
    score: str,
    play: str | None,
    flat: str | None,
    png: str | None,
    shrink: bool,
    keep: str | None,
    limit_s: float,
    as_json: bool,
) -> int:
    """Change the times of SCORE as little as possible, so that its rig can do it, and report what moved.

    The result is checked again from scratch. Ends with 1, and writes no file, where something is left that time cannot
    mend, or where pins are too close (--shrink mends that).
    """
    from composer.files import check_writable
    from composer.limits.check import check
    from composer.load import load_score
    from composer.report.retime import as_json as to_json
    from composer.report.retime import is_good, sentences
    from composer.retime.programme import Unsolved
    from composer.retime.whole_score import retime_score

    outputs = [path for path in (play, flat, png) if path is not None]
    _refuse_clashes(score, outputs)
    for path in outputs:
        check_writable(path, "# Every move" if path == flat else "")
    loaded = load_score(score)
    _refuse_clashes(loaded.rig.file, outputs)
    for used in loaded.score.lines:
        _refuse_clashes(used, outputs)
    try:
        retiming = retime_score(loaded, keep, shrink=shrink, clock=time.perf_counter, limit_s=limit_s, tell=_progress())
    except Unsolved as failed:
        click.echo(f"{score}: the solver gave up, and nothing was changed: {failed} ({failed.tried})", err=True)
        return 1
    checked = check(retiming.tracks, loaded.rig, loaded.abilities)
    good = is_good(retiming, checked)
    if good:
        _write(loaded, retiming, play, flat)
        if png is not None:
            _draw(loaded, retiming, png)
    if as_json:
        click.echo(json.dumps(to_json(retiming, checked, loaded.rig, loaded.tempo), allow_nan=False))
    else:
        for line in sentences(retiming, checked, loaded.rig, loaded.tempo):
            click.echo(line)
        for path in outputs:
            click.echo(f"{path}: written" if good else f"{path}: not written, as the score still has snags")
    if not good and as_json and outputs:
        click.echo("nothing was written, as the score still has snags", file=sys.stderr)
    return 0 if good else 1


def _refuse_clashes(source: str, outputs: list[str]) -> None:
    """Raise Faults where an output would take the place of what is read, or of the other output."""
    from composer.faults import fault

    for path in outputs:
        if os.path.realpath(path) == os.path.realpath(source):
            raise fault(path, f"writing here would overwrite {source}, which is read", hint="name another file")
    for n, path in enumerate(outputs):
        if os.path.realpath(path) in {os.path.realpath(other) for other in outputs[:n]}:
            raise fault(path, "two of -o, --flat and --png name the same file", "a file each")


def _progress():
    """Tells a person at a terminal what is being done, in one line that goes again; nobody else."""
    if not sys.stderr.isatty():
        return None

    def tell(text: str) -> None:
        # Back to the line's beginning, and clear to its end.
        click.echo(f"\r{text}\x1b[K" if text else "\r\x1b[K", nl=False, err=True)

    return tell


def _draw(loaded, retiming, path: str) -> None:
    from composer.files import replacing
    from composer.limits.check import check
    from composer.picture import png
    from composer.picture.cloth import retimed
    from composer.picture.material import Piece

    if not png.has_letters():
        click.echo("this machine has no fonts, so the picture comes out without words; install one, such as DejaVu", err=True)
    title = loaded.score.title or os.path.basename(loaded.score.file)
    pins = tuple(loaded.pins_s.tolist())
    piece = Piece(title, loaded.rig, loaded.abilities, loaded.tracks, loaded.tempo, pins, ())
    moved = [(hit.was_s, hit.now_s) for hit in retiming.hits_moved]
    warp = (retiming.warp_was_s, retiming.warp_now_s)
    checked = check(loaded.tracks, loaded.rig, loaded.abilities)
    both = retimed.both_of(piece, checked, retiming.tracks, moved, warp, SIZE[0])
    picture = png.drawn(lambda painter: retimed.paint(painter, both, *SIZE), *SIZE)
    with replacing(path, "wb") as file:
        file.write(png.png_bytes(picture))


def _write(loaded, retiming, play: str | None, flat: str | None) -> None:
    """Both files, each complete or not at all; what can fail before a byte is written does."""
    from composer.files import replacing
    from composer.load import CuePoint
    from composer.warp import Warp

    warp = Warp(retiming.warp_was_s, retiming.warp_now_s)
    cues = tuple(CuePoint(cue.name, warp.now(cue.seconds), cue.wait) for cue in loaded.cues)
    text = None
    if flat is not None:
        from composer.score.flat import write_flat

        folder = os.path.dirname(os.path.abspath(flat))
        try:
            rig_path = os.path.relpath(loaded.rig.file, folder)
        except ValueError:  # on another drive there is no relative way
            rig_path = os.path.abspath(loaded.rig.file)
        text = write_flat(retiming.tracks, loaded.score, loaded.rig, loaded.tempo, cues, rig_path.replace(os.sep, "/"))
    if play is not None:
        from composer.play_file import Play, write_play

        names = tuple(fiber.name for fiber in loaded.rig.fibers)
        made = Play(
            loaded.score.title, loaded.rig.file, loaded.rig.fingerprint, names, retiming.tracks, loaded.tempo, cues,
            retiming.warp_was_s, retiming.warp_now_s,
        )  # fmt: skip
        write_play(play, made)
    if flat is not None and text is not None:
        with replacing(flat) as file:
            file.write(text)
