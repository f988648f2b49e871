"""A live session from the command line: everything read and checked before anything is opened, then the parts put together."""

import os
from contextlib import ExitStack
from dataclasses import dataclass

import click

from composer.faults import Faults, fault
from composer.limits.abilities import abilities_of
from composer.load import Loaded, load_rig, load_score
from composer.rig.model import Rig
from composer.rig.select import Selector
from composer.score.names import groups_of
from player.commands.live import AHEAD_S
from player.commands.play import _check_written, _rate, _refuse_clashes
from player.commands.played import Played
from player.engine.clock import Clock, SteadyClock, stamp, time_of_day
from player.engine.loop import Engine
from player.engine.transport import Cue
from player.inputs.load import learn_into, load_map
from player.inputs.midi_clock import ClockFollower
from player.inputs.midi_ports import MidiPorts
from player.inputs.model import NO_MAP, Does, Map, Play
from player.inputs.mtc import CodeFollower
from player.inputs.osc import known_of
from player.inputs.osc_port import OscPort, is_loopback, read_address
from player.live.beneath import Beneath, Followed, Nothing, Own, tempo_at
from player.live.clock_out import ClockOut
from player.live.inbox import Inbox
from player.live.learning import deed_of
from player.live.repertoire import Repertoire
from player.live.session import Session
from player.live.source import Live
from player.live.takes import SUFFIX, Takes
from player.outputs.base import Output
from player.outputs.targets import Context, make_outputs

RIG_ENDING = ".toml"
NOT_SENT = "no --midi is given, so the MIDI binds of the map hear nothing"


@dataclass(frozen=True, slots=True, eq=False)
class Call:
    """A call that can be carried out: what is played, by which inputs, to where; `loaded` is None for a rig alone."""

    played: Played
    loaded: Loaded | None
    map_: Map
    map_path: str | None
    targets: tuple[str, ...]
    midi: tuple[str, ...]
    osc: tuple[str, int] | None
    osc_to: tuple[str, int] | None
    take: str | None
    follow: str | None
    send_clock: str | None
    start_s: float
    hertz: float
    log: str | None

    @property
    def hold_bound(self) -> bool:
        """Whether the map binds a control as the hold-to-run."""
        return any(isinstance(bind.deed, Does) and bind.deed.what == "hold_to_run" for bind in self.map_.binds)

    @property
    def holds(self) -> bool:
        """Whether the session runs only while something is held."""
        return self.played.rig.worn or self.hold_bound


@dataclass(frozen=True, slots=True, eq=False)
class Parts:
    """The parts of a session, put together but not begun; says: what the operator is told first."""

    clock: Clock
    engine: Engine
    session: Session
    outputs: tuple[Output, ...]
    hold_to_run: bool
    hold_bound: bool
    says: tuple[str, ...]


