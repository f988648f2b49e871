"""Learning a bind: which control is being moved, and the map's text with a bind for it."""

from mido import Message

from composer.faults import Fault, Faults, Where
from player.inputs.model import Control, Map

MOVES = 3
"""Values of a controller, all different, after which it is taken to be meant; one or two may be its noise."""

_FIRST_MODE = 120


class Learner:
    """Messages in; the first control that is plainly moved comes out. Clocks, sensing and system messages are no controls."""

    def __init__(self) -> None:
        self._values: dict[tuple[int, int], set[int]] = {}

    def hear(self, message: Message) -> Control | None:
        """The control that this message settles on, or None."""
        kind = message.type
        if kind == "note_on" and message.velocity > 0:
            return Control("note", message.note, message.channel + 1)
        if kind == "control_change" and message.control < _FIRST_MODE:
            return self._controller(message.channel, message.control, message.value)
        if kind == "pitchwheel":
            return self._counted(message.channel, -1, message.pitch, Control("bend", 0, message.channel + 1))
        if kind == "aftertouch":
            return self._counted(message.channel, -2, message.value, Control("pressure", 0, message.channel + 1))
        if kind == "polytouch":
            control = Control("poly_pressure", message.note, message.channel + 1)
            return self._counted(message.channel, -3 - message.note, message.value, control)
        return None

    def _controller(self, channel: int, number: int, value: int) -> Control | None:
        """A controller; where its fine part has come too, it is one of 14 bits."""
        coarse = number - 32 if 32 <= number < 64 and (channel, number - 32) in self._values else number
        fine = (channel, coarse + 32) in self._values if coarse < 32 else False
        paired = coarse != number or fine
        return self._counted(channel, number, value, Control("cc14" if paired else "cc", coarse, channel + 1))

    def _counted(self, channel: int, number: int, value: int, control: Control) -> Control | None:
        values = self._values.setdefault((channel, number), set())
        values.add(value)
        return control if len(values) >= MOVES else None


def learned(text: str, map_: Map, control: Control, deed: str) -> str:
    """The map's text with a bind for a control at its end; all that was there stays as it was, comments and layout too.

    Args:
        text: the text of the map file, "" for a new one
        map_: the same, as read
        control: what is to be bound
        deed: lines of the bind beside its control, such as `fibers = "reeds"`

    Raises:
        Faults: the control is bound already, at the line where it is; or the binds are written as one list.
    """
    lines = text.replace("\r\n", "\n").split("\n")
    for bind in map_.binds:
        if bind.control is not None and _same(bind.control, control):
            where = Where(map_.file, bind.line, 1, len(lines[bind.line - 1]), lines[bind.line - 1])
            found = f"the control {control} is bound here already"
            raise Faults([Fault(where, found, "", "change this bind, or move another control")])
    if map_.binds and not any(line.lstrip().startswith("[[") for line in lines):
        where = Where(map_.file, map_.binds[0].line, 0, 1, lines[map_.binds[0].line - 1])
        raise Faults([Fault(where, "the binds stand in one list, which no bind can be added to", "[[bind]] above each")])
    end = "\r\n" if "\r\n" in text else "\n"
    block = "\n".join(["[[bind]]", f"midi = {control}", *deed.strip().splitlines()]) + "\n"
    before = text if not text or text.endswith("\n") else text + end
    return before + (end if before.strip() else "") + block.replace("\n", end)


def _same(one: Control, other: Control) -> bool:
    """Whether two controls may mean the same knob."""
    alike = (one.kind, one.number) == (other.kind, other.number)
    return alike and (0 in (one.channel, other.channel) or one.channel == other.channel)
