"""Numbers as people write them: reading 3, 0.75, 3/4, 2+1/2 with a unit, and writing a new value in the form of the old."""

import re
from dataclasses import dataclass
from fractions import Fraction

from composer.score.bounds import most
from composer.score.words import UNITS

_WRITTEN = re.compile(
    r"(?P<sign>-?)(?P<whole>[0-9]+)"
    r"(?:\.(?P<decimals>[0-9]+)|\+(?P<top>[0-9]+)/(?P<under>[0-9]+)|/(?P<below>[0-9]+))?"
    r"(?P<unit>\s*[^0-9\s:+./-][^0-9]*)?"
)


WORDS = {Fraction(0): "rest", Fraction(1): "full"}
"""Targets that have a word; one written as a word stays a word where it can."""

_FINEST = 1_000_000
"""The largest denominator that is written as a fraction; beyond it a decimal is easier to read."""


class Unreadable(ValueError):
    """A number that cannot be: the message says why, `hint` what to do."""

    def __init__(self, found: str, hint: str = ""):
        super().__init__(found)
        self.hint = hint


@dataclass(frozen=True, slots=True)
class Written:
    """A number as written: its value (in its own unit), form, digits after the point or denominator, unit with its space."""

    value: Fraction
    form: str
    size: int
    unit: str


def written(text: str) -> Written:
    """Read a number with its unit; forms are "whole", "decimal", "fraction" and "mixed".

    Raises:
        Unreadable: more digits than the bound allows, a denominator of 0, or no number at all.
    """
    match = _WRITTEN.fullmatch(text)
    if match is None:
        raise Unreadable(f"'{text}' is not a number")
    if len(text) > most("digits") and any(len(digits) > most("digits") for digits in re.findall("[0-9]+", text)):
        raise Unreadable(f"a number has more than {most('digits')} digits in a row")
    sign = -1 if match["sign"] else 1
    whole = int(match["whole"])
    unit = match["unit"] or ""
    if match["decimals"] is not None:
        places = len(match["decimals"])
        value = Fraction(sign * int(match["whole"] + match["decimals"]), 10**places)
        return Written(value, "decimal", places, unit)
    below = match["under"] or match["below"]
    if below is None:
        return Written(Fraction(sign * whole), "whole", 0, unit)
    if int(below) == 0:
        raise Unreadable(f"'{text}' divides by 0")
    if match["top"] is not None:
        value = Fraction(sign * (whole * int(below) + int(match["top"])), int(below))
        return Written(value, "mixed", int(below), unit)
    return Written(Fraction(sign * whole, int(below)), "fraction", int(below), unit)


def write_like(original: str, value: Fraction) -> str:
    """A new value written in the form of the old one: fractions stay fractions, decimals decimals, the unit stays.

    `value` is in the model's unit (seconds where milliseconds are written). The same value gives the same text. The words
    `rest` and `full` become plain numbers where neither fits. What no decimal can give is rounded to
    6 places, unless the old form was a fraction.
    """
    if original in WORDS.values() and value in WORDS:
        return WORDS[value]
    try:
        old = written(original)
    except Unreadable:
        return _number(value, "whole", 0)
    new = value * UNITS.get(old.unit.strip(), ("", 1))[1]
    if new == old.value:
        return original
    return _number(new, old.form, old.size) + old.unit


def write_place_like(original: str, bar: int, count: Fraction, seconds: Fraction | None = None) -> str:
    """A place written in the form of the old one; with `seconds` given the old one was, or becomes, seconds."""
    if seconds is not None:
        return write_like(original if ":" not in original else "0.0s", seconds)
    old = original.partition(":")[2] or "1"
    return f"{bar}:{write_like(old, count)}"


def _number(value: Fraction, form: str, size: int) -> str:
    if value.denominator > _FINEST:
        form = "decimal"
    sign, value = ("-" if value < 0 else ""), abs(value)
    whole = value.numerator // value.denominator
    if form in ("fraction", "mixed") and value.denominator == 1:
        return f"{sign}{whole}"
    if form in ("fraction", "mixed"):
        under = size if size % value.denominator == 0 else value.denominator
        if form == "mixed" and whole:
            return f"{sign}{whole}+{(value - whole) * under}/{under}"
        return f"{sign}{value * under}/{under}"
    if form == "whole" and value.denominator == 1:
        return f"{sign}{whole}"
    if form == "whole" and value.denominator <= 64 and _places(value) is None:
        return f"{sign}{whole}+{value - whole}" if whole else f"{sign}{value}"
    return sign + _decimal(value, size)


def _places(value: Fraction, longest: int = 6) -> int | None:
    """Digits after the point that give the value exactly, None where more than `longest` would be needed."""
    return next((places for places in range(longest + 1) if 10**places % value.denominator == 0), None)


def _decimal(value: Fraction, least: int) -> str:
    exact = _places(value, max(6, least))
    places = max(6, least) if exact is None else max(exact, least)
    digits = round(value * 10**places)
    text = f"{digits // 10**places}.{digits % 10**places:0{places}d}" if places else str(digits)
    if exact is None and "." in text:  # rounded: no zeros beyond those that the form asks for
        head, _, tail = text.partition(".")
        text = f"{head}.{tail.rstrip('0').ljust(max(least, 1), '0')}"
    return text