def checked(
    *, score: str, targets: tuple[str, ...], map_path: str | None, midi: tuple[str, ...], osc: str | None, osc_to: str | None,
    take: str | None, follow: str | None, send_clock: str | None, start: str | None, rate: float | None, log: str | None,
    rig: str | None, learn: str | None, hands: bool = True,
) -> Call:  # fmt: skip
    """Everything that can be wrong with a call, told before a port is touched; hands: MIDI or OSC is wanted.

    Raises Faults or a usage error.
    """
    if learn is None:
        if not targets:
            raise click.UsageError("where to? Add --to sim, --to serial:PORT[@BAUD] or --to file:PATH")
        if hands and not midi and osc is None:
            raise click.UsageError("by what hand? Add --midi PORT, or --osc HOST:PORT; 'drawcord ports' lists the MIDI ports")
    elif not midi or map_path is None:
        raise click.UsageError("--learn wants --midi PORT, where the control is, and --map MAP.toml, which gets the bind")
    if follow is not None and not midi:
        raise click.UsageError(f"--follow {follow} wants --midi PORT, where the clock comes from")
    written = [path for path in (take, take and os.path.splitext(take)[0] + SUFFIX) if path]
    _check_written(targets, log, score, rig, map_path, *written)
    played, loaded = _played(score, rig)
    _refuse_clashes([played.rig.file, *played.used, *written], targets, log)
    if take is not None:
        _refuse_clashes([played.rig.file, *played.used, *([map_path] if map_path else []), score], (), take)
    if loaded is None and (follow or send_clock or start):
        which = "--follow" if follow else "--send-clock" if send_clock else "--from"
        raise fault(which, "a rig alone has no score and no tempo", "a score, which then plays under the hands")
    new = map_path is not None and learn is not None and not os.path.exists(map_path)
    map_ = NO_MAP if map_path is None or new else load_map(map_path, played.rig, loaded.score if loaded else None)
    if loaded is not None:
        _check_phrases(map_, loaded, map_path or "")
    return Call(
        played, loaded, map_, map_path, targets, midi, None if osc is None else read_address(osc),
        None if osc_to is None else read_address(osc_to, "--osc-to"), take, follow, send_clock,
        played.seconds_of(start) if start is not None else 0.0, _rate(rate, 200.0), log,
    )  # fmt: skip


def learned(call: Call, what: str, as_json: bool) -> int:
    """Wait for the control that is moved next, and add a bind for it to the map."""
    from player.inputs.learn import Learner

    rig, score = call.played.rig, call.loaded.score if call.loaded else None
    selector = Selector(rig, groups_of(score) if score is not None else {})
    deed = deed_of(what, selector, score.phrases if score is not None else ())
    assert call.map_path is not None
    clock, learner = SteadyClock(), Learner()
    ports = MidiPorts(clock.now, call.midi)
    try:
        for said in ports.missing():
            click.echo(said, err=True)
        click.echo(f"Move the control for '{what}', or press its key; Ctrl-C leaves it.", err=True)
        while True:
            for heard in ports.poll()[0]:
                control = learner.hear(heard.message)
                if control is not None:
                    learn_into(call.map_path, control, deed, rig, score)
                    if as_json:
                        import json

                        click.echo(json.dumps({"map": call.map_path, "control": str(control), "bind": deed.split("\n")}))
                    else:
                        click.echo(f"{call.map_path}: {control} of {heard.source} is bound now: {', '.join(deed.splitlines())}")
                    return 0
            clock.wait_until(clock.now() + 0.01)
    finally:
        ports.close()


def set_up(call: Call, stack: ExitStack) -> Parts:
    """Ports opened, parts put together; closed with the stack."""
    played, rig, abilities = call.played, call.played.rig, call.played.abilities
    clock = SteadyClock()
    says: list[str] = []
    outputs = make_outputs(call.targets, Context(rig, abilities, clock, call.hertz))
    known = known_of(rig, call.loaded.score if call.loaded else None)
    ports = osc = None
    sends = (*call.midi, *([call.send_clock] if call.send_clock else []))
    if sends:
        ports = MidiPorts(clock.now, call.midi, sends)
        stack.callback(ports.close)
        says += ports.missing()
    if call.osc is not None:
        osc = OscPort(*call.osc)
        stack.callback(osc.close)
        if not is_loopback(call.osc[0]):
            says.append(f"OSC is heard at {call.osc[0]}:{call.osc[1]} from the network: whoever can reach it moves the fibers")
    if not call.midi and any(bind.control is not None for bind in call.map_.binds):
        says.append(NOT_SENT)
    inbox = Inbox(call.map_, known, played.names, clock.now, time_of_day, ports, osc)
    engines: list[Engine] = []
    live = Live(
        rig, abilities, _beneath(call, lambda said: engines[0].tell(said)), inbox, clock.now,
        lambda kind, value=0.0: engines[0].ask(kind, value), lambda said: engines[0].tell(said), _repertoire(call),
        1.0 / call.hertz, call.holds, played.cues,
    )  # fmt: skip
    engine = Engine(rig, live, outputs, clock, call.hertz, ahead_s=AHEAD_S, abilities=abilities)
    engines.append(engine)
    takes = None
    if call.take is not None:
        score_path = played.path if call.loaded is not None else ""
        takes = Takes(call.take, rig, abilities.stroke, score_path, call.hertz, stamp(), engine.tell)
        stack.callback(takes.close)
    clock_out = None
    if call.send_clock is not None:
        port = call.send_clock
        clock_out = ClockOut(clock, lambda message: inbox.send(message, port))
        stack.callback(clock_out.close)
    send_osc = None
    if call.osc_to is not None:
        host, port_number = call.osc_to
        sender = osc
        if sender is None:
            sender = OscPort("127.0.0.1" if is_loopback(host) else "0.0.0.0", 0)
            stack.callback(sender.close)
        send_osc = lambda data: sender.send(data, host, port_number)  # noqa: E731
    session = Session(
        engine, live, inbox, clock.now, played.say_place, played.names, abilities.stroke, played.title, takes, clock_out,
        send_osc,
    )  # fmt: skip
    return Parts(clock, engine, session, outputs, call.holds, call.hold_bound, tuple(says))


