"""`drawcord play`: a score, a play file or a recording in real time."""

import json
import os
import signal
import sys
from collections.abc import Callable, Iterator
from contextlib import ExitStack, contextmanager

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
@click.option("--trim", is_flag=True, help="Correct pressure set-points, slowly, by what boards sense.")
@click.option("--rig", metavar="RIG", type=click.Path(path_type=str), help="Another rig file than the one named inside.")
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
    as_json: bool,
) -> int:
    """Play a score in real time.

    TARGET is where it goes; a rig with several drivers wants one for each, with its name in front: left=serial:/dev/ttyACM0.
    sim and file:PATH without a name take all drivers that are left, and need no arming.

    A score that the rig cannot do is refused unless --retime mends it first. Ctrl-C brings all fibers to rest at their safe
    rate and disarms; a second one vents. The software is no safety device.
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
    return _run(played, targets, hertz, start_s, arm, log, trim, as_json)


def _run(
    played, targets: tuple[str, ...], hertz: float, start_s: float, arm: bool, log: str | None, trim: bool, as_json: bool
) -> int:
    """Open, pre-flight, arm, play, and leave everything at rest, or vented, whatever happens."""
    from player.commands.front import Front
    from player.commands.logging_run import open_log
    from player.commands.priority import real_time
    from player.commands.run_report import report, sentences
    from player.engine.clock import SteadyClock
    from player.engine.loop import Engine
    from player.engine.safety import Refused
    from player.outputs.targets import Context, make_outputs

    clock = SteadyClock()
    outputs = make_outputs(targets, Context(played.rig, played.abilities, clock, hertz))
    with ExitStack() as stack:
        engine = Engine(played.rig, played.source(), outputs, clock, hertz, abilities=played.abilities, trims=trim)
        stack.callback(engine.close)
        interrupt = stack.enter_context(_signals(engine.ask))
        for output in outputs:
            output.open()
        _preflight(engine, sys.stderr if not as_json else None)
        if any(output.must_arm for output in outputs) and not arm and not _asked_to_arm(engine):
            click.echo("not armed; nothing has moved", err=True)
            return 2
        run_log = open_log(log, stack, engine, played, targets, clock.now()) if log is not None else None
        interrupt.become_stops()
        try:
            engine.arm()
        except Refused as why:
            click.echo(str(why), err=True)
            return 2
        with Front(engine.ask, played.say_place, quiet=as_json) as front:
            engine.returns = front.answers
            with real_time() as first:
                for status in engine.run(start_s):
                    front.show(status)
            front.show(engine.status())
        engine.close()
        told = report(engine, played, outputs, "real-time" if first else "usual")
        if run_log is not None:
            run_log.tell("end", clock.now(), **told)
    click.echo(json.dumps(told) if as_json else "\n".join(sentences(told)))
    return told["exit"]


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


def _preflight(engine, tell) -> None:
    """A mark a line; raises Faults with all that is not in order."""
    from composer.faults import Fault, Faults, Where
    from player.commands.marks import line

    marks = engine.preflight()
    wrong = [mark for mark in marks if not mark.ok]
    if wrong:
        raise Faults(
            Fault(Where("pre-flight"), f"not so: {mark.asked}" + (f": {mark.found}" if mark.found else ""), hint=mark.hint)
            for mark in wrong
        )
    if tell is not None and any(output.must_arm for output in engine.boards.outputs):
        for mark in marks:
            print(line(mark), file=tell)


def _asked_to_arm(engine) -> bool:
    """The operator's own deed, at the keyboard."""
    from composer.faults import fault
    from player.commands.front import ask_to_arm

    if not os.isatty(sys.stdin.fileno()) if sys.stdin else True:
        raise fault("--to", "a serial target has to be armed, and there is no terminal to ask at", hint="give --arm to arm it")
    return ask_to_arm(engine.tend)


class _Interrupt:
    """What signals do: before arming they end the program, afterwards they ask the engine to stop."""

    def __init__(self, ask: Callable[[str], None]):
        self._ask, self._stops = ask, False

    def become_stops(self) -> None:
        """From here on the fibers may be moving."""
        self._stops = True

    def __call__(self, *_: object) -> None:
        if not self._stops:
            raise KeyboardInterrupt
        self._ask("stop")


@contextmanager
def _signals(ask: Callable[[str], None]) -> Iterator[_Interrupt]:
    """Ctrl-C, and being told to end, or losing the terminal: the first brings all to rest, the second vents."""
    interrupt = _Interrupt(ask)
    numbers = [signal.SIGINT, signal.SIGTERM] + ([signal.SIGHUP] if hasattr(signal, "SIGHUP") else [])
    before = {number: signal.signal(number, interrupt) for number in numbers}
    try:
        yield interrupt
    finally:
        for number, handler in before.items():
            signal.signal(number, handler)
