"""`drawcord preflight`: what must be true before arming, a line each."""

import json

import click


@click.command("preflight")
@click.argument("rig", metavar="RIG", type=click.Path(path_type=str))
@click.option("--to", "targets", metavar="TARGET", multiple=True, help="As for play: sim, serial:PORT[@BAUD] or file:PATH.")
@click.option(
    "--rate", metavar="HZ", type=click.FloatRange(20.0, 1000.0), default=200.0, help="Sets a second; 200 unless given."
)
@click.option("--json", "as_json", is_flag=True, help="Print one JSON object, and nothing else.")
def command(rig: str, targets: tuple[str, ...], rate: float, as_json: bool) -> int:
    """Ask the boards all that must be true before arming, and leave them as they were: nothing is armed, nothing moves.

    The same list as play goes through. A board that is armed already is disarmed by the greeting.

    Exit code: 0 all is in order; 1 something is not; 2 the call, the rig or a port is wrong.
    """
    from composer.limits.abilities import abilities_of
    from composer.load import load_rig
    from player.commands.marks import line
    from player.engine.clock import SteadyClock
    from player.outputs.base import LinkLost, Mark
    from player.outputs.targets import Context, make_outputs

    if not targets:
        raise click.UsageError("which boards? Add --to serial:PORT[@BAUD], one for each driver of the rig")
    loaded = load_rig(rig)
    outputs = make_outputs(targets, Context(loaded, abilities_of(loaded), SteadyClock(), rate))
    marks = []
    try:
        for output in outputs:
            output.open()
        for output in outputs:
            try:
                found = output.preflight(rate)
            except LinkLost as lost:
                hint = "is it plugged in, and has it power?"
                found = (Mark(f"{'+'.join(output.drivers)}: the line holds", False, str(lost), hint),)
            marks += found
            if not as_json:
                click.echo("\n".join(map(line, found)))
    finally:
        for output in outputs:
            output.close()
    ok = all(mark.ok for mark in marks)
    if as_json:
        rows = [{"asked": one.asked, "ok": one.ok, "found": one.found, "hint": one.hint} for one in marks]
        click.echo(json.dumps({"rig": rig, "ok": ok, "marks": rows}))
    else:
        click.echo("Ready to arm." if ok else "Not ready: see the lines marked NO.")
    return 0 if ok else 1
