"""From the text of a rig file to the rig, or to everything that is wrong with it."""

from collections.abc import Mapping
from dataclasses import replace
from typing import Any

from composer.faults import nearest
from composer.fiber.kinds import KINDS
from composer.fiber.mounting import Supply, Valve
from composer.keys import Key
from composer.rig.canonical import fingerprint
from composer.rig.document import Document, open_document, say_names, say_value
from composer.rig.fibers import Fibers, Hung, Stock, check_name, read_fibers
from composer.rig.lines import Path
from composer.rig.model import Driver, FiberType, Rig
from composer.rig.schema import DRIVER, FIBER_TYPE, RIG, SUPPLY, TABLES, VALVE_TYPE, Table, keys_of_type
from composer.rig.select import Circle, Selector, UnknownName
from composer.rig.values import read_table


def read_rig(text: str, file: str) -> Rig:
    """The rig that a text describes; raises `Faults` with all that is wrong, in the order of its lines.

    `file` is the path that messages and the rig name.
    """
    document = open_document(text, file)
    _check_tables(document)
    rig = _one(document, RIG)
    supply = _supply(document, rig)
    valves = {name: values and Valve(name=name, **values) for name, values in _named(document, VALVE_TYPE).items()}
    types = _fiber_types(document)
    boards = {name: values and Driver(name, values["channels"]) for name, values in _named(document, DRIVER).items()}
    stock = Stock(types, valves, boards or {"main": None}, supply, bool(rig and rig["worn"]))
    found, fibers = read_fibers(document, stock)
    if not boards:
        boards = {"main": Driver("main", max((item.channel for item in found.hung), default=0) + 1)}
    groups = _resolve_groups(document, found, _group_members(document, found.hung))
    document.raise_faults()
    assert rig is not None and supply is not None
    made = Rig(
        name=rig["name"],
        file=file,
        worn=rig["worn"],
        supply=supply,
        fiber_types={name: kind for name, kind in types.items() if kind is not None},
        valve_types={name: valve for name, valve in valves.items() if valve is not None},
        drivers=tuple(board for board in boards.values() if board is not None),
        fibers=fibers,
        groups=groups,
        fingerprint=0,
    )
    return replace(made, fingerprint=fingerprint(made))


def _check_tables(document: Document) -> None:
    """Every top-level name is a table that a rig file has."""
    for name in document.values:
        if name not in TABLES:
            hint = nearest(name, TABLES)
            listed = "" if hint else f"one of {say_names(TABLES)}"
            what = "table" if isinstance(document.values[name], dict | list) else "key"
            document.at_key((name,), f"no {what} '{name}' in a rig file", listed, hint)


def _one(document: Document, table: Table) -> dict[str, Any] | None:
    """The values of a table that stands once and must be there."""
    if table.name not in document.values:
        if any(f"'{table.name}'" in nearest(name, TABLES) for name in document.values if name not in TABLES):
            # The misspelt table has been told already.
            return None
        needs = ", ".join(key.name for key in table.keys if key.required)
        document.at_key((), f"the rig file has no [{table.name}]", f"a table [{table.name}] with {needs}")
        return None
    return read_table(document, (table.name,), document.values[table.name], table.keys, f"[{table.name}]")


def _tables_within(document: Document, table: Table) -> Mapping[str, Any]:
    """The tables [NAME.any] by name; none where something else stands there."""
    found = document.values.get(table.name, {})
    if isinstance(found, Mapping):
        return found
    expected = f"tables headed [{table.name}.NAME]"
    document.at_key((table.name,), f"'{table.name}' is {say_value(found)}", expected)
    return {}


def _named(document: Document, table: Table) -> dict[str, dict[str, Any] | None]:
    """The values of every table [NAME.any] by name, None where one has faults."""
    read = {}
    for name, written in _tables_within(document, table).items():
        path: Path = (table.name, name)
        good = check_name(document, path, name, at_key=True)
        values = read_table(document, path, written, table.keys, f"[{table.name}.{name}]")
        read[name] = values if good else None
    return read


def _fiber_types(document: Document) -> dict[str, FiberType | None]:
    """Every make of fiber, None where it has faults."""
    read: dict[str, FiberType | None] = {}
    for name, written in _tables_within(document, FIBER_TYPE).items():
        path: Path = (FIBER_TYPE.name, name)
        good = check_name(document, path, name, at_key=True)
        what = f"[{FIBER_TYPE.name}.{name}]"
        if isinstance(written, Mapping) and written.get("kind") not in list(KINDS):
            # Without a kind nobody can say which of the other keys are right; only the kind is to be blamed.
            written = {key: value for key, value in written.items() if key == "kind"}
        keys = keys_of_type(written if isinstance(written, Mapping) else {})
        if isinstance(written, Mapping):
            written = _without_doubtful(written, keys)
        values = read_table(document, path, written, keys, what)
        if values is None or not good:
            read[name] = None
            continue
        kind = values.pop("kind")
        read[name] = FiberType(name, kind, KINDS[kind].make(**values), document.line(path))
    return read


