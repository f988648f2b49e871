"""Bytes of a MIDI 1.0 line into messages: running status, real-time bytes in the midst of others, system exclusive, rubbish.

System exclusive is passed over but for the few bytes of time code and machine control, so that no flood of it takes memory.
"""

from dataclasses import dataclass, field

from mido import Message

LONGEST_SYSEX = 64
"""Bytes of a system exclusive message that are kept; of a longer one, none are."""

_DATA_BYTES = {0x80: 2, 0x90: 2, 0xA0: 2, 0xB0: 2, 0xC0: 1, 0xD0: 1, 0xE0: 2}
_COMMON_BYTES = {0xF1: 1, 0xF2: 2, 0xF3: 1, 0xF6: 0}
_REAL_TIME = {0xF8, 0xFA, 0xFB, 0xFC, 0xFE, 0xFF}
_SYSEX, _END = 0xF0, 0xF7

REFUSED = {
    "stray": "data without a status",
    "broken": "messages cut short by another",
    "undefined": "status bytes that the standard does not define",
    "long": "system exclusive too long to be of use",
}
"""What is refused, by the name under which it is counted."""


@dataclass(slots=True)
class MidiStream:
    """Bytes in, messages out; a message may come in pieces. `refused` counts by the names in `REFUSED`."""

    refused: dict[str, int] = field(default_factory=lambda: dict.fromkeys(REFUSED, 0))
    _status: int = 0
    _data: list[int] = field(default_factory=list)
    _in_sysex: bool = False
    _too_long: bool = False

    def feed(self, data: bytes) -> list[Message]:
        """The messages that these bytes complete, in their order."""
        out: list[Message] = []
        for byte in data:
            if byte in _REAL_TIME:
                out.append(Message.from_bytes([byte]))
            elif byte >= 0x80:
                self._begin(byte, out)
            elif self._in_sysex:
                self._keep(byte)
            elif self._status:
                self._add(byte, out)
            else:
                self.refused["stray"] += 1
        return out

    def _begin(self, status: int, out: list[Message]) -> None:
        """A status byte that is not of real time."""
        if status == _END and self._in_sysex:
            if self._too_long:
                self.refused["long"] += 1
            else:
                out.append(Message("sysex", data=self._data))
        elif self._in_sysex or (self._data and self._status):
            self.refused["broken"] += 1
        self._in_sysex, self._too_long, self._data, self._status = status == _SYSEX, False, [], 0
        if status < 0xF0 or status in _COMMON_BYTES:
            self._status = status
            if _COMMON_BYTES.get(status) == 0:
                out.append(Message.from_bytes([status]))
                self._status = 0
        elif status not in (_SYSEX, _END):
            self.refused["undefined"] += 1

    def _keep(self, byte: int) -> None:
        if len(self._data) < LONGEST_SYSEX:
            self._data.append(byte)
        else:
            self._too_long = True

    def _add(self, byte: int, out: list[Message]) -> None:
        """A data byte: the status of a channel stays for the next, that of a system message does not."""
        self._data.append(byte)
        channel = self._status < 0xF0
        needed = _DATA_BYTES[self._status & 0xF0] if channel else _COMMON_BYTES[self._status]
        if len(self._data) == needed:
            out.append(Message.from_bytes([self._status, *self._data]))
            self._data = []
            if not channel:
                self._status = 0
