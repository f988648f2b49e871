"""The tables of keys in the manual's page on the rig file, made from the keys themselves."""

from collections.abc import Sequence
from typing import Any

from composer.fiber.kinds import KINDS
from composer.keys import Key
from composer.rig.schema import DRIVER, FIBER, FIBERS, RIG, SUPPLY, TYPE_KEYS, VALVE_TYPE
from composer.rig.values import expected, say_number


def key_table(keys: Sequence[Key]) -> str:
    """A Markdown table of keys: what each says, its values, its default; "needed" where there is none."""
    rows = ["| key | what it says | value | default |", "| --- | --- | --- | --- |"]
    rows += [f"| `{key.name}` | {key.says} | {expected(key)} | {_default(key)} |" for key in keys]
    return "\n".join(rows) + "\n"


def page_tables() -> dict[str, str]:
    """Every table of the page, by its heading."""
    tables = {f"[{table.name}]": table.keys for table in (RIG, SUPPLY)}
    for kind in KINDS.values():
        tables[f'[fiber_type.NAME], kind = "{kind.name}"'] = (*TYPE_KEYS, *kind.keys_of({}))
    tables["[valve_type.NAME]"] = VALVE_TYPE.keys
    tables["[driver.NAME]"] = DRIVER.keys
    tables["[[fiber]]"] = FIBER.keys
    tables["[[fibers]]"] = FIBERS.keys
    return {heading: key_table(keys) for heading, keys in tables.items()}


def _default(key: Key) -> str:
    """A default as the file would have it."""
    if key.required:
        return "needed"
    return "none" if key.default is None else f"`{_written(key.default)}`"


def _written(value: Any) -> str:
    """A value as TOML."""
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, tuple):
        return "[" + ", ".join(_written(item) for item in value) + "]"
    return f'"{value}"' if isinstance(value, str) else say_number(value)
