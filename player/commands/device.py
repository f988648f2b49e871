"""`drawcord device`: a simulated valve driver behind a pseudo-terminal."""

import fcntl
import signal
import subprocess
import sys
from collections.abc import Callable
from contextlib import ExitStack, suppress
from typing import TYPE_CHECKING

import click

from composer.faults import Faults, fault, nearest

if TYPE_CHECKING:
    from composer.rig.model import Rig
    from player.wire.rules import Build

PIPE_BYTES = 1 << 20


@click.command("device")
@click.argument("rig", metavar="RIG", type=click.Path(path_type=str))
@click.option("--driver", metavar="NAME", help="Which board of the rig; needed where it has several.")
@click.option("--fault", "mishap", metavar="NAME", help="Go wrong on purpose; an unknown name lists them.")
@click.option("--log", metavar="FILE", type=click.Path(path_type=str), help="Write each set, when due and when done, as CSV.")
@click.option("--name", metavar="TEXT", help="What the board calls itself.")
@click.option("--portable", is_flag=True, help="The board in C, as firmware would be; wants a C compiler.")
def command(rig: str, driver: str | None, mishap: str | None, log: str | None, name: str | None, portable: bool) -> int:
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

    loaded = load_rig(rig)
    drivers = [board.name for board in loaded.drivers]
    driver = _choose(rig, drivers, driver)
    if portable:
        return _run_portable(loaded, driver, mishap, log, name)
    bench = BenchProcess(loaded, driver, mishap)
    build = _build(loaded, driver, bench.drives, name)
    with ExitStack() as stack:
        board = SerialBoard(build, bench, MISHAPS[mishap] if mishap else Mishap(""), _log(log, stack))
        for number in (signal.SIGINT, signal.SIGTERM, signal.SIGHUP):
            signal.signal(number, lambda *_: board.stop())
        stack.callback(bench.close)
        bench.start()
        stack.enter_context(announced(board.path, _says(build, mishap)))
        click.echo(board.path)
        sys.stdout.flush()
        board.run()
    return 0


def _run_portable(rig: "Rig", driver: str, mishap: str | None, log: str | None, name: str | None) -> int:
    """The same board, compiled from C."""
    from composer.limits.abilities import abilities_of
    from player.outputs.portable_board import MISHAP_OPTIONS, PortableBoard, compiled
    from player.outputs.serial_ports import announced
    from player.wire.device_c.plant import plant_text
    from player.wire.mishaps import MISHAPS, Mishap
    from player.wire.simulated import Bench

    abilities = abilities_of(rig)
    build = _build(rig, driver, Bench(rig, abilities, driver).drives, name)
    if len(build.name.splitlines()) > 1:
        raise fault("--name", "a name of several lines", "one line")
    row = MISHAPS[mishap] if mishap else Mishap("")
    text = plant_text(rig, abilities, driver, row.build(build))
    if log is not None:
        try:
            open(log, "wb").close()
        except (OSError, ValueError) as error:
            raise _no_log(log, error) from None
    board = PortableBoard(compiled(len(build.drives)), text, log, MISHAP_OPTIONS[mishap] if mishap else ())
    for number in (signal.SIGINT, signal.SIGTERM, signal.SIGHUP):
        signal.signal(number, lambda *_: board.stop())
    with announced(board.path, _says(build, mishap)):
        click.echo(board.path)
        sys.stdout.flush()
        return board.run()


def _build(rig: "Rig", driver: str, drives: tuple[str, ...], name: str | None) -> "Build":
    """What the board is, and says that it is."""
    from player.wire.rules import Build

    try:
        called = name if name is not None else f"{rig.name} {driver}, simulated"
        return Build(called, drives, senses_strain=True, senses_supply=True, rig=rig.fingerprint)
    except ValueError as wrong:
        raise fault("--name", str(wrong)) from None


def _says(build: "Build", mishap: str | None) -> str:
    return build.name + (f", fault {mishap}" if mishap else "")


def _no_log(path: str, error: Exception) -> Faults:
    return fault(path, f"the log cannot be written: {getattr(error, 'strerror', None) or error}")


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
        raise _no_log(path, error) from None
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
