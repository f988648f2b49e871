"""The fibers of a rig file: single ones and rows, their channels and their mirrors."""

import math
import re
from dataclasses import dataclass
from typing import Any

from composer.faults import nearest
from composer.fiber.kinds import KINDS
from composer.fiber.mounting import Mounting, Supply, Valve
from composer.rig.document import Document, say_names, say_value
from composer.rig.lines import Path
from composer.rig.model import Driver, Fiber, FiberType
from composer.rig.schema import FIBER, FIBERS, HANGING, LONGEST_NAME, MOST_FIBERS, NAME_RULE, SUPPLY, VALVE_TYPE
from composer.rig.values import read_table

_NAME = re.compile(r"[^\W\d_][\w.-]*")


@dataclass(frozen=True, slots=True)
class Stock:
    """What fibers are made from: types, valves and boards by name, None where their tables had faults.

    A fiber that names one of those is not blamed for it.
    """

    types: dict[str, FiberType | None]
    valves: dict[str, Valve | None]
    drivers: dict[str, Driver | None]
    supply: Supply | None
    worn: bool

    @property
    def tables(self) -> dict[str, tuple[str, dict[str, Any]]]:
        """The key of a fiber that names each, with the table and what is in it."""
        return {
            "type": ("fiber_type", self.types),
            "valve": ("valve_type", self.valves),
            "driver": ("driver", self.drivers),
        }


@dataclass(slots=True)
class Hung:
    """A fiber as written, before names become things; `path` is its table, or the table of its row."""

    path: Path
    name: str
    channel: int
    at_m: tuple[float, float, float]
    mirror: str | None
    values: dict[str, Any]


@dataclass(slots=True)
class Fibers:
    """The fibers as written; `known` False where a table's faults keep back what fibers there would be."""

    hung: list[Hung]
    known: bool = True


def good_name(name: str) -> bool:
    """Whether a score can name it."""
    return len(name) <= LONGEST_NAME and _NAME.fullmatch(name) is not None


def check_name(document: Document, path: Path, name: str, *, at_key: bool = False) -> bool:
    """Note a fault where a name is none that a score could use; true if it is one."""
    if good_name(name):
        return True
    note = document.at_key if at_key else document.at_value
    expected = NAME_RULE if len(name) <= LONGEST_NAME else f"at most {LONGEST_NAME} characters"
    note(path, f"the name {say_value(name)} cannot be used in a score", expected)
    return False


def read_fibers(document: Document, stock: Stock) -> tuple[Fibers, tuple[Fiber, ...]]:
    """All fibers in the file's order, as written and as they are; the latter lacks those that have faults."""
    found = _rows(document, stock)
    _check_names(document, found.hung)
    _check_channels(document, found.hung, stock)
    mirrors = _mirrors(document, found)
    fibers = [_fiber(document, item, stock, mirrors.get(item.name)) for item in found.hung]
    _check_makes(document, found.hung, fibers)
    return found, tuple(fiber for fiber in fibers if fiber is not None)


def _rows(document: Document, stock: Stock) -> Fibers:
    """Every table of fibers, rows spread out, in the order of their lines."""
    tables: list[tuple[int, Path, Any, Any]] = []
    for table in (FIBER, FIBERS):
        written = document.values.get(table.name, [])
        if not isinstance(written, list):
            hint = f"write [[{table.name}]]" if isinstance(written, dict) else ""
            document.at_key((table.name,), f"'{table.name}' is {say_value(written)}", f"tables headed [[{table.name}]]", hint)
            continue
        for index, row in enumerate(written):
            path = (table.name, index)
            tables.append((document.line(path), path, row, table))
    tables.sort(key=lambda item: (item[0], document.place(item[1]).key.column))
    if not tables:
        document.faults or document.at_key((), "the rig has no fibers", "at least one [[fiber]] or [[fibers]]")
    found = Fibers([])
    for _, path, row, table in tables:
        what = f"[[{table.name}]]"
        if isinstance(row, dict) and isinstance(row.get("name"), str) and row["name"].strip():
            what += f" {say_value(row['name'])}"
        values = read_table(document, path, row, table.keys, what)
        if values is None:
            found.known = False
            _look_up_names(document, stock, path, row)
        elif check_name(document, (*path, "name"), values["name"]):
            found.hung += [_single(path, values)] if table is FIBER else _spread(path, values)
        else:
            found.known = False
        if len(found.hung) > MOST_FIBERS:
            document.at_key(path, f"more than {MOST_FIBERS} fibers", f"at most {MOST_FIBERS} in a rig")
            return Fibers([], known=False)
    return found


def _look_up_names(document: Document, stock: Stock, path: Path, row: Any) -> None:
    """Look up the names in a table that has other faults, so that all of them are said at once."""
    for key, (table, known) in stock.tables.items():
        name = row.get(key) if isinstance(row, dict) else None
        if isinstance(name, str) and name.strip() and name not in known:
            _no_such(document, (*path, key), name, table, known)
    name = row.get("name") if isinstance(row, dict) else None
    if isinstance(name, str) and name.strip():
        check_name(document, (*path, "name"), name)