def _without_doubtful(written: Mapping[str, Any], keys: tuple[Key, ...]) -> Mapping[str, Any]:
    """The table without keys that may be right once its base is: only the base is to be blamed."""
    base = next((key for key in keys if key.name == "base"), None)
    if base is None or written.get("base") in list(base.choices):
        return written
    known = {key.name for key in keys}
    return {name: value for name, value in written.items() if name in known}


def _supply(document: Document, rig: dict[str, Any] | None) -> Supply | None:
    """The supply with the air round it, its pressures checked against one another."""
    values = _one(document, SUPPLY)
    if values is None:
        return None
    if values["min_pressure_kPa"] is None:
        values["min_pressure_kPa"] = values["pressure_kPa"]
    most = values["max_receiver_kPa"]
    for key in ("pressure_kPa", "min_pressure_kPa"):
        path = ("supply", key)
        if values[key] > most and path in document.places:
            expected = f"at most max_receiver_kPa, {most:g} (kPa)"
            document.at_value(path, f"{key} is {values[key]:g}, more than the receiver ever has", expected)
    if rig is None:
        return None
    return Supply(ambient_kPa=rig["ambient_kPa"], temperature_C=rig["temperature_C"], **values)


def _group_members(document: Document, hung: list[Hung]) -> dict[str, tuple[Path, tuple[str, ...]]]:
    """Every group of the file: its path and its members as written."""
    written = document.values.get("group", {})
    if not isinstance(written, Mapping):
        document.at_key(("group",), f"'group' is {say_value(written)}", "a table headed [group]")
        return {}
    lines = {item.name: document.line(item.path) for item in hung}
    groups: dict[str, tuple[Path, tuple[str, ...]]] = {}
    # TOML reads a bare key such as wing.left as a table within a table; here it is a name with a dot.
    waiting: list[tuple[Path, str, Any]] = [(("group", name), name, value) for name, value in reversed(written.items())]
    while waiting:
        path, name, value = waiting.pop()
        if isinstance(value, Mapping) and value:
            waiting += [((*path, part), f"{name}.{part}", inner) for part, inner in reversed(value.items())]
        elif check_name(document, path, name, at_key=True):
            _add_group(document, groups, lines, path, name, value)
    return groups


def _add_group(
    document: Document,
    groups: dict[str, tuple[Path, tuple[str, ...]]],
    lines: dict[str, int],
    path: Path,
    name: str,
    value: Any,
) -> None:
    """Add a group, or note what is wrong with it by itself."""
    expected = 'a list of names, such as ["reed.1-8", "reed.12"]'
    if name in lines:
        document.at_key(path, f"the group '{name}' has the name of a fiber (line {lines[name]})", "a name of its own")
    elif name in groups:
        document.at_key(
            path, f"the group '{name}' is there twice", "", f"the other stands at line {document.line(groups[name][0])}"
        )
    elif not isinstance(value, list) or not all(isinstance(member, str) for member in value):
        hint = f'put it in brackets: ["{value}"]' if isinstance(value, str) else ""
        document.at_value(path, f"the group '{name}' is {say_value(value)}", expected, hint)
    elif not value:
        document.at_value(path, f"the group '{name}' is empty", expected)
    else:
        groups[name] = (path, tuple(value))


def _resolve_groups(
    document: Document, fibers: Fibers, groups: dict[str, tuple[Path, tuple[str, ...]]]
) -> dict[str, tuple[int, ...]]:
    """The fibers of every group; a member that means none is blamed where it stands."""
    selector = Selector([item.name for item in fibers.hung], {name: members for name, (_, members) in groups.items()})
    found: dict[str, tuple[int, ...]] = {}
    circles = set()
    for name, (path, members) in groups.items():
        for index, member in enumerate(members):
            try:
                selector.resolve(member)
            except Circle as circle:
                if frozenset(circle.members) not in circles:
                    circles.add(frozenset(circle.members))
                    first = min(circle.members, key=lambda group: document.line(groups[group][0]))
                    document.at_key(groups[first][0], f"no end to the group '{first}'", "", circle.hint)
            except UnknownName as unknown:
                # Members of members are blamed in their own group; and where fibers are not known, nobody is.
                if unknown.name == member and fibers.known:
                    document.at_value((*path, index), f"no fiber or group '{member}' in the rig", "", unknown.hint)
        if not document.faults:
            found[name] = selector.resolve(name)
    return found
