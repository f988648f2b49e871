"""`drawcord fit`: a fiber type from what a bench measured."""

import json
import os
import sys
from typing import Any

import click

from composer.commands.outputs import MadeFile, outputs_apart


@click.command("fit")
@click.argument("bench", metavar="BENCH.csv")
@click.option("--type", "name", required=True, metavar="NAME", help="What the fiber type is called: a type of RIG, or a name.")
@click.option("--rig", metavar="RIG", help="Take kind, dimensions and first guesses from this rig's type of that name.")
@click.option("--load", "load_N", type=float, metavar="N", help="Constant load on the bench in N, where the file does not say.")
@click.option("--png", type=MadeFile(".png"), metavar="FILE.png", help="Draw the fit over the data to FILE.png.")
@click.option("-o", "--output", metavar="FILE", help="Write the table to FILE instead of printing it.")
@click.option("--json", "as_json", is_flag=True, help="Print one JSON object on stdout and nothing else.")
def command(
    bench: str, name: str, rig: str | None, load_N: float | None, png: str | None, output: str | None, as_json: bool
) -> int:
    """Fit a fiber type to bench data and print its table, ready to paste into a rig file.

    BENCH.csv has the columns time_s, pressure_kPa, strain, and force_N where it was measured. Dimensions come from --rig, or
    from lines such as '# rest_length_mm = 400' above its header. See `drawcord manual fitting`.
    """
    if load_N is not None and not 0.0 <= load_N <= 1e5:
        raise click.BadParameter(f"{load_N:g} is out of range; 0 to 100000 N can be on a fiber.", param_hint="--load")
    # Here, so that a wrong call is answered at once.
    from composer.files import check_writable, read_text, replacing
    from composer.fit.fitting import fit
    from composer.fit.reading import MOST_BYTES, read_bench
    from composer.load import load_rig
    from composer.report import fit as report

    outputs_apart({"--png": png, "-o": output}, [bench, rig])
    for path in (png, output):
        if path:
            check_writable(path, "# fitted from ")
    hung = load_rig(rig) if rig else None
    read = read_bench(read_text(bench, MOST_BYTES), bench)
    with click.progressbar(
        length=1000, label="fitting", file=sys.stderr, hidden=not sys.stderr.isatty(), show_pos=False
    ) as bar:
        fitted = fit(read, name, hung, load_N, lambda share: bar.update(max(int(1000 * share) - bar.pos, 0)))
    table = report.as_table(fitted, bench)
    if png:
        _write_png(png, fitted, os.path.basename(bench))
    if output:
        with replacing(output) as file:
            file.write(table)
    if as_json:
        click.echo(json.dumps(report.as_json(fitted, bench), ensure_ascii=False, allow_nan=False))
        return 0
    if not output:
        click.echo(table, nl=False)
        # The table alone goes down a pipe.
        if png:
            click.echo(f"written: {png}", err=True)
        return 0
    for line in report.sentences(fitted, bench):
        click.echo(line)
    for path in (output, png):
        if path:
            click.echo(f"written: {path}")
    return 0


def _write_png(path: str, fitted: Any, title: str) -> None:
    from composer.files import replacing
    from composer.picture import png
    from composer.picture.plots import fit

    if not png.has_letters():
        click.echo("this machine has no fonts, so the picture comes out without words; install one, such as DejaVu", err=True)
    picture = png.drawn(lambda painter: fit.paint(painter, fitted, title), fit.WIDTH, fit.HEIGHT)
    with replacing(path, "wb") as file:
        file.write(png.png_bytes(picture))