def _single(path: Path, values: dict[str, Any]) -> Hung:
    """A [[fiber]]."""
    return Hung(path, values["name"], values["channel"], _place(values["at_m"], (0.0, 0.0, 0.0), 0), values["mirror"], values)


def _spread(path: Path, values: dict[str, Any]) -> list[Hung]:
    """A row of [[fibers]], one after the other."""
    name, count = values["name"], values["count"]
    return [
        Hung(
            path,
            f"{name}.{n + 1}",
            values["first_channel"] + n,
            _place(values["at_m"], values["step_m"], n),
            f"{name}.{count - n}" if values["mirrored"] else None,
            values,
        )
        for n in range(count)
    ]


def _place(at: tuple[float, ...], step: tuple[float, ...], n: int) -> tuple[float, float, float]:
    """Where the n-th of a row hangs, to the nanometre: 3 steps of 0.05 m are 0.15 m, as if written singly."""
    x, y, z = (round(a + n * s, 9) + 0.0 for a, s in zip(at, step, strict=True))
    return x, y, z


def _check_names(document: Document, hung: list[Hung]) -> None:
    """Every name once."""
    seen: dict[str, Hung] = {}
    blamed = set()
    for item in hung:
        other = seen.setdefault(item.name, item)
        if other is not item and (item.path, other.path) not in blamed:
            blamed.add((item.path, other.path))
            line = document.line(other.path)
            hint = f"the other stands at line {line}; every fiber needs a name of its own"
            document.at_value((*item.path, "name"), f"the name '{item.name}' is used twice", "", hint)


def _check_channels(document: Document, hung: list[Hung], stock: Stock) -> None:
    """Every channel once on its driver, and none beyond it."""
    seen: dict[tuple[str, int], Hung] = {}
    blamed = set()
    for item in hung:
        driver = _choose(item.values["driver"], stock.drivers)
        if driver is None:
            continue
        key = (*item.path, "channel" if item.path[0] == "fiber" else "first_channel")
        board = stock.drivers.get(driver)
        if board is not None and item.channel >= board.channels and item.path not in blamed:
            blamed.add(item.path)
            found = f"{item.name} is on channel {item.channel}, but driver '{driver}' has {board.channels} channels"
            document.at_value(key, found, f"a channel from 0 to {board.channels - 1}")
        other = seen.setdefault((driver, item.channel), item)
        if other is not item and (item.path, other.path) not in blamed:
            blamed.add((item.path, other.path))
            both = f"{item.name} and {other.name} (line {document.line(other.path)})"
            found = f"{both} are both on channel {item.channel} of driver '{driver}'"
            document.at_value(key, found, "a channel of its own for every fiber", _free(hung, item, driver, stock))


def _free(hung: list[Hung], item: Hung, driver: str, stock: Stock) -> str:
    """What to write for a fiber, or a row of them, to have channels that none else has; nothing where there is no such room."""
    used = {
        other.channel for other in hung if other.path != item.path and _choose(other.values["driver"], stock.drivers) == driver
    }
    wide = sum(other.path == item.path for other in hung)
    # The room begins at 0 or behind a used channel.
    first = next(n for n in sorted({0, *(channel + 1 for channel in used)}) if used.isdisjoint(range(n, n + wide)))
    board = stock.drivers.get(driver)
    if board is not None and first + wide > board.channels:
        return ""
    if item.path[0] == "fiber":
        return f"the first free channel is {first}: write channel = {first}"
    return f"the first room for {wide} is from {first} on: write first_channel = {first}; without it a row begins at 0"


def _mirrors(document: Document, found: Fibers) -> dict[str, int]:
    """The index of each fiber's partner; said of one fiber, it holds for both, and the two must not disagree."""
    index = {item.name: n for n, item in enumerate(found.hung)}
    said: dict[str, tuple[str, Hung]] = {}
    blamed = set()
    for item in found.hung:
        if item.mirror is None or item.path in blamed or (item.mirror not in index and not found.known):
            continue
        key = (*item.path, "mirror" if item.path[0] == "fiber" else "mirrored")
        if item.mirror not in index:
            hint = nearest(item.mirror, index)
            document.at_value(
                key, f"no fiber '{item.mirror}' to mirror {item.name}", "" if hint else "the name of a fiber", hint
            )
            continue
        for one, other in ((item.name, item.mirror), (item.mirror, item.name)):
            was, by = said.setdefault(one, (other, item))
            if was != other:
                blamed.add(item.path)
                disagree = f"{item.name} is mirrored with {item.mirror}, but {one} with {was} (line {document.line(by.path)})"
                document.at_value(key, disagree, "one partner for every fiber")
                break
    return {one: index[other] for one, (other, _) in said.items()}


