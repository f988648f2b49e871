"""`drawcord rehearse`: the window for whoever runs a rehearsal."""

import click


@click.command("rehearse")
@click.argument("score", metavar="[SCORE|RIG]", required=False, type=click.Path(path_type=str))
@click.option("--to", "targets", metavar="TARGET", multiple=True, help="sim, serial:PORT[@BAUD] or file:PATH.")
@click.option("--attach", "run", metavar="RUN", help="Attach to this run, as 'drawcord attach --list' names it.")
@click.option("--watch", is_flag=True, help="Only watch, and vent where need be; do not command.")
@click.option("--map", "map_path", metavar="MAP.toml", type=click.Path(path_type=str), help="Which control does what.")
@click.option("--midi", metavar="PORT", multiple=True, help="Hear every MIDI port with this in its name.")
@click.option("--osc", metavar="HOST:PORT", help="Hear Open Sound Control there; on loopback where only a port is given.")
@click.option("--take", metavar="OUT.score", type=click.Path(path_type=str), help="Record, and write it as a score at the end.")
@click.option("--from", "start", metavar="CUE|PLACE", help="Where playing begins: a cue, or a place such as 5:1 or 12.4s.")
@click.option("--rate", metavar="HZ", type=float, help="Sets a second; 200 unless given.")
@click.option("--retime", "mend", is_flag=True, help="Mend the score first, where the rig cannot do it as written.")
@click.option("--log", metavar="FILE", type=click.Path(path_type=str), help="Keep the run's log.")
@click.option("--rig", metavar="RIG", type=click.Path(path_type=str), help="Another rig file than the one named inside.")
@click.option(
    "--when-left",
    type=click.Choice(["rest", "go-on"]),
    default="rest",
    help="What the run does where this window goes away: rest, unless go-on is given.",
)
def command(
    score: str | None, targets: tuple[str, ...], run: str | None, watch: bool, map_path: str | None, midi: tuple[str, ...],
    osc: str | None, take: str | None, start: str | None, rate: float | None, mend: bool, log: str | None, rig: str | None,
    when_left: str,
) -> int:  # fmt: skip
    """Rehearse in a window: a score, or a rig by hand; or a run that is on already.

    With SCORE and --to a run is begun; with RIG alone, or --map, --midi, --osc or --take, it is played by hand. Without
    SCORE the window attaches to a run of yours, or lists them where there are several. VENT is Escape, from anywhere in it.
    The run is a process of its own: where this window goes away, --when-left says what becomes of it. The software is no
    safety device.

    Exit code: 0 the window was closed; 1 the rig cannot do the score; 2 the call or a file is wrong, or there is no screen.
    """
    from composer.commands.screen import has_screen

    if not has_screen():
        raise click.UsageError("there is no screen here for a window; 'drawcord play', 'live' and 'attach' do without one.")
    # Here, so that where there is no screen the answer comes at once.
    from composer.faults import fault
    from player.commands import rehearse_ways

    runs = rehearse_ways.names()
    if score is None:
        wrong = next(
            (
                name
                for name, value in (
                    ("--to", targets),
                    ("--map", map_path),
                    ("--midi", midi),
                    ("--osc", osc),
                    ("--take", take),
                    ("--from", start),
                    ("--log", log),
                    ("--retime", mend),
                    ("--rate", rate),
                )
                if value
            ),
            "",
        )
        if wrong:
            raise click.UsageError(f"{wrong} is for a run that is begun: name its SCORE or RIG")
        if run is None and not runs:
            raise fault("rehearse", "none of your runs is on", hint="name a score or a rig: drawcord rehearse SCORE --to sim")
        ways = rehearse_ways.attaching(watch, rig)
        first = run or (runs[0] if len(runs) == 1 else None)
    else:
        if watch or run is not None:
            raise click.UsageError("--attach and --watch are for a run that is on: leave the score out")
        made = rehearse_ways.beginning(
            score=score, targets=targets, map_path=map_path, midi=midi, osc=osc, take=take, start=start, rate=rate,
            mend=mend, log=log, rig=rig, rule=when_left,
        )  # fmt: skip
        if isinstance(made, int):
            return made
        ways, first = made, None if runs else ""
    if run is not None and run not in runs and "/" not in run:
        from composer.faults import nearest

        raise fault(f"--attach {run}", "no run of yours has that name", hint=nearest(run, runs) or ", ".join(runs))
    from player.window.start import run as opened

    return opened(ways, first)
