"""Maps for a rig of four fibers r.1 to r.4, and messages from bytes."""

from collections.abc import Callable

import pytest
from mido import Message

from composer.rig.select import Selector
from player.inputs.map_file import read_map
from player.inputs.midi import MidiBinds
from player.inputs.midi_stream import MidiStream
from player.inputs.model import Map


@pytest.fixture(scope="session")
def map_of(make_rig) -> Callable[..., Map]:
    """Reads binds for four fibers r.1 to r.4 and phrases `flick` and `wave`."""
    selector = Selector(make_rig(4), {"low": ("r.1-2",)})

    def read(text: str, silence_s: float = 0.0) -> Map:
        return read_map(f"[source]\nsilence_s = {silence_s}\n{text}", "hand.map.toml", selector, ("flick", "wave"))

    return read


@pytest.fixture
def binds_of(map_of) -> Callable[..., MidiBinds]:
    """The binds of a map's text."""
    return lambda text, silence_s=0.0: MidiBinds(map_of(text, silence_s), 4)


def messages(text: str) -> list[Message]:
    """The messages of bytes in hex."""
    return MidiStream().feed(bytes.fromhex(text))


@pytest.fixture(scope="session")
def bytes_of() -> Callable[[str], list[Message]]:
    """Messages from bytes in hex, as they come over a line."""
    return messages
