"""`drawcord device`: a simulated valve driver behind a pseudo-terminal."""

import fcntl
import signal
import subprocess
import sys
from collections.abc import Callable
from contextlib import ExitStack, suppress

import click

from composer.faults import fault, nearest

PIPE_BYTES = 1 << 20


@click.command("device")
@click.argument("rig", metavar="RIG", type=click.Path(path_type=str))
@click.option("--driver", metavar="NAME", help="Which board of the rig; needed where it has several.")
@click.option("--fault", "mishap", metavar="NAME", help="Go wrong on purpose; an unknown name lists them.")
@click.option("--log", metavar="FILE", type=click.Path(path_type=str), help="Write each set, when due and when done, as CSV.")
@click.option("--name", metavar="TEXT", help="What the board calls itself.")
def command(rig: str, driver: str | None, mishap: str | None, log: str | None, name: str | None) -> int:
    """Run a simulated board of valves, with the rig's fibers behind it.

    The first line printed is the path of the terminal that it listens on: play to it with --to serial:PATH.
    It runs until Ctrl-C (or SIGTERM), and players may come and go; then every channel is vented.
    """
    from player.wire.mishaps import MISHAPS, Mishap

    if mishap is not None and mishap not in MISHAPS:
        rows = "\n".join(f"   {known:<14} {row.says}" for known, row in MISHAPS.items())
        raise click.UsageError(f"no fault '{mishap}'. {nearest(mishap, MISHAPS)}\nThe faults are:\n{rows}")
    from composer.load import load_rig
    from player.outputs.serial_bench import BenchProcess
    from player.outputs.serial_board import SerialBoard
    from player.outputs.serial_ports import announced
    from player.wire.rules import Build

    loaded = load_rig(rig)
    drivers = [board.name for board in loaded.drivers]
    driver = _choose(rig, drivers, driver)
    bench = BenchProcess(loaded, driver, mishap)
    try:
        called = name if name is not None else f"{loaded.name} {driver}, simulated"
        build = Build(called, bench.drives, senses_strain=True, senses_supply=True, rig=loaded.fingerprint)
    except ValueError as wrong:
        raise fault("--name", str(wrong)) from None
    with ExitStack() as stack:
        board = SerialBoard(build, bench, MISHAPS[mishap] if mishap else Mishap(""), _log(log, stack))
        for number in (signal.SIGINT, signal.SIGTERM, signal.SIGHUP):
            signal.signal(number, lambda *_: board.stop())
        stack.callback(bench.close)
        bench.start()
        stack.enter_context(announced(board.path, called + (f", fault {mishap}" if mishap else "")))
        click.echo(board.path)
        sys.stdout.flush()
        board.run()
    return 0


def _choose(rig: str, drivers: list[str], asked: str | None) -> str:
    """The board to be, of those of the rig."""
    if asked is None and len(drivers) == 1:
        return drivers[0]
    if asked in drivers:
        return asked
    names = ", ".join(drivers)
    if asked is None:
        raise fault(
            rig, f"the rig has {len(drivers)} boards: {names}", "one of them", "say which with --driver NAME; one process each"
        )
    raise fault(rig, f"no driver '{asked}'", f"one of {names}", nearest(asked, drivers))


def _log(path: str | None, stack: ExitStack) -> Callable[[str], None]:
    """Where the lines of the log go: through a pipe to a process that writes them.

    So a disk that is busy holds no set up, and a board that is killed leaves a log that is whole.
    """
    if path is None:
        return lambda line: None
    try:
        with open(path, "wb") as file:
            writer = subprocess.Popen(["cat"], stdin=subprocess.PIPE, stdout=file, bufsize=0, start_new_session=True)
    except (OSError, ValueError) as error:
        raise fault(path, f"the log cannot be written: {getattr(error, 'strerror', None) or error}") from None
    with suppress(OSError, AttributeError):
        fcntl.fcntl(writer.stdin, fcntl.F_SETPIPE_SZ, PIPE_BYTES)
    full = False

    def write(line: str) -> None:
        nonlocal full
        if full:
            return
        try:
            writer.stdin.write(line.encode())
        except OSError:
            # The board goes on: a log that is full must not leave valves open.
            full = True
            click.echo(f"{path}: the log ends here: it could not be written", err=True)

    def end() -> None:
        with suppress(OSError):
            writer.stdin.close()
        with suppress(subprocess.TimeoutExpired):
            writer.wait(10.0)

    stack.callback(end)
    return write
