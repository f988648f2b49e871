"""Entries written out plainly: some fibers, one phrase, one place; and phrases as they are played backwards."""

from composer.edits.instances import Instances
from composer.edits.made import Made
from composer.edits.wanted import Wanted
from composer.score.model import Entry, Score, Span, Target
from composer.score.spans import span_of
from composer.shapes import BACKWARDS, QUIET


def plain_entry(score: Score, entry: Entry, fibers: str, phrase: str, place: str, own: bool) -> str:
    """An entry's line with a start as text, and those options that say how, not when or who.

    own: the phrase's instants are the final ones, so that nothing stretches them
    """
    row = score.lines[score.file][entry.span.line - 1]
    line = f"  {fibers}  {phrase}{place}"
    for name in ("scale", "stretch", "firm"):
        span = span_of(entry, f"{name} number")
        if span is not None and not (own and name == "stretch"):
            line += f" {name} {row[span.column - 1 : span.end - 1]}"
    return line + (" add" if entry.add else "")


def played_backwards(made: Made, all_: Instances, new: Wanted, which: int, rows: range) -> tuple[str, ...]:
    """The lines of a phrase that does what an instance does, in seconds, whichever way that is played."""
    score, start = made.score, float(new.start_s[which])
    phrase, back = all_.phrases[int(all_.variant[which])], bool(all_.backwards[which])
    lines: list[str] = []
    reached = start
    for row in rows:
        line = all_.written[int(all_.row[row])]
        at = next((n for n, one in enumerate(phrase.lines) if one is line), -1)
        if at < 0:
            break
        opening = back and (int(all_.place[row]) == 0 or at - 1 < 0)
        ends = (len(phrase.lines) - 1 if opening else at - 1) if back else at
        until, arrives = float(new.until_s[row]), float(new.arrives_s[row])
        target = _target_text(score, phrase.lines, ends) if back else _text(score, line.target.span)
        if opening:
            lines.append(f"  0  {target}")
            continue
        if not all_.goes[row]:
            if until > reached + 1e-9:
                lines.append(f"  {_s(until - start)}  hold" + _quiver(score, line))
                reached = until
            continue
        shape = BACKWARDS.get(line.shape, line.shape) if back else line.shape
        words = "" if shape == QUIET else f" {shape}"
        if shape == "curve":
            controls = reversed(line.controls) if back else line.controls
            words += "".join(f" {_text(score, one.span)}" for one in controls)
        leaves = float(new.leaves_s[row])
        if shape not in ("sudden", "step") and leaves > reached + 2e-8:
            words += f" over {_s(arrives - leaves)}"
        lines.append(f"  {_s(arrives - start)}  {target}{words}{_quiver(score, line)}")
        reached = arrives
        if until > arrives + 1e-9:
            lines.append(f"  {_s(until - start)}  hold")
            reached = until
    return tuple(lines)


def _target_text(score: Score, lines, at: int) -> str:
    while at > 0 and lines[at].target.unit == "hold":
        at -= 1
    target: Target = lines[at].target
    return _text(score, target.span)


def _quiver(score: Score, line) -> str:
    if line.quiver is None:
        return ""
    return f" quiver {float(line.quiver.hertz):g}Hz by {_text(score, line.quiver.by.span)}"


def _text(score: Score, span: Span) -> str:
    return score.lines[span.file][span.line - 1][span.column - 1 : span.end - 1]


def _s(seconds: float) -> str:
    return f"{seconds:.9f}".rstrip("0").rstrip(".") + "s"
