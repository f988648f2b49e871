"""The tables of the manual's pages on inputs, made from the tables that the program itself runs by."""

from composer.rig.page import key_table
from player.inputs.midi_stream import REFUSED as MIDI_REFUSED
from player.inputs.osc import ADDRESSES
from player.inputs.osc_out import OUT
from player.inputs.osc_packets import REFUSED as OSC_REFUSED
from player.inputs.schema import BIND_DOES, BIND_HOW, BIND_PHRASE, BIND_STROKE, CONTROL, CURVES, DOES, HOW, MIDI, SOURCE
from player.inputs.turns import KINDS


def _rows(head: str, *rows: tuple[str, ...]) -> str:
    columns = head.count("|") + 1
    lines = [f"| {head} |", "|" + " --- |" * columns]
    return "\n".join(lines + ["| " + " | ".join(row) + " |" for row in rows]) + "\n"


def map_tables() -> dict[str, str]:
    """The tables of the page on map files, by their heading."""
    return {
        "[source]": key_table(SOURCE),
        "midi = { … }": key_table(MIDI),
        "osc": key_table(CONTROL),
        "fibers": key_table((*BIND_STROKE, *BIND_HOW)),
        "phrase": key_table((*BIND_PHRASE, *BIND_HOW)),
        "does": key_table(BIND_DOES),
        "what it does": _rows("does | what then happens", *((f"`{name}`", says) for name, says in DOES.items())),
        "curves": _rows("curve | share of the way", *((f"`{name}`", curve.says) for name, curve in CURVES.items())),
        "how": _rows("how | what becomes of the score", *((f"`{name}`", says) for name, says in HOW.items())),
    }


def midi_tables() -> dict[str, str]:
    """The tables of the page on MIDI."""
    return {
        "turns": _rows("what | when", *((name, says) for name, says in KINDS.items())),
        "refused": _rows("counted as | what it is", *((f"`{name}`", says) for name, says in MIDI_REFUSED.items())),
    }


def osc_tables() -> dict[str, str]:
    """The tables of the page on OSC."""
    rows = ((f"`{address}`", types or "none", says) for address, (types, says) in ADDRESSES.items())
    sent = ((f"`{address}`", types, says) for address, (types, says) in OUT.items())
    return {
        "in": _rows("address | arguments | what it does", *rows),
        "out": _rows("address | arguments | what it says", *sent),
        "refused": _rows("counted as | what it is", *((f"`{name}`", says) for name, says in OSC_REFUSED.items())),
    }
