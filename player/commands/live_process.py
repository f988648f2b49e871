"""What the process of a live session does: open, pre-flight, arm, play by hand, and leave everything at rest, or vented."""

import os
from contextlib import ExitStack
from typing import Any

from composer.faults import Faults, fault
from player.commands import play_process
from player.commands.earlier_logs import beside_earlier
from player.commands.live_setup import Call, set_up
from player.commands.logging_run import open_log
from player.commands.play_process import failed, not_armed
from player.commands.priority import at_its_best
from player.commands.run_report import report, sentences
from player.commands.shown import inputs_told
from player.commands.signals import stopping
from player.engine.process.conduct import Conduct
from player.engine.process.door import Door
from player.engine.process.layout import Writer
from player.engine.process.show import Show
from player.engine.safety import Refused
from player.inputs.load import load_map
from player.live.session import Session

STAND_BY_SAID = "All is at rest or vented, and disarmed. Press a to arm and play on from here, Ctrl-C to end."


def about(call: Call) -> dict[str, Any]:
    """What the session is, for front ends: as a run's, and hold_to_run, takes, take, map, midi and osc."""
    from player.inputs.osc import known_of

    groups = known_of(call.played.rig, call.loaded.score if call.loaded else None).groups
    return play_process.about(
        call.played, call.targets, call.hertz, "live", groups, hold_to_run=call.holds, takes=call.take is not None,
        take=call.take or "", map=call.map_path or "", midi=list(call.midi), osc=list(call.osc or ()),
    )  # fmt: skip


def body(door: Door, memory: Writer, call: Call, answers: bool) -> tuple[str, dict[str, Any]]:
    """The session, for `player.engine.process.start`; answers: whether a key can be held at the one that starts it."""
    played = call.played
    with ExitStack() as stack:
        parts = set_up(call, stack)
        engine, session = parts.engine, parts.session
        stack.callback(engine.close)
        interrupt = stack.enter_context(stopping(engine.ask))
        conduct = Conduct(engine, door, Show(memory, engine, played.rig, played.say_place), session.asked)
        conduct.view = lambda: session.live.view
        conduct.remap = Remap(call, session)
        conduct.inputs = lambda: inputs_told(session.inbox.seen, session.inbox.refused, session.take_says)
        for output in parts.outputs:
            output.open()
        if conduct.preflight() and parts.hold_to_run and not parts.hold_bound and not answers:
            raise _nothing_to_hold(played.rig.file)
        session.live.latency_s = engine.ahead_s + session.live.lead_s
        for said in parts.says:
            engine.tell(said)
        if not conduct.wait_for_arm():
            return not_armed(engine)
        run_log = open_log(call.log, stack, engine, played, call.targets, parts.clock.now()) if call.log is not None else None
        interrupt.become_stops()
        engine.returns_from = ("fault", "stopped", "vented")
        engine.stand_by_said = STAND_BY_SAID
        # From arming on boards vent when they hear nothing for a while: nothing else may keep the engine from talking to them.
        with at_its_best() as permitted:
            try:
                engine.arm()
            except Refused as why:
                return failed(str(why))
            engine.note("system", priority=permitted.priority, memory=permitted.memory, why=permitted.why)
            for status in engine.run(conduct.wait_for_play()):
                session.after(status)
                conduct.after(status)
        conduct.after(engine.status())
        engine.close()
        told = report(engine, played, parts.outputs, permitted)
        told |= {"inputs": session.inputs_seen, "refused": session.inbox.refused}
        told |= beside_earlier(call.log, played, told)
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
    return "ended", {"exit": told["exit"], "report": told, "lines": lines}


class Remap:
    """Called where a front end has changed the map file: why the session does not go by it, "" where it does."""

    def __init__(self, call: Call, session: Session):
        self._call, self._session, self._map = call, session, call.map_

    def __call__(self) -> str:
        """Read it and go by it."""
        path = self._call.map_path
        if path is None:
            return "the run has begun without a map: it counts from the next beginning on"
        try:
            after = load_map(path, self._call.played.rig, self._call.loaded.score if self._call.loaded else None)
        except Faults as wrong:
            return str(wrong)
        why = self._session.remap(self._map, after)
        if not why:
            self._map = after
        return why


def _nothing_to_hold(rig: str) -> Faults:
    return fault(
        rig,
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
