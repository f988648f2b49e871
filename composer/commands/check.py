"""`drawcord check`: expand a score, check it, and report what the rig cannot do."""

import json
import sys

import click


@click.command("check")
@click.argument("score", type=click.Path())
@click.option("--json", "as_json", is_flag=True, help="Print one JSON object and nothing else.")
def command(score: str, as_json: bool) -> int:
    """Expand SCORE, check it, and report what its rig cannot do.

    Ends with exit code 0 where the rig can do all of it, 1 where there are snags, 2 where the score or its rig is wrong.
    """
    from composer.limits.check import check
    from composer.load import load_score
    from composer.report import check as report
    from composer.report.sentences import Teller

    with _Doing() as doing:
        doing(f"reading {score}")
        loaded = load_score(score)
        doing(f"checking {loaded.tracks.moves} moves of {loaded.tracks.fibers} fibers")
        checked = check(loaded.tracks, loaded.rig, loaded.abilities)
        doing(f"telling {len(checked.snags)} snags")
        teller = Teller(loaded.tracks, loaded.rig, loaded.tempo.say_place)
        notes = report.waiting_notes(loaded.cues, teller)
        if as_json:
            text = json.dumps(report.as_json(score, checked, teller, notes), allow_nan=False, ensure_ascii=False)
        else:
            text = report.as_text(score, checked, teller, notes)
    click.echo(text)
    return 0 if checked.ok else 1


class _Doing:
    """One line on a terminal that says what is being done, and is gone at the end; nothing where there is no terminal."""

    def __enter__(self) -> "_Doing":
        self.shown = sys.stderr.isatty()
        return self

    def __call__(self, what: str) -> None:
        if self.shown:
            click.echo(f"\r\x1b[2K{what} …", err=True, nl=False)

    def __exit__(self, *_: object) -> None:
        if self.shown:
            click.echo("\r\x1b[2K", err=True, nl=False)
