"""Standard MIDI files: the meters, tempi and markers of one, and a file that has them. Bytes in, bytes out.

Only what is about time is read; notes are passed over. After the Standard MIDI Files specification, formats 0 and 1.
"""

import io
from collections.abc import Iterator
from dataclasses import dataclass

from mido import MetaMessage, MidiFile, MidiTrack

from composer.faults import Faults, fault

MOST_BYTES = 8 << 20
MOST_EVENTS = 50_000
"""Meters, tempi and markers, each."""

MOST_TICKS = 1 << 40
DIVISION = 960
"""Ticks of a quarter note in files that are written."""

MOST_NAME = 200

_MARKER, _CUE_POINT, _END, _TEMPO, _METER = 0x06, 0x07, 0x2F, 0x51, 0x58
_DATA_BYTES = {0x80: 2, 0x90: 2, 0xA0: 2, 0xB0: 2, 0xC0: 1, 0xD0: 1, 0xE0: 2}


@dataclass(frozen=True, slots=True)
class Times:
    """What a file says of time, each in order of its ticks; `division` ticks are a quarter note.

    meters: tick, counts in a bar, note value of a count; tempi: tick, microseconds of a quarter note; markers: tick, text
    """

    division: int
    meters: tuple[tuple[int, int, int], ...]
    tempi: tuple[tuple[int, int], ...]
    markers: tuple[tuple[int, str], ...]


def read_midi(data: bytes, file: str) -> Times:
    """The times of a file. Raises `Faults`, at the byte where it is wrong."""
    return _Reader(data, file).times()


def write_midi(times: Times) -> bytes:
    """A file of format 0 that has these times."""
    events: list[tuple[int, int, MetaMessage]] = []
    for tick, counts, note in times.meters:
        events.append((tick, 0, MetaMessage("time_signature", numerator=counts, denominator=note)))
    for tick, tempo in times.tempi:
        events.append((tick, 1, MetaMessage("set_tempo", tempo=tempo)))
    for tick, text in times.markers:
        events.append((tick, 2, MetaMessage("marker", text=text)))
    track, last = MidiTrack(), 0
    for tick, _, message in sorted(events, key=lambda event: event[:2]):
        track.append(message.copy(time=tick - last))
        last = tick
    track.append(MetaMessage("end_of_track"))
    whole = MidiFile(type=0, ticks_per_beat=times.division, charset="utf-8", tracks=[track])
    out = io.BytesIO()
    whole.save(file=out)
    return out.getvalue()


