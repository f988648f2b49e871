"""Why something is not played: the list of its snags, as `check` tells it."""

import json

import click

from player.commands.played import Played


def refused(played: Played, as_json: bool) -> int | None:
    """None where the rig can do it; else the list is printed, and the exit code is returned."""
    from composer.limits.check import check
    from composer.report.check import as_json as to_json
    from composer.report.check import as_text
    from composer.report.sentences import Teller

    assert played.tracks is not None
    checked = check(played.tracks, played.rig, played.abilities)
    if checked.ok:
        return None
    teller = Teller(played.tracks, played.rig, played.say_place)
    if as_json:
        click.echo(json.dumps({"ended": "refused", "exit": 1, **to_json(played.path, checked, teller)}, allow_nan=False))
        return 1
    click.echo(as_text(played.path, checked, teller))
    mends = "; --retime mends what time can mend" if played.kind == "score" else ""
    click.echo(f"not played, as the rig cannot do it{mends}", err=True)
    return 1


def not_mended(path: str, why: str, as_json: bool) -> int:
    """Tell what retiming has left, and that nothing was played."""
    if as_json:
        click.echo(json.dumps({"ended": "refused", "exit": 1, "score": path, "why": why}))
        return 1
    click.echo(why)
    click.echo("not played, as retiming alone does not mend it", err=True)
    return 1
