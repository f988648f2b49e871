"""What stands behind `--to`: one row a scheme, and which target gets which of the rig's drivers."""

import re
from collections.abc import Callable, Sequence
from dataclasses import dataclass

from composer.faults import Fault, Faults, Where, nearest
from composer.limits.abilities import Abilities
from composer.rig.model import Rig
from player.engine.clock import Clock
from player.outputs.base import Output

DEFAULT_BAUD = 1_000_000
"""Baud of a line for which none is said: 48 channels at 200 Hz fill a quarter of it."""

BAUDS = (115_200, 2_000_000)
"""Slowest and fastest line of the wire protocol."""

_TARGET = re.compile(r"(?:(?P<driver>[^=:/\\]*)=)?(?P<scheme>[^=:]+?)(?::(?P<rest>.*))?", re.DOTALL)
_BAUD = re.compile(r"(?P<port>.*)@(?P<baud>[^@/]*)", re.DOTALL)


@dataclass(frozen=True, slots=True)
class Target:
    """A target as written, and its parts; driver "" where none stands in front."""

    text: str
    driver: str
    scheme: str
    rest: str


@dataclass(frozen=True, slots=True)
class Context:
    """What an output may need to be made."""

    rig: Rig
    abilities: Abilities
    clock: Clock
    rate_Hz: float


@dataclass(frozen=True, slots=True)
class Scheme:
    """How a target of that scheme is written, what it is, how it is made, and whether it stands for one driver only."""

    written: str
    says: str
    make: Callable[[Context, tuple[str, ...], Target], Output]
    one_driver: bool


def _sim(context: Context, drivers: tuple[str, ...], target: Target) -> Output:
    from player.outputs.sim import Sim

    if target.rest:
        raise _wrong(target, f"'{target.rest}' after 'sim'", "'sim' alone")
    return Sim(context.rig, context.abilities, drivers)


def _file(context: Context, drivers: tuple[str, ...], target: Target) -> Output:
    from player.outputs.file import File

    if not target.rest:
        raise _wrong(target, "no path after 'file:'", "file:PATH, such as file:tonight.rec")
    return File(context.rig, drivers, target.rest, context.rate_Hz)


def _serial(context: Context, drivers: tuple[str, ...], target: Target) -> Output:
    from player.outputs.board import Board

    port, baud = target.rest, DEFAULT_BAUD
    if with_baud := _BAUD.fullmatch(target.rest):
        port = with_baud["port"]
        digits = with_baud["baud"]
        if not re.fullmatch("[0-9]{1,9}", digits) or not BAUDS[0] <= int(digits) <= BAUDS[1]:
            expected = f"a whole number from {BAUDS[0]} to {BAUDS[1]} after '@'"
            raise _wrong(target, f"a rate of '{digits[:20]}' baud", expected)
        baud = int(digits)
    if not port:
        raise _wrong(target, "no port after 'serial:'", "serial:PORT or serial:PORT@BAUD", "'drawcord ports' lists those found")
    return Board(context.rig, context.abilities, drivers[0], port, baud, context.clock)


SCHEMES = {
    "sim": Scheme("sim", "the simulated rig, in the player itself", _sim, one_driver=False),
    "file": Scheme("file:PATH", "a recording that can be played back", _file, one_driver=False),
    "serial": Scheme(
        "serial:PORT[@BAUD]", f"a valve driver on a serial line, at {DEFAULT_BAUD} baud unless said", _serial, True
    ),
}
"""Every kind of target; a further one is one file and one row."""


def make_outputs(texts: Sequence[str], context: Context) -> tuple[Output, ...]:
    """An output for each target; together they stand for each of the rig's drivers once.

    `sim` and `file` without a driver in front stand for all drivers that no other target names.

    Raises:
        Faults: for every target that is written wrong, names no driver or one twice, and for drivers left without one.
    """
    targets = parsed(texts)
    faults: list[Fault] = []
    known = [driver.name for driver in context.rig.drivers]
    taken: dict[str, Target] = {}
    for target in targets:
        if target.driver and target.driver not in known:
            found = f"no driver '{target.driver}' in {context.rig.file}"
            faults.append(_fault(target, found, _listed(known), nearest(target.driver, known)))
        elif target.driver in taken:
            found = f"driver '{target.driver}' has two targets, the other is {taken[target.driver].text}"
            faults.append(_fault(target, found, "one target for each driver"))
        elif target.driver:
            taken[target.driver] = target
    left = [name for name in known if name not in taken]
    share: dict[str, tuple[str, ...]] = {}
    for target in targets:
        if target.driver:
            continue
        if SCHEMES[target.scheme].one_driver and len(known) > 1:
            found = "this target does not say which driver it is for"
            expected = " or ".join(f"{name}={target.text}" for name in known[:4])
            faults.append(_fault(target, found, expected, f"the rig has {len(known)} drivers, each on a line of its own"))
        elif not left or target.text in share or share:
            others = " ".join(other.text for other in targets if other is not target)
            faults.append(_fault(target, f"no driver is left for this target, after {others}", "one target for each driver"))
        else:
            share[target.text] = tuple(left)
            left = []
    if left and not faults:
        missing = ", ".join(left)
        which = "driver" if len(left) == 1 else "drivers"
        hint = "add " + " ".join(f"--to {name}=TARGET" for name in left[:8])
        faults.append(Fault(Where("--to"), f"no target for {which} {missing} of {context.rig.file}", hint=hint))
    if faults:
        raise Faults(faults)
    made = []
    for target in targets:
        drivers = (target.driver,) if target.driver else share[target.text]
        made.append(SCHEMES[target.scheme].make(context, drivers, target))
    return tuple(made)


def parsed(texts: Sequence[str]) -> list[Target]:
    """The parts of every target. Raises Faults with all that are written wrong."""
    faults: list[Fault] = []
    targets: list[Target] = []
    for text in texts:
        try:
            targets.append(_parsed(text))
        except Faults as wrong:
            faults.extend(wrong.faults)
    if faults:
        raise Faults(faults)
    return targets


def files_of(texts: Sequence[str]) -> list[str]:
    """The paths that the targets would write. Raises Faults as `parsed`."""
    return [target.rest for target in parsed(texts) if target.scheme == "file" and target.rest]


def _parsed(text: str) -> Target:
    found = _TARGET.fullmatch(text)
    shown = ", ".join(scheme.written for scheme in SCHEMES.values())
    if found is None or not found["scheme"]:
        raise Faults([Fault(Where("--to"), f"'{text}' is no target", shown)])
    if found["scheme"] not in SCHEMES:
        hint = nearest(found["scheme"], SCHEMES)
        raise Faults([Fault(Where("--to"), f"'{text}': no kind of target '{found['scheme']}'", shown, hint)])
    return Target(text, found["driver"] or "", found["scheme"], found["rest"] or "")


def _listed(names: Sequence[str]) -> str:
    shown = ", ".join(names[:12])
    return ("one of " if len(names) > 1 else "") + shown + (", and more" if len(names) > 12 else "")


def _fault(target: Target, found: str, expected: str = "", hint: str = "") -> Fault:
    return Fault(Where(f"--to {target.text}"), found, expected, hint)


def _wrong(target: Target, found: str, expected: str = "", hint: str = "") -> Faults:
    return Faults([_fault(target, found, expected, hint)])