class _Reader:
    def __init__(self, data: bytes, file: str):
        self.data = data
        self.file = file
        self.meters: list[tuple[int, int, int]] = []
        self.tempi: list[tuple[int, int]] = []
        self.markers: list[tuple[int, str]] = []

    def wrong(self, at: int, found: str, expected: str = "") -> Faults:
        """A fault at a byte."""
        return fault(self.file, f"at byte {at}: {found}", expected)

    def times(self) -> Times:
        """All chunks."""
        data = self.data
        if data[:4] != b"MThd":
            raise fault(self.file, "this is no standard MIDI file: it does not begin with 'MThd'", "a file such as song.mid")
        if len(data) < 14 or int.from_bytes(data[4:8], "big") < 6:
            raise self.wrong(4, "the header is cut short", "6 bytes or more")
        form, _, division = (int.from_bytes(data[at : at + 2], "big") for at in (8, 10, 12))
        if form > 1:
            what = "format 2, whose tracks are pieces of their own" if form == 2 else f"format {form}"
            raise self.wrong(8, f"the file has {what}", "format 0 or 1")
        if division & 0x8000 or division == 0:
            raise self.wrong(
                12,
                "the file counts time in frames of time code, not in notes" if division else "0 ticks a note",
                "ticks of a quarter note: save it again with bars and beats",
            )
        tracks = 0
        for at, end in self._chunks():
            self._track(at, end)
            tracks += 1
        if not tracks:
            raise fault(self.file, "the file has no track", "at least one")
        rows = (self.meters, self.tempi, self.markers)
        return Times(division, *(tuple(sorted(kind, key=lambda row: row[0])) for kind in rows))

    def _chunks(self) -> Iterator[tuple[int, int]]:
        """Where each track begins and ends; chunks of other kinds are passed over, as the standard asks."""
        at = 8 + int.from_bytes(self.data[4:8], "big")
        while at + 8 <= len(self.data):
            size = int.from_bytes(self.data[at + 4 : at + 8], "big")
            if at + 8 + size > len(self.data):
                left = len(self.data) - at - 8
                raise self.wrong(at, f"a chunk of {size} bytes, of which {left} are there", "a file that is whole")
            if self.data[at : at + 4] == b"MTrk":
                yield at + 8, at + 8 + size
            at += 8 + size

    def _length(self, at: int, end: int) -> tuple[int, int]:
        """A number of variable length, at most four bytes, and where what follows it begins."""
        value = 0
        for index in range(at, min(at + 4, end)):
            byte = self.data[index]
            value = value << 7 | byte & 0x7F
            if byte < 0x80:
                return value, index + 1
        raise self.wrong(at, "a number of variable length without end", "at most 4 bytes")

    def _track(self, at: int, end: int) -> None:
        tick, status = 0, 0
        while at < end:
            wait, at = self._length(at, end)
            tick += wait
            if tick > MOST_TICKS:
                raise self.wrong(at, "the track is longer than can be counted")
            if at >= end:
                raise self.wrong(at, "the track ends within an event")
            first = self.data[at]
            if first == 0xFF:
                at, over = self._meta(tick, at + 1, end)
                status = 0
                if over:
                    return
            elif first in (0xF0, 0xF7):
                size, at = self._length(at + 1, end)
                at += size
                status = 0
            elif first >= 0xF0:
                raise self.wrong(at, f"the byte {first:02X}, which no file has")
            else:
                if first >= 0x80:
                    status, at = first, at + 1
                if not status:
                    raise self.wrong(at, f"data {first:02X} without a status")
                at += _DATA_BYTES[status & 0xF0]
            if at > end:
                raise self.wrong(end, "the track ends within an event")

    def _meta(self, tick: int, at: int, end: int) -> tuple[int, bool]:
        """A meta event; where what follows it begins, and whether it ends the track."""
        if at >= end:
            raise self.wrong(at, "the track ends within an event")
        kind = self.data[at]
        size, start = self._length(at + 1, end)
        body = self.data[start : min(start + size, end)]
        if start + size > end:
            raise self.wrong(at, f"an event of {size} bytes that its track has no room for")
        if kind == _TEMPO:
            if size < 3 or not (tempo := int.from_bytes(body[:3], "big")):
                found = "a tempo cut short" if size < 3 else "a tempo without end"
                raise self.wrong(at, found, "microseconds of a quarter note")
            self._keep(self.tempi, (tick, tempo), at)
        elif kind == _METER:
            if size < 2 or not body[0] or body[1] > 6:
                raise self.wrong(at, "a meter that no score has", "1 to 64 counts of a whole to a 64th note")
            self._keep(self.meters, (tick, body[0], 1 << body[1]), at)
        elif kind in (_MARKER, _CUE_POINT):
            self._keep(self.markers, (tick, _text(body[: 4 * MOST_NAME])), at)
        return start + size, kind == _END

    def _keep(self, rows: list, row: tuple, at: int) -> None:
        if len(rows) >= MOST_EVENTS:
            raise self.wrong(at, f"more than {MOST_EVENTS} changes of one kind")
        rows.append(row)


def _text(body: bytes) -> str:
    """A text of a file: UTF-8 where it is that, else the Latin-1 of older programs."""
    try:
        return body.decode()
    except UnicodeDecodeError:
        return body.decode("latin-1")
