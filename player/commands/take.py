"""`drawcord take`: what was played by hand, as a score."""

import json
import os
import sys
from dataclasses import replace
from typing import Any

import click

from player.commands.terminal import is_screen

PARTS = 1000
"""Of the work, as the bar on a terminal counts them."""

MOST = 20.0
"""Per cent of the stroke: no greater tolerance is taken."""


@click.command("take")
@click.argument("take", metavar="TAKE", type=click.Path(path_type=str))
@click.option("-o", "out", metavar="OUT.score", required=True, type=click.Path(path_type=str), help="The score to write.")
@click.option("--tolerance", metavar="PERCENT", type=float, default=1.0, show_default=True,
              help="How far the score may be off what was played, in per cent of each fiber's stroke.")  # fmt: skip
@click.option("--onto", metavar="SCORE", type=click.Path(path_type=str), help="Lay the take over this score.")
@click.option(
    "--at", "at", metavar="CUE|PLACE", help="With --onto: from this cue or place on; from its own start unless given."
)
@click.option("--rig", metavar="RIG", type=click.Path(path_type=str), help="The rig, where it is not where the take has it.")
@click.option("--tempo", metavar="N", type=float, help="Counts a minute, for a take that was not played to a score; 60.")
@click.option("--meter", metavar="N/V", help="Counts in a bar and their note value, likewise; 4/4.")
@click.option("--title", metavar="TEXT", help="The score's title; the take's name unless given.")
@click.option(
    "--force", is_flag=True, help="Replace OUT.score where there is a score already that somebody may have worked on."
)
@click.option("--json", "as_json", is_flag=True, help="Print one JSON object and nothing else.")
def command(
    take: str, out: str, tolerance: float, onto: str | None, at: str | None, rig: str | None, tempo: float | None,
    meter: str | None, title: str | None, force: bool, as_json: bool,
) -> int:  # fmt: skip
    """Write TAKE, recorded while playing by hand, as a score: the fewest moves that stay within the tolerance of it.

    A take that was cut off is written up to there. Ends with 1 where the rig cannot do all of the score.
    """
    from composer.faults import Faults, fault
    from composer.files import check_writable, replacing
    from composer.report import check as report
    from composer.report.sentences import Teller
    from player.takes.cores import Cores
    from player.takes.making import make_score

    if not 0.01 <= tolerance <= MOST:
        raise fault("--tolerance", f"{tolerance:g} %", f"0.01 to {MOST:g} per cent of the stroke")
    if tempo is not None and not 1.0 <= tempo <= 1000.0:
        raise fault("--tempo", f"{tempo:g} counts a minute", "1 to 1000")
    if at is not None and onto is None:
        raise fault("--at", "a place, but no score that the take is laid over", hint="name the score with --onto")
    if onto is not None and (tempo is not None or meter is not None or title is not None):
        raise fault(
            "--onto", "the score has a tempo, a meter and a title of its own", "no --tempo, --meter or --title beside it"
        )
    for source in (take, onto, rig):
        if source is not None and source != onto and os.path.realpath(source) == os.path.realpath(out):
            raise fault(out, f"writing here would overwrite {source}, which is read", hint="name another file")
    try:
        check_writable(out, None if force else "" if onto else "# Played by hand")
    except Faults as wrong:
        hint = "name another file, move that one away first, or have it replaced with --force"
        raise Faults([replace(one, hint=hint) if "would be lost" in one.found else one for one in wrong.faults]) from None
    with Cores() as each, _progress() as bar:
        made = make_score(
            take, out, rig=rig, tolerance=tolerance / 100.0, onto=onto, at=at, tempo=tempo, meter=meter, title=title,
            each=each, tell=lambda share: bar.update(int(PARTS * share) - bar.pos),
        )  # fmt: skip
    with replacing(out) as file:
        file.write(made.text)
    teller = Teller(made.loaded.tracks, made.loaded.rig, made.loaded.tempo.say_place)
    good = made.checked.ok and made.worst <= tolerance / 100.0
    if as_json:
        click.echo(
            json.dumps(
                {
                    "take": take, "score": out, "ok": good, "complete": made.complete, "left_bytes": made.left_bytes,
                    "until_s": made.until_s, "fibers": made.fibers, "phrases": made.phrases, "knots": made.knots,
                    "worst": made.worst, "worst_fiber": made.worst_fiber, "late": made.late, "taken_over": made.fell,
                    "stepped": made.stepped,
                    "snags": [report.snag_as_json(snag, teller) for snag in made.checked.snags],
                },
                allow_nan=False,
            )
        )  # fmt: skip
        return 0 if good else 1
    if not made.complete:
        lost = f", and {made.left_bytes} bytes at its end are no whole record" if made.left_bytes else ""
        click.echo(f"{take}: the take was cut off{lost}; it is sound up to {made.until_s:.2f} s")
    for name in made.late:
        click.echo(f"{name}: was elsewhere as the take began; it goes there first, as fast as it can")
    if made.fell:
        lines = ", ".join(map(str, made.fell))
        click.echo(f"{onto}: the take has taken over from the entries on lines {lines}; in {out} they are comments or say less")
    click.echo(
        f"{out}: written; {made.fibers} fibers in {made.phrases} phrases of {made.knots} moves and holds, "
        f"within {made.worst * 100.0:.2f} % of the stroke of what was played ({made.worst_fiber})"
    )
    if made.stepped is not None and tolerance / 100.0 < made.stepped <= MOST / 100.0:
        click.echo(
            "many moves are quick and short, as a control that sends a few values a second makes them: "
            f"--tolerance {made.stepped * 100.0:.0f} writes the curve through its steps"
        )
    if not made.checked.ok:
        click.echo(report.as_text(out, made.checked, teller))
    return 0 if good else 1


def _progress() -> Any:
    """A bar on stderr where that is a terminal, nothing elsewhere."""
    return click.progressbar(length=PARTS, label="fitting", file=sys.stderr, hidden=not is_screen(), show_pos=False)
