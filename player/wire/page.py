"""The tables of the manual's page on the wire, made from the tables that the program itself runs by."""

from player.wire.messages import FAULTS, SPECS, STATUSES
from player.wire.mishaps import MISHAPS
from player.wire.rules import REFUSALS


def messages_table(direction: str) -> str:
    """The messages of one direction ("to device" or "to host") as a table in Markdown."""
    lines = ["| type | name | body | says |", "| --- | --- | --- | --- |"]
    for spec in SPECS:
        if spec.direction == direction:
            parts = [f"`{field.name}` {field.type}: {field.says}" for field in spec.fields]
            if spec.tail:
                kind = "u16 × count" if spec.tail_type == "u16s" else "rest of the body"
                parts.append(f"`{spec.tail}` {kind}: {spec.tail_says}")
            lines.append(f"| 0x{spec.type:02X} | {spec.name} | {'; '.join(parts) or 'none'} | {spec.says} |")
    return "\n".join(lines)


def refusals_table() -> str:
    """What a device tells as faults, and in which words."""
    lines = ["| code | name | text of this project's devices |", "| --- | --- | --- |"]
    for code, name in FAULTS.items():
        texts = [f"“{text}”" for of, text in REFUSALS.values() if of == code]
        lines.append(f"| {code} | {name} | {', '.join(texts) or 'what the board has found'} |")
    return "\n".join(lines)


def statuses() -> str:
    """The statuses with their numbers, in one line."""
    return ", ".join(f"{number} {name}" for number, name in enumerate(STATUSES))


def mishaps_table() -> str:
    """What the simulated board can be made to do wrong."""
    lines = ["| name | what goes wrong |", "| --- | --- |"]
    return "\n".join(lines + [f"| `{name}` | {mishap.says} |" for name, mishap in MISHAPS.items()])
