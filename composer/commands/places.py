"""Cues and places as words of a command line."""

import re
from fractions import Fraction

from composer.faults import Faults, fault, nearest
from composer.picture.bars import RetimedBars
from composer.picture.material import Piece
from composer.score.model import Place, Span
from composer.score.numbers import Unreadable, written
from composer.score.tempo import TempoMap

_PLACE = re.compile(r"(?P<bar>[0-9]{1,7}):(?P<count>[0-9./+]{1,40})|(?P<seconds>[0-9./+]{1,40})\s*(?P<unit>s|ms)")


def seconds_of(piece: Piece, text: str, option: str) -> float:
    """The instant in s, within the piece, of a cue's name or a place such as 5:1 or 12.4s. Raises Faults."""
    where = f"{option} {text}"
    for cue in piece.cues:
        if cue.name == text:
            return cue.at_s
    place = place_of(text, where)
    if place is None:
        known = [cue.name for cue in piece.cues]
        listed = "; the cues are " + ", ".join(f'"{name}"' for name in known[:12]) if known else "; it has no cues"
        raise fault(where, f"no cue of that name{listed}", "a cue, or a place such as 5:1 or 12.4s", nearest(text, known))
    tempo = piece.tempo.tempo if isinstance(piece.tempo, RetimedBars) else piece.tempo
    assert isinstance(tempo, TempoMap)
    try:
        at = float(piece.tempo.seconds(tempo.counts_of(place)))
    except Faults as wrong:
        raise fault(where, wrong.faults[0].found, wrong.faults[0].expected) from None
    if at > piece.tracks.duration_s + 1e-9:
        raise fault(where, f"the score ends before, at {piece.tempo.say_place(piece.tracks.duration_s)}")
    return at


def place_of(text: str, where: str) -> Place | None:
    """A place as a score writes it, None where the text is none. Raises Faults that name `where` where its number is none."""
    found = _PLACE.fullmatch(text.strip())
    if found is None:
        return None
    span = Span(where, 0, 0, 1)
    try:
        if found["seconds"]:
            return Place(0, Fraction(0), written(found["seconds"]).value / (1000 if found["unit"] == "ms" else 1), span)
        return Place(int(found["bar"]), written(found["count"]).value, None, span)
    except Unreadable as wrong:
        raise fault(where, str(wrong), "a place such as 5:1, 5:2+1/2 or 12.4s") from None
