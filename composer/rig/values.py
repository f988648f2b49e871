"""One table of a document checked against its keys: types, ranges, defaults, unknown and missing keys."""

import math
from collections.abc import Mapping, Sequence
from typing import Any

from composer.faults import nearest
from composer.keys import REQUIRED, Key
from composer.rig.document import Document, say_names, say_value
from composer.rig.lines import Path

_TYPES = {
    "number": "a number",
    "integer": "a whole number",
    "text": 'a text in quotes, such as "reed"',
    "switch": "true or false",
    "vector": "three numbers, [x, y, z]",
    "names": 'a list of names, such as ["reed.*"]',
}


def read_table(document: Document, path: Path, table: Any, keys: Sequence[Key], what: str) -> dict[str, Any] | None:
    """The values of a table by key, defaults filled in; None, with the faults noted, where anything is wrong.

    Numbers come as float, whole ones as int, vectors as tuples of three floats, lists of names as tuples of str.
    `what` names the table in messages.
    """
    if not isinstance(table, Mapping):
        document.at_value(path, f"{what} is {say_value(table)}", "a table of keys")
        return None
    known = {key.name: key for key in keys}
    misspelt = [_unknown(document, (*path, name), name, known, what) for name in table if name not in known]
    good = not misspelt
    values: dict[str, Any] = {}
    missing = []
    for key in keys:
        if key.name in table:
            values[key.name] = _value(document, (*path, key.name), table[key.name], key)
            good = good and values[key.name] is not None
        elif key.default is REQUIRED:
            missing.append(key)
        else:
            values[key.name] = key.default
    for key in missing:
        good = False
        if key.name in misspelt:
            continue
        hint = f"add: {key.name} = {_sample(key)}   # {key.says}"
        document.at_key(path, f"{what} has no {key.name}", expected(key), hint)
    return values if good else None


def _unknown(document: Document, path: Path, name: str, known: Mapping[str, Key], what: str) -> str:
    """The fault of a key that its table does not have; returns the key that it is taken for, if any."""
    hint = nearest(name, known)
    if not hint:
        # Units are the part that people guess: 'pressure' and 'pressure_bar' both mean pressure_kPa.
        stem = name.split("_")[0].lower()
        alike = next((key for key in known if key.lower().split("_")[0] == stem), "")
        hint = f"did you mean '{alike}'?" if alike else ""
    document.at_key(path, f"no key '{name}' in {what}", "" if hint else f"one of {say_names(known, 40)}", hint)
    return next((key for key in known if f"'{key}'" in hint), "")


def expected(key: Key) -> str:
    """What a key's value must be, in words: type, range and unit."""
    if key.type == "choice":
        return " or ".join(f'"{choice}"' for choice in key.choices)
    words = _TYPES[key.type]
    low, high = key.low > -math.inf, key.high < math.inf
    if low and high:
        words += (
            f" above {say_number(key.low)}, up to {say_number(key.high)}"
            if key.above
            else (f" from {say_number(key.low)} to {say_number(key.high)}")
        )
    elif low:
        words += f" above {say_number(key.low)}" if key.above else f" of at least {say_number(key.low)}"
    elif high:
        words += f" of at most {say_number(key.high)}"
    return words + (f" ({key.unit})" if key.unit and key.unit != "1" else "")


def say_number(value: float) -> str:
    """A number without needless zeros."""
    return str(int(value)) if float(value).is_integer() and abs(value) < 1e15 else repr(float(value))


def _sample(key: Key) -> str:
    """A value of the right form, for a hint."""
    if key.type == "choice":
        return f'"{key.choices[0]}"' if key.choices else '""'
    return {"text": '"…"', "switch": "true", "vector": "[0, 0, 0]", "names": '["…"]'}.get(key.type, "…")


def _value(document: Document, path: Path, value: Any, key: Key) -> Any:
    """A value converted to its key's type, None with the fault noted where it is not of it."""
    wrong = _wrong(value, key)
    if wrong:
        near = nearest(value, key.choices) if key.type == "choice" and isinstance(value, str) else ""
        document.at_value(path, f"{key.name} {wrong}", expected(key), near or _advice(value, key))
        return None
    if key.type == "number":
        return float(value) + 0.0
    if key.type == "integer":
        return int(value)
    if key.type == "vector":
        return tuple(float(item) + 0.0 for item in value)
    return tuple(value) if key.type == "names" else value


def _wrong(value: Any, key: Key) -> str:
    """What is wrong with a value for its key; nothing if it will do."""
    if _fits(value, key):
        return ""
    return "is empty" if key.type == "text" and isinstance(value, str) else f"is {say_value(value)}"


def _fits(value: Any, key: Key) -> bool:
    """Whether a value is of its key's type and in its range."""
    if key.type in ("number", "integer"):
        return _number(value) and _within(value, key) and (key.type == "number" or float(value).is_integer())
    if key.type == "vector":
        return isinstance(value, list) and len(value) == 3 and all(_number(v) and _within(v, key) for v in value)
    if key.type == "names":
        return isinstance(value, list) and all(isinstance(v, str) for v in value)
    if key.type == "switch":
        return isinstance(value, bool)
    if key.type == "choice":
        return value in key.choices
    return isinstance(value, str) and value.strip() != ""


def _number(value: Any) -> bool:
    """Whether a value is a finite number; true and false are none. Whole numbers may be of any length."""
    return isinstance(value, int | float) and not isinstance(value, bool) and (isinstance(value, int) or math.isfinite(value))


def _within(value: float, key: Key) -> bool:
    """Whether a number is in its key's range; compared before it becomes a float, which may not hold it."""
    return (key.low < value if key.above else key.low <= value) and value <= key.high


def _advice(value: Any, key: Key) -> str:
    """What to do about a value of the wrong type, where that is plain."""
    if key.type in ("number", "integer") and isinstance(value, str):
        return "numbers stand without quotes and without a unit"
    if key.type == "switch" and isinstance(value, str):
        return "true and false stand without quotes"
    if key.type == "names" and isinstance(value, str):
        return f'put it in brackets: ["{value}"]'
    return ""
