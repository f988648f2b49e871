"""`drawcord report`: a run told afterwards from its log."""

import json

import click

from composer.commands.outputs import MadeFile

LARGEST_LOG = 1 << 30


@click.command("report")
@click.argument("log", metavar="LOG", type=click.Path(path_type=str))
@click.option("--json", "as_json", is_flag=True, help="Print one JSON object, and nothing else.")
@click.option("--png", metavar="FILE.png", type=MadeFile(".png"), help="Draw what was wanted and sensed.")
def command(log: str, as_json: bool, png: str | None) -> int:
    """Tell a run from the log that `drawcord play --log LOG` kept.

    What was wanted, sent and sensed; how far off each landing was, worst first; how late ticks came; faults, each with its
    place in the score. A log that was cut off is told up to there.

    Exit code: 0 the run went as the operator wished, 1 a fault or a vent, or the log breaks off; 2 the file is no log.
    """
    from composer.faults import fault
    from composer.files import check_writable, read_bytes, replacing
    from player.commands.log_report import as_object, sentences
    from player.engine.run_log import walk
    from player.engine.told import Senseless, told

    if png is not None:
        check_writable(png)
    data = read_bytes(log, LARGEST_LOG)
    end = [0]

    def records():
        for record, ends in walk(data):
            end[0] = ends
            yield record

    try:
        found = told(records())
    except (Senseless, ValueError) as why:
        raise fault(log, f"this cannot be told: {why}", "a log that 'drawcord play --log' kept") from None
    left = len(data) - end[0]
    whole = as_object(found, log, left)
    if png is not None:
        from composer.picture.plots.run import HEIGHT, WIDTH, paint
        from composer.picture.png import drawn, png_bytes
        from player.commands.log_scene import scene

        shown = scene(found, whole)
        picture = png_bytes(drawn(lambda painter: paint(painter, shown), WIDTH, HEIGHT))
        with replacing(png, "wb") as file:
            file.write(picture)
    click.echo(json.dumps(whole, allow_nan=False) if as_json else "\n".join(sentences(whole)))
    if png is not None and not as_json:
        click.echo(f"written: {png}")
    return whole["exit"]
