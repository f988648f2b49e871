"""`drawcord retime`: the least change of times with which the rig can do a score."""

import json
import os
import sys
import time

import click


@click.command("retime")
@click.argument("score", metavar="SCORE", type=click.Path(path_type=str))
@click.option("-o", "play", metavar="OUT.play", type=click.Path(path_type=str), help="Write the retimed score as a play file.")
@click.option(
    "--flat", metavar="OUT.score", type=click.Path(path_type=str), help="The same as a score, every move written out."
)
@click.option("--shrink", is_flag=True, help="Where pins are too close, shrink the moves between them until they fit.")
@click.option("--keep", type=click.Choice(["clock", "rhythm"]), help="What to protect; what the score says unless given.")
@click.option("--json", "as_json", is_flag=True, help="Print one JSON object and nothing else.")
def command(score: str, play: str | None, flat: str | None, shrink: bool, keep: str | None, as_json: bool) -> int:
    """Change the times of SCORE as little as possible, so that its rig can do it, and report what moved.

    The result is checked again from scratch. Ends with 1, and writes no file, where something is left that time cannot
    mend, or where pins are too close (--shrink mends that).
    """
    from composer.files import check_writable
    from composer.limits.check import check
    from composer.load import load_score
    from composer.report.retime import as_json as to_json
    from composer.report.retime import is_good, sentences
    from composer.retime.choices import choices_of
    from composer.retime.programme import Unsolved
    from composer.retime.retiming import retime

    outputs = [path for path in (play, flat) if path is not None]
    _refuse_clashes(score, outputs)
    for path in outputs:
        check_writable(path)
    loaded = load_score(score)
    _refuse_clashes(loaded.rig.file, outputs)
    for used in loaded.score.lines:
        _refuse_clashes(used, outputs)
    keep = keep or loaded.score.keep or "clock"
    firm, rhythm = choices_of(loaded.score, loaded.tracks, keep)
    try:
        retiming = retime(
            loaded.tracks,
            loaded.abilities,
            loaded.rig,
            loaded.pins_s,
            keep,
            shrink,
            give_s=loaded.pins_give_s,
            firm=firm,
            rhythm=rhythm,
            clock=time.perf_counter,
        )
    except Unsolved as failed:
        click.echo(f"{score}: the solver gave up, and nothing was changed: {failed}", err=True)
        return 1
    checked = check(retiming.tracks, loaded.rig, loaded.abilities)
    good = is_good(retiming, checked)
    if good:
        _write(loaded, retiming, play, flat)
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
    if len(outputs) == 2 and os.path.realpath(outputs[0]) == os.path.realpath(outputs[1]):
        raise fault(outputs[1], "-o and --flat name the same file", "two files")


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
