"""`drawcord play`: a score, a play file or a recording in real time."""

import os

import click

SLOWEST_HZ, FASTEST_HZ = 20.0, 1000.0


@click.command("play")
@click.argument("score", metavar="SCORE|PLAY|RECORDING", type=click.Path(path_type=str))
@click.option("--to", "targets", metavar="TARGET", multiple=True, help="sim, serial:PORT[@BAUD] or file:PATH.")
@click.option("--from", "start", metavar="CUE|PLACE", help="Start at a cue, or a place such as 5:1 or 12.4s.")
@click.option("--rate", metavar="HZ", type=float, help="Sets a second; 200 unless given, a recording's own for a recording.")
@click.option("--retime", "mend", is_flag=True, help="Mend the score first, where the rig cannot do it as written.")
@click.option("--arm", is_flag=True, help="Arm without asking.")
@click.option("--log", metavar="FILE", type=click.Path(path_type=str), help="Keep the run's log.")
@click.option("--trim", is_flag=True, help="Correct set-points by what boards sense, and by what earlier runs learned.")
@click.option("--rig", metavar="RIG", type=click.Path(path_type=str), help="Another rig file than the one named inside.")
@click.option(
    "--when-left",
    type=click.Choice(["rest", "go-on"]),
    default="rest",
    help="What the run does where this terminal goes away: rest, unless go-on is given.",
)
@click.option("--json", "as_json", is_flag=True, help="Print one JSON object at the end, and nothing else.")
def command(
    score: str,
    targets: tuple[str, ...],
    start: str | None,
    rate: float | None,
    mend: bool,
    arm: bool,
    log: str | None,
    trim: bool,
    rig: str | None,
    when_left: str,
    as_json: bool,
) -> int:
    """Play a score in real time.

    TARGET is where it goes; a rig with several drivers wants one for each, with its name in front: left=serial:/dev/ttyACM0.
    sim and file:PATH without a name take all drivers that are left, and need no arming.

    A score that the rig cannot do is refused unless --retime mends it first. Ctrl-C brings all fibers to rest at their safe
    rate and disarms; a second one vents. The run is a process of its own: where this terminal goes away, --when-left says what
    becomes of it, and 'drawcord attach' comes back to it. The software is no safety device.
    """
    from player.commands.mending import NotMended
    from player.commands.played import load_played
    from player.commands.refusal import not_mended, refused

    if not targets:
        raise click.UsageError("where to? Add --to sim, --to serial:PORT[@BAUD] or --to file:PATH")
    _check_written(targets, log, score, rig)
    try:
        played = load_played(score, rig, mend)
    except NotMended as why:
        return not_mended(score, str(why), as_json)
    _refuse_clashes([played.rig.file, *played.used], targets, log)
    hertz = _rate(rate, played.recording.rate_Hz if played.recording else 200.0)
    start_s = played.seconds_of(start) if start is not None else 0.0
    if played.tracks is not None and (code := refused(played, as_json)) is not None:
        return code
    return _run(played, targets, hertz, start_s, arm, log, trim, when_left, as_json)


def _run(
    played,
    targets: tuple[str, ...],
    hertz: float,
    start_s: float,
    arm: bool,
    log: str | None,
    trim: bool,
    rule: str,
    as_json: bool,
) -> int:
    """Start the run in a process of its own, and be its front end."""
    from player.commands import play_process
    from player.commands.attending import begun, commanded
    from player.commands.front import Front
    from player.commands.terminal import has_keys, is_screen

    about = play_process.about(played, targets, hertz)
    answers = not as_json and is_screen() and has_keys()
    client = begun(play_process.body, about, rule, played, targets, hertz, log, trim, answers=answers)
    return commanded(client, arm, start_s, as_json, lambda ask: Front(ask, about, quiet=as_json), rule)


def _check_written(targets: tuple[str, ...], log: str | None, *read: str | None) -> None:
    """Raise Faults, before any work, where a file cannot be written, or stands for something that is read or written too."""
    from composer.files import check_writable
    from player.outputs.targets import files_of

    _refuse_clashes([path for path in read if path], targets, log)
    for path in files_of(targets) + ([log] if log else []):
        check_writable(path)


def _refuse_clashes(read: list[str], targets: tuple[str, ...], log: str | None) -> None:
    """Raise Faults where a file to be written is one that is read, or is written twice."""
    from composer.faults import fault
    from player.outputs.targets import files_of

    taken = {os.path.realpath(path): f"is read: {path}" for path in read}
    for path in files_of(targets) + ([log] if log else []):
        real = os.path.realpath(path)
        if real in taken:
            raise fault(path, f"cannot be written, as it {taken[real]}", hint="name another file")
        taken[real] = "is written already"


def _rate(asked: float | None, usual: float) -> float:
    """The rate in Hz, within what makes sense."""
    if asked is None:
        return usual
    # Written so that nan is refused too.
    if not SLOWEST_HZ <= asked <= FASTEST_HZ:
        raise click.UsageError(f"--rate {asked:g}: expected {SLOWEST_HZ:g} to {FASTEST_HZ:g} sets a second")
    return asked
