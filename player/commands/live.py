"""`drawcord live`: a rig, or a score, under the hands."""

import json
import os
import sys
from collections import deque
from contextlib import ExitStack

import click

AHEAD_S = 0.02
"""Sets are sent so long before they are due, less than for a score alone: what a hand does is to be seen at once."""

SCREEN_S = 0.05

STAND_BY_SAID = "All is at rest or vented, and disarmed. Press a to arm and play on from here, Ctrl-C to end."


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
@click.option("--json", "as_json", is_flag=True, help="Print one JSON object at the end, and nothing else.")
def command(
    score: str, targets: tuple[str, ...], map_path: str | None, midi: tuple[str, ...], osc: str | None, osc_to: str | None,
    take: str | None, follow: str | None, send_clock: str | None, start: str | None, rate: float | None, arm: bool,
    log: str | None, rig: str | None, learn: str | None, as_json: bool,
) -> int:  # fmt: skip
    """Play a rig by hand, or a score under the hands.

    What comes in by MIDI and OSC goes through the governor: whatever is asked for, the fibers do what they can and no more.
    A worn rig runs only while a pedal or key is held. Ctrl-C brings all to rest at their safe rate and disarms; a second one
    vents. The software is no safety device.
    """
    from player.commands.live_setup import checked, learned, set_up

    call = checked(
        score=score, targets=targets, map_path=map_path, midi=midi, osc=osc, osc_to=osc_to, take=take, follow=follow,
        send_clock=send_clock, start=start, rate=rate, log=log, rig=rig, learn=learn,
    )  # fmt: skip
    if learn is not None:
        return learned(call, learn, as_json)
    with ExitStack() as stack:
        parts = set_up(call, stack)
        return _run(call, parts, stack, arm, as_json)


def _run(call, parts, stack: ExitStack, arm: bool, as_json: bool) -> int:
    """Pre-flight, arm, play by hand, and leave everything at rest, or vented, whatever happens."""
    from player.commands.live_front import LiveFront
    from player.commands.logging_run import open_log
    from player.commands.play import _asked_to_arm, _preflight, _signals
    from player.commands.priority import real_time
    from player.commands.run_report import report, sentences
    from player.engine.safety import Refused
    from player.live.screen import meters_of

    engine, session, played = parts.engine, parts.session, call.played
    stack.callback(engine.close)
    interrupt = stack.enter_context(_signals(engine.ask))
    for output in parts.outputs:
        output.open()
    _preflight(engine, sys.stderr if not as_json else None)
    session.live.latency_s = engine.ahead_s + session.live.lead_s
    for said in parts.says:
        engine.tell(said)
    keys: deque[str] = deque(maxlen=1000)
    meters = meters_of(parts.groups, played.names, played.abilities.stroke)
    front = LiveFront(keys.append, parts.clock.now, meters, quiet=as_json)
    if parts.hold_to_run and not parts.hold_bound and not front.answers:
        raise _nothing_to_hold(played)
    if any(output.must_arm for output in parts.outputs) and not arm and not _asked_to_arm(engine):
        click.echo("not armed; nothing has moved", err=True)
        return 2
    run_log = open_log(call.log, stack, engine, played, call.targets, parts.clock.now()) if call.log is not None else None
    interrupt.become_stops()
    try:
        engine.arm()
    except Refused as why:
        click.echo(str(why), err=True)
        return 2
    with front:
        engine.returns = front.answers
        engine.returns_from = ("fault", "stopped", "vented")
        engine.stand_by_said = STAND_BY_SAID
        shown_s = float("-inf")
        with real_time() as first:
            for status in engine.run(call.start_s):
                while keys:
                    session.asked(keys.popleft())
                session.after(status)
                front.tell(status.told)
                if parts.clock.now() - shown_s >= SCREEN_S:
                    shown_s = parts.clock.now()
                    front.show(session.scene(status, front.told, parts.hold_to_run))
        front.tell(engine.status().told)
    engine.close()
    told = report(engine, played, parts.outputs, "real-time" if first else "usual")
    told |= {"inputs": session.inputs_seen, "refused": session.inbox.refused}
    lines = sentences(told)
    if session.takes is not None:
        session.takes.close()
        written = session.takes.written()
        told["takes"] = [_take_told(one) for one in written]
        lines += [line for one in written for line in _take_said(one)]
        if not all(one.good for one in written):
            told["exit"] = max(told["exit"], 1)
    if run_log is not None:
        run_log.tell("end", parts.clock.now(), **told)
    click.echo(json.dumps(told, allow_nan=False) if as_json else "\n".join(lines))
    return told["exit"]


def _nothing_to_hold(played):
    from composer.faults import fault

    return fault(
        played.rig.file,
        "this rig is worn, so it runs only while something is held, and nothing is",
        'a bind with does = "hold_to_run" in the map, or a terminal at which the key h is held',
        "bind a pedal: midi = { cc = 64 }",
    )


def _take_told(one) -> dict:
    told = {"take": one.take, "score": one.score if one.made else None, "ok": one.good, "why": one.why}
    if one.made is not None:
        made = one.made
        told |= {
            "until_s": made.until_s, "fibers": made.fibers, "phrases": made.phrases, "knots": made.knots, "worst": made.worst,
            "worst_fiber": made.worst_fiber, "snags": len(made.checked.snags),
        }  # fmt: skip
    return told


def _take_said(one) -> list[str]:
    if one.made is None:
        return [f"{one.take}: recorded, but no score was made of it: {one.why}"]
    made = one.made
    clean = "it checks clean" if made.checked.ok else f"it has {len(made.checked.snags)} snags, which 'drawcord check' tells"
    return [
        f"{one.score}: written from {os.path.basename(one.take)}; {made.fibers} fibers, {made.knots} moves and holds, within "
        f"{100.0 * made.worst:.2f} % of the stroke of what was played ({made.worst_fiber}); {clean}"
    ]
