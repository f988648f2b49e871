"""A map file's text with one bind changed, and nothing else: comments, order and layout stay as they are."""

import re
from collections.abc import Mapping

from composer.faults import Fault, Faults, Where
from player.inputs.model import Bind, Control, Map

_KEY = re.compile(r"^(?P<lead>[ \t]*)(?P<key>[A-Za-z_]+)(?P<is>[ \t]*=[ \t]*)")
_VALUE = re.compile(r"""(?:"(?:[^"\\]|\\.)*"|'[^']*'|[^\s#"'\[{][^#]*?)(?=\s*(?:#|$))""")

OTHER_DEEDS = ("phrase", "on", "release", "quantise", "does")
"""Keys of a bind that moves no fibers."""


def bind_of(map_: Map, control: Control) -> int | None:
    """The index of the bind that a control has, None where it has none."""
    for index, bind in enumerate(map_.binds):
        has = bind.control
        alike = has is not None and (has.kind, has.number) == (control.kind, control.number)
        if alike and (0 in (has.channel, control.channel) or has.channel == control.channel):  # type: ignore[union-attr]
            return index
    return None


def changed(text: str, map_: Map, index: int, values: Mapping[str, str | None]) -> str:
    """The text with other values for keys of the bind of that index, as TOML writes them; None takes a key out.

    Raises:
        Faults: the bind is not written as lines under [[bind]], or a value goes over several lines.
    """
    end = "\r\n" if "\r\n" in text else "\n"
    lines = text.replace("\r\n", "\n").split("\n")
    begin = map_.binds[index].line - 1
    if not lines[begin].lstrip().startswith("[["):
        raise _cannot(map_, map_.binds[index], lines, "the binds stand in one list")
    stop = next((at for at in range(begin + 1, len(lines)) if lines[at].lstrip().startswith("[")), len(lines))
    block = lines[begin:stop]
    last = max(at for at, line in enumerate(block) if line.strip() and not line.lstrip().startswith("#"))
    for key, value in values.items():
        at = next((n for n, line in enumerate(block) if (m := _KEY.match(line)) and m["key"] == key), None)
        if at is None:
            if value is not None:
                last += 1
                block.insert(last, f"{key} = {value}")
            continue
        if value is None:
            del block[at]
            last -= at <= last
            continue
        found = _KEY.match(block[at])
        assert found is not None
        was = _VALUE.match(block[at], found.end())
        if was is None:
            raise _cannot(map_, map_.binds[index], lines, f"'{key}' is not written on one line")
        block[at] = _in_place(block[at], found.end(), was.end(), value)
    return end.join([*lines[:begin], *block, *lines[stop:]])


def _in_place(line: str, begin: int, end: int, value: str) -> str:
    """The value in place of the one that was there; a comment behind it stays in its column where there is room."""
    rest = line[end:]
    comment = rest.lstrip()
    if not comment:
        return line[:begin] + value
    column = len(line) - len(comment)
    head = line[:begin] + value
    return head + " " * max(1, column - len(head)) + comment


def _cannot(map_: Map, bind: Bind, lines: list[str], why: str) -> Faults:
    line = lines[bind.line - 1]
    where = Where(map_.file, bind.line, 1, max(1, len(line)), line)
    return Faults([Fault(where, f"this bind cannot be changed here: {why}", "[[bind]] with a key on each line below", "")])