def _choose(name: str | None, known: dict[str, Any]) -> str | None:
    """The name given or, where none is, the only one there is; None where neither is known."""
    if name is not None:
        return name if name in known else None
    return next(iter(known)) if len(known) == 1 else None


def _look_up(document: Document, item: Hung, key: str, stock: Stock) -> str | None:
    """The name of a fiber's type, valve or driver, or None with the fault noted."""
    table, known = stock.tables[key]
    name = item.values[key]
    found = _choose(name, known)
    if found is None and name is not None:
        _no_such(document, (*item.path, key), name, table, known)
    elif found is None:
        listed = f"one of {say_names(known)}" if known else ""
        hint = f'add: {key} = "{next(iter(known))}"' if known else f"add a table [{table}.NAME]"
        document.at_key(item.path, f"{_title(item)} has no {key}", listed, hint)
    return found


def _no_such(document: Document, path: Path, name: str, table: str, known: dict[str, Any]) -> None:
    """The fault of a name that no table has."""
    hint = nearest(name, known) or ("" if known else f"add a table [{table}.{name}]")
    document.at_value(path, f"no [{table}.{name}]", "" if hint else f"one of {say_names(known)}", hint)


def _fiber(document: Document, item: Hung, stock: Stock, mirror: int | None) -> Fiber | None:
    """The fiber itself, or None with the faults noted."""
    values = item.values
    kind = _look_up(document, item, "type", stock)
    valve = _look_up(document, item, "valve", stock)
    driver = _look_up(document, item, "driver", stock)
    length = math.hypot(*values["toward"])
    if length < 1e-9:
        document.at_value((*item.path, "toward"), "toward has no direction", "three numbers that are not all zero")
    type_ = stock.types.get(kind) if kind else None
    if stock.worn:
        _check_worn(document, item, type_)
    valve_type = stock.valves.get(valve) if valve else None
    if type_ is None or valve_type is None or driver is None or stock.supply is None or length < 1e-9:
        return None
    mounting = Mounting(
        valve=valve_type,
        supply=stock.supply,
        tube_bore_mm=values["tube_bore_mm"],
        tube_length_mm=values["tube_length_mm"],
        load_N=values["load_N"],
        bundle=values["bundle"],
        series=values["series"],
    )
    x, y, z = (round(part / length, 12) + 0.0 for part in values["toward"])
    return Fiber(
        name=item.name,
        type=type_,
        mounting=mounting,
        driver=driver,
        channel=item.channel,
        at_m=item.at_m,
        toward=(x, y, z),
        mirror=mirror,
        max_hold_s=values["max_hold_s"],
        line=document.line(item.path),
    )


def _check_worn(document: Document, item: Hung, kind: FiberType | None) -> None:
    """What a fiber on a person's body must have."""
    if not item.values["max_hold_s"] > 0.0:
        path = (*item.path, "max_hold_s")
        given = path in document.places
        lacks = "its max_hold_s is 0, which is no limit" if given else "has no max_hold_s"
        hint = "the rig says worn = true: every fiber needs a longest hold"
        note = document.at_value if given else document.at_key
        note(path, f"{_title(item)} is worn and {lacks}", "a number above 0 (s)", hint)
    if kind is not None and kind.max_pressure_kPa is None:
        hint = "the rig says worn = true: every type needs a greatest pressure"
        document.at_key(
            ("fiber_type", kind.name), f"fiber_type '{kind.name}' is worn and has no max_pressure_kPa", "a number (kPa)", hint
        )


def _title(item: Hung) -> str:
    """A fiber or a row of them, for a message about both."""
    return item.name if item.path[0] == "fiber" else f"the row '{item.values['name']}'"


def _check_makes(document: Document, hung: list[Hung], fibers: list[Fiber | None]) -> None:
    """What cannot be about a make as mounted, at the key that its kind says to change; once for every table."""
    seen: dict[tuple[str, Mounting], list[tuple[str, str, str]]] = {}
    blamed = set()
    for item, fiber in zip(hung, fibers, strict=True):
        if fiber is None:
            continue
        kind, alike = fiber.type, (fiber.type.name, fiber.mounting)
        if alike not in seen:
            seen[alike] = KINDS[kind.kind].problems(kind.make, fiber.mounting)
        homes: list[tuple[Path, Any]] = [
            (item.path, HANGING),
            (("valve_type", fiber.mounting.valve.name), VALVE_TYPE.keys),
            (("supply",), SUPPLY.keys),
        ]
        for key, found, expected in seen[alike]:
            of_type: Path = ("fiber_type", kind.name)
            own = next((path for path, keys in homes if any(key == known.name for known in keys)), of_type)
            if (item.path, key) not in blamed:
                blamed.add((item.path, key))
                note = document.at_value if (*own, key) in document.places else document.at_key
                title = f"'{kind.name}', used by {item.name} (line {fiber.line})" if own == of_type else item.name
                note((*own, key), f"{title}: {found}", expected)