def _played(path: str, rig_path: str | None) -> tuple[Played, Loaded | None]:
    """A rig by its ending, or else a score; what the rig cannot do of it is for the governor."""
    if path.endswith(RIG_ENDING):
        if rig_path is not None:
            raise fault("--rig", f"{path} is a rig itself", "--rig only with a score")
        rig = load_rig(path)
        return Played(path, "rig", rig.name or os.path.basename(path), rig, abilities_of(rig)), None
    loaded = load_score(path, None if rig_path is None else load_rig(rig_path))
    cues = tuple(Cue(cue.name, cue.seconds, cue.wait) for cue in loaded.cues)
    title = loaded.score.title or os.path.basename(path)
    played = Played(
        path,
        "score",
        title,
        loaded.rig,
        loaded.abilities,
        loaded.tracks,
        loaded.tempo,
        cues=cues,
        used=tuple(loaded.score.lines),
    )
    return played, loaded


def _repertoire(call: Call) -> Repertoire | None:
    """The score's phrases, those that are bound made ready at the tempo it begins with."""
    if call.loaded is None:
        return None
    repertoire = Repertoire(call.loaded.score, call.played.rig, call.played.abilities)
    rate = tempo_at(call.loaded.tempo, call.start_s)
    for bind in call.map_.binds:
        if isinstance(bind.deed, Play):
            repertoire.ready(bind.deed.phrase, bind.deed.fibers, rate)
    return repertoire


def _check_phrases(map_: Map, loaded: Loaded, file: str) -> None:
    """Every bound phrase can be played by its fibers. Raises Faults at the bind's line."""
    repertoire = Repertoire(loaded.score, loaded.rig, loaded.abilities)
    for bind in map_.binds:
        if isinstance(bind.deed, Play):
            try:
                repertoire.ready(bind.deed.phrase, bind.deed.fibers, 1.0)
            except Faults as wrong:
                first = wrong.faults[0]
                found = f"these fibers cannot play '{bind.deed.phrase}': {first.found}"
                raise fault(f"{file}:{bind.line}", found, first.expected, first.hint) from None


def _beneath(call: Call, tell) -> Beneath:
    played: Played = call.played
    rig: Rig = played.rig
    if played.tracks is None or played.tempo is None:
        return Nothing(len(rig.fibers))
    if call.follow is None:
        return Own(played.tracks, played.abilities, played.cues, played.tempo)
    follower = ClockFollower(tempo_at(played.tempo, call.start_s)) if call.follow == "clock" else CodeFollower()
    return Followed(played.tracks, played.abilities, played.cues, played.tempo, follower, tell)
