"""What the process of a run does, from `play`: open, pre-flight, arm, play, and leave everything at rest, or vented."""

import os
from collections.abc import Sequence
from contextlib import ExitStack
from typing import Any

import numpy as np

from player.commands.earlier_logs import beside_earlier, learned
from player.commands.logging_run import open_log
from player.commands.played import Played
from player.commands.priority import at_its_best
from player.commands.run_report import report, sentences
from player.commands.signals import stopping
from player.engine.clock import SteadyClock, stamp
from player.engine.loop import Engine
from player.engine.process.conduct import Conduct
from player.engine.process.door import Door
from player.engine.process.layout import Writer
from player.engine.process.show import Show, boards_of
from player.engine.safety import Refused
from player.engine.trim import Trim
from player.outputs.targets import Context, make_outputs

NOT_ARMED = "not armed; nothing has moved"


def about(
    played: Played, targets: Sequence[str], rate_Hz: float, kind: str = "play", groups: Any = None, **more: Any
) -> dict[str, Any]:
    """What a run is, for front ends: all that they need to know and that does not change.

    keys: kind ("play" or "live"), folder (from which paths are told), played, title, rig, worn, fibers, stroke (strain),
        drives, boards, groups ([name, indices]), targets, rate_Hz, duration_s, cues ([name, at_s, waits]), began (UTC)
    """
    return {
        "kind": kind,
        "folder": os.getcwd(),
        "played": played.path,
        "title": played.title,
        "rig": played.rig.file,
        "worn": played.rig.worn,
        "fibers": list(played.names),
        "stroke": [float(stroke) for stroke in played.abilities.stroke],
        "drives": [fiber.mounting.valve.drive for fiber in played.rig.fibers],
        "boards": list(boards_of(played.rig)),
        "groups": [[name, [int(one) for one in of]] for name, of in (groups or {}).items()],
        "targets": list(targets),
        "rate_Hz": rate_Hz,
        "duration_s": played.tracks.duration_s if played.tracks is not None else 0.0,
        "cues": [[cue.name, cue.at_s, cue.wait] for cue in played.cues],
        "began": stamp(),
    } | more


def body(
    door: Door, memory: Writer, played: Played, targets: tuple[str, ...], rate_Hz: float, log: str | None, trims: bool
) -> tuple[str, dict[str, Any]]:
    """The run, for `player.engine.process.start`; returns its last message."""
    clock = SteadyClock()
    outputs = make_outputs(targets, Context(played.rig, played.abilities, clock, rate_Hz))
    with ExitStack() as stack:
        engine = Engine(played.rig, played.source(), outputs, clock, rate_Hz, abilities=played.abilities, trims=trims)
        stack.callback(engine.close)
        interrupt = stack.enter_context(stopping(engine.ask))
        conduct = Conduct(engine, door, Show(memory, engine, played.rig, played.say_place))
        for output in outputs:
            output.open()
        conduct.preflight()
        if not conduct.wait_for_arm():
            return not_armed(engine)
        if (trim := engine.sensing.trim) is not None:
            _take_up(trim, log, played, engine)
        run_log = open_log(log, stack, engine, played, targets, clock.now()) if log is not None else None
        interrupt.become_stops()
        # From arming on boards vent when they hear nothing for a while: nothing else may keep the engine from talking to them.
        with at_its_best() as permitted:
            try:
                engine.arm()
            except Refused as why:
                return failed(str(why))
            engine.note("system", priority=permitted.priority, memory=permitted.memory, why=permitted.why)
            for status in engine.run(conduct.wait_for_play()):
                conduct.after(status)
        conduct.after(engine.status())
        engine.close()
        told = report(engine, played, outputs, permitted)
        told |= beside_earlier(log, played, told)
        if run_log is not None:
            run_log.tell("end", clock.now(), **told, **({} if trim is None else {"trim": np.round(trim.by, 4).tolist()}))
    return "ended", {"exit": told["exit"], "report": told, "lines": sentences(told)}


def _take_up(trim: Trim, log: str | None, played: Played, engine: Engine) -> None:
    """What the trim learned in the rig's last run, where logs are kept."""
    found = learned(log, f"{played.rig.fingerprint:08x}", len(played.names))
    if found is not None:
        trim.begin_with(found[1])
        engine.tell(f"the trim begins with what was learned up to the end of {found[0]}")


def not_armed(engine: Engine) -> tuple[str, dict[str, Any]]:
    """The last message where the run did not come about."""
    return failed(NOT_ARMED if engine.safety.state != "vented" else "vented, and not armed; nothing has moved")


def failed(why: str, code: int = 2) -> tuple[str, dict[str, Any]]:
    """The last message of a run that did not come about."""
    return "failed", {"exit": code, "lines": [why]}
