"""What an instance's numbers must be, as text, for its lines to be at given instants."""

from dataclasses import dataclass
from fractions import Fraction

import numpy as np

from composer.edits.instances import Instances
from composer.edits.wanted import Wanted
from composer.score.model import Duration, Phrase
from composer.score.numbers import written
from composer.score.tempo import TempoMap

SAME_S = 2e-8
"""Seconds by which an instant may be off and still be as written."""

DIGITS = 9
"""Digits after the point of a number that no fraction gives: a nanosecond, or a nanocount."""

CLOSE = 2e-8
"""Counts, seconds or bars by which a number may be off for the sake of fewer digits: far less than a microsecond."""

NICE = 96
"""The largest denominator of a fraction that a number which was a fraction may become."""

Word = tuple[int, str, str]
"""Which line of a phrase, its "offset" or "over", and the number's text; "over" also where the line has none yet."""


@dataclass(frozen=True, slots=True)
class Saying:
    """How an instance is said: the words of its phrase that change, and where it starts, in counts; "" and None as written."""

    words: tuple[Word, ...]
    start_count: float


def number(original: str, value: float, unit: str) -> str:
    """A number near the old one's form: a fraction that has stayed one, or a decimal with as many digits as it takes."""
    form = written(original).form if original else "decimal"
    suffix = written(original).unit if original else {"counts": "", "s": "s", "bars": "bars"}[unit]
    scale = 1000 if suffix.strip() == "ms" else 1
    value *= scale
    nice = Fraction(value).limit_denominator(NICE)
    if abs(float(nice) - value) < 1e-9 and (form != "decimal" or nice.denominator in (1, 2, 4, 5, 8, 10)):
        if nice.denominator == 1:
            return f"{nice.numerator}{suffix}"
        if form in ("fraction", "mixed", "whole"):
            whole, rest = divmod(nice, 1)
            return (f"{whole}+{rest}" if whole else f"{rest}") + suffix
    digits = next((n for n in range(DIGITS) if abs(round(value, n) - value) <= CLOSE), DIGITS)
    text = f"{value:.{digits}f}"
    text = text.rstrip("0").rstrip(".") if "." in text else text
    return ("0" if text in ("", "-0") else text) + suffix


def in_unit(tempo: TempoMap, from_s: float, to_s: float, unit: str) -> float:
    """How far it is between two instants, in "counts", "s" or "bars"."""
    if unit == "s":
        return to_s - from_s
    counts = tempo.counts(np.array([from_s, to_s]))
    if unit == "bars":
        counts = tempo.bars(counts)
    return float(counts[1] - counts[0])


def saying(all_: Instances, new: Wanted, which: int, rows: range, tempo: TempoMap, text_of) -> Saying | None:
    """How a forward instance is said; None where no numbers do. text_of: the text of a Duration of its phrase."""
    phrase = all_.phrases[int(all_.variant[which])]
    start, stretch = float(new.start_s[which]), float(all_.stretch[which])
    moved = abs(start - float(all_.start_s[which])) > SAME_S
    words: list[Word] = []
    before, was_before = start, float(all_.start_s[which])
    for row in rows:
        at = int(all_.place[row])
        if not phrase.lines:
            break
        line = phrase.lines[at]
        until, leaves = float(new.until_s[row]), float(new.leaves_s[row])
        if at and until <= before - SAME_S:
            return None
        same = abs((until - start) - float(all_.until_s[row] - all_.start_s[which])) <= SAME_S
        # Across a change of tempo the same seconds are other counts, so what starts elsewhere is always worked out.
        if moved or not same:
            words += _word(line.offset, in_unit(tempo, start, until, line.offset.unit) / stretch, at, "offset", text_of)
        if all_.goes[row] and line.shape not in ("sudden", "step"):
            if leaves < before - SAME_S:
                return None
            lasts = until - leaves
            if line.over is not None:
                if moved or abs(lasts - float(all_.until_s[row] - all_.leaves_s[row])) > SAME_S:
                    words += _word(line.over, in_unit(tempo, leaves, until, line.over.unit) / stretch, at, "over", text_of)
            elif leaves > before + SAME_S and leaves - before > float(all_.leaves_s[row]) - was_before + SAME_S:
                unit = line.offset.unit
                words.append((at, "over", number("", in_unit(tempo, leaves, until, unit) / stretch, unit)))
        before, was_before = until, float(all_.until_s[row])
    if phrase.length is not None and rows:
        longest = max(float(new.until_s[row]) for row in rows)
        length = in_unit(tempo, start, longest, phrase.length.unit) / stretch
        if length > float(phrase.length.value) + 1e-9:
            words.append((-1, "length", _up(text_of(phrase.length), length, phrase.length.unit)))
    return Saying(tuple(words), float(tempo.counts(start)) if moved else float(all_.start_count[which]))


def _up(original: str, value: float, unit: str) -> str:
    """A number no smaller than a value: a phrase's length must hold its lines."""
    return number(original, value + 2e-9, unit)


def _word(old: Duration, value: float, at: int, role: str, text_of) -> list[Word]:
    original = text_of(old)
    text = number(original, value, old.unit)
    same = abs(value - float(old.value)) < 1e-9
    return [] if same or text == original else [(at, role, text)]


def phrase_words(phrase: Phrase, words: tuple[Word, ...]) -> tuple[list, dict[int, str]]:
    """The spans of a phrase's numbers with their new text, and by line of the phrase an `over` that is to be added."""
    spans, added = [], {}
    for at, role, text in words:
        if role == "length":
            spans.append((phrase.length.span, text))
        elif role == "offset":
            spans.append((phrase.lines[at].offset.span, text))
        elif phrase.lines[at].over is not None:
            spans.append((phrase.lines[at].over.span, text))
        else:
            added[at] = text
    return spans, added
