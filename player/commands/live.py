"""`drawcord live`: a rig, or a score, under the hands."""

import click

AHEAD_S = 0.02
"""Sets are sent so long before they are due, less than for a score alone: what a hand does is to be seen at once."""


@click.command("live")
@click.argument("score", metavar="RIG|SCORE", type=click.Path(path_type=str))
@click.option("--to", "targets", metavar="TARGET", multiple=True, help="sim, serial:PORT[@BAUD] or file:PATH.")
@click.option("--map", "map_path", metavar="MAP.toml", type=click.Path(path_type=str), help="Which control does what.")
@click.option("--midi", metavar="PORT", multiple=True, help="Hear every MIDI port with this in its name.")
@click.option("--osc", metavar="HOST:PORT", help="Hear Open Sound Control there; on loopback where only a port is given.")
@click.option("--osc-to", metavar="HOST:PORT", help="Send state, cues and cuts there.")
@click.option("--take", metavar="OUT.score", type=click.Path(path_type=str), help="Record, and write it as a score at the end.")
@click.option("--follow", type=click.Choice(["clock", "timecode"]), help="The score goes with a clock that comes in by MIDI.")
@click.option("--send-clock", metavar="PORT", help="Send the score's tempo as MIDI clock to ports with this in their name.")
@click.option("--from", "start", metavar="CUE|PLACE", help="Start at a cue, or a place such as 5:1 or 12.4s.")
@click.option("--rate", metavar="HZ", type=float, help="Sets a second; 200 unless given.")
@click.option("--arm", is_flag=True, help="Arm without asking.")
@click.option("--log", metavar="FILE", type=click.Path(path_type=str), help="Keep the run's log.")
@click.option("--rig", metavar="RIG", type=click.Path(path_type=str), help="Another rig file than the one that a score names.")
@click.option("--learn", metavar="WHAT", help="Bind the control moved next to WHAT (fibers, 'PHRASE on FIBERS', or vent, …).")
@click.option(
    "--when-left",
    type=click.Choice(["rest", "go-on"]),
    default="rest",
    help="What the session does where this terminal goes away: rest, unless go-on is given.",
)
@click.option("--json", "as_json", is_flag=True, help="Print one JSON object at the end, and nothing else.")
def command(
    score: str, targets: tuple[str, ...], map_path: str | None, midi: tuple[str, ...], osc: str | None, osc_to: str | None,
    take: str | None, follow: str | None, send_clock: str | None, start: str | None, rate: float | None, arm: bool,
    log: str | None, rig: str | None, learn: str | None, when_left: str, as_json: bool,
) -> int:  # fmt: skip
    """Play a rig by hand, or a score under the hands.

    What comes in by MIDI and OSC goes through the governor: whatever is asked for, the fibers do what they can and no more.
    A worn rig runs only while a pedal or key is held. Ctrl-C brings all to rest at their safe rate and disarms; a second one
    vents. The session is a process of its own: where this terminal goes away, --when-left says what becomes of it. The software
    is no safety device.
    """
    from player.commands.live_setup import checked, learned

    call = checked(
        score=score, targets=targets, map_path=map_path, midi=midi, osc=osc, osc_to=osc_to, take=take, follow=follow,
        send_clock=send_clock, start=start, rate=rate, log=log, rig=rig, learn=learn,
    )  # fmt: skip
    if learn is not None:
        return learned(call, learn, as_json)
    return _run(call, arm, when_left, as_json)


def _run(call, arm: bool, rule: str, as_json: bool) -> int:
    """Start the session in a process of its own, and be its front end."""
    from player.commands import live_process
    from player.commands.attending import begun, commanded
    from player.commands.live_front import LiveFront
    from player.commands.terminal import has_keys, is_screen

    about = live_process.about(call)
    answers = not as_json and is_screen() and has_keys()
    client = begun(live_process.body, about, rule, call, answers, answers=answers)
    return commanded(client, arm, call.start_s, as_json, lambda ask: LiveFront(ask, about, quiet=as_json), rule)
