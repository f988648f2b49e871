"""`drawcord rig`: what each fiber can do where it hangs."""

import json
import os
from typing import Any

import click

from composer.commands.outputs import MadeFile


@click.command("rig")
@click.argument("rig", type=click.Path())
@click.option("--json", "as_json", is_flag=True, help="Print one JSON object and nothing else.")
@click.option(
    "--png",
    type=MadeFile(".png"),
    metavar="FILE.png",
    help="Draw stroke over pressure and rates over strain, a row for each make.",
)
def command(rig: str, as_json: bool, png: str | None) -> int:
    """What each fiber of RIG can do where it hangs: stroke, force, fastest rates by strain, air for a stroke."""
    from composer.files import check_writable
    from composer.limits.abilities import abilities_of
    from composer.load import load_rig
    from composer.report import rig as report

    if png:
        _apart(png, rig)
        check_writable(png)
    loaded = load_rig(rig)
    abilities = abilities_of(loaded)
    if png:
        _write_png(png, loaded, abilities)
    if as_json:
        click.echo(json.dumps(report.as_json(rig, loaded, abilities), ensure_ascii=False, allow_nan=False))
        return 0
    click.echo(report.as_text(rig, loaded, abilities))
    if png:
        click.echo(f"written: {png}")
    return 0


def _apart(png: str, rig: str) -> None:
    """Raise Faults where the picture would be written over the rig."""
    from composer.faults import fault

    if os.path.realpath(png) == os.path.realpath(rig):
        raise fault(png, "--png would write over the rig", "a file of its own", "nothing was written")


def _write_png(path: str, rig: Any, abilities: Any) -> None:
    from composer.files import replacing
    from composer.picture import png
    from composer.picture.plots import makes

    if not png.has_letters():
        click.echo("this machine has no fonts, so the picture comes out without words; install one, such as DejaVu", err=True)
    sheet = makes.sheet_of(rig, abilities)
    picture = png.drawn(lambda painter: makes.paint(painter, sheet), sheet.width, sheet.height)
    with replacing(path, "wb") as file:
        file.write(png.png_bytes(picture))
