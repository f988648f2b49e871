"""The indented lines: a phrase's line and a section's entry, from tree to model."""

from fractions import Fraction

from lark import Token, Tree

from composer.score.model import Canon, Entry, Line, Name, Quiver, Repeat, Ripple, Scatter
from composer.score.row import Row, tokens_of
from composer.shapes import QUIET


def line_of(tree: Tree, row: Row, body: str) -> Line:
    """A line of a phrase."""
    offset, target, *rest = tree.children
    manner = row.once(rest)
    shape = manner.get("shape")
    word = shape.children[0] if shape else None
    name = str(word) if word is not None else QUIET
    controls = tuple(row.target(child, "control") for child in shape.children[1:]) if shape else ()
    over = row.duration(manner["over"].children[1], "over") if "over" in manner else None
    if over and name == "step":
        row.fault(over.span, "a step takes no time, so 'over' means nothing here", "'step' alone, or another shape with 'over'")
    return Line(
        offset=row.duration(offset, "offset"),
        target=row.target(target),
        shape=name,
        over=over,
        controls=controls,
        quiver=_quiver(manner["quiver"], row) if "quiver" in manner else None,
        span=row.whole(body),
        spans=row.spans(shape=word),
    )


def _quiver(tree: Tree, row: Row) -> Quiver:
    word, hertz, _, by = tree.children
    amplitude = row.target(by, "by")
    if amplitude.unit == "hold":
        row.fault(amplitude.span, "a quiver needs an amplitude of its own", "an amount such as 0.05 or 1mm")
    value = row.number_of(hertz, "quiver")
    return Quiver(value, amplitude, row.span(word), row.spans(hertz=hertz))


def entry_of(tree: Tree, row: Row, body: str) -> Entry:
    """An entry of a section."""
    names, phrase, *rest = tree.children
    options = row.once(rest)
    words = {name: option.children[0] for name, option in options.items()}
    numbers = {f"{name} number": options[name].children[1] for name in ("scale", "stretch", "firm") if name in options}
    if "at" in options and "after" in options:
        row.fault(row.span(words["after"]), "an entry starts either 'at' a place or 'after' a while, not both")

    def number(name: str) -> Fraction:
        return row.number_of(options[name].children[1], name) if name in options else Fraction(1)

    return Entry(
        fibers=names_of(names, row),
        phrase=Name(str(phrase), row.span(phrase)),
        at=row.place(options["at"].children[1]) if "at" in options else None,
        after=row.duration(options["after"].children[1], "after") if "after" in options else None,
        repeat=repeat_of(options["times"], row) if "times" in options else None,
        canon=_canon(options["canon"], row) if "canon" in options else None,
        ripple=_ripple(options["ripple"], row) if "ripple" in options else None,
        scale=number("scale"),
        stretch=number("stretch"),
        retrograde="retrograde" in options,
        mirror="mirror" in options,
        scatter=_scatter(options["scatter"], row) if "scatter" in options else None,
        add="add" in options,
        firm=number("firm"),
        span=row.whole(body),
        spans=row.spans(**words, **numbers),
    )


def names_of(tree: Tree, row: Row) -> tuple[Name, ...]:
    """Names of fibers with commas between."""
    return tuple(Name(str(token), row.span(token)) for token in tree.children)


def repeat_of(tree: Tree, row: Row) -> Repeat:
    """`times N every D`."""
    found = tokens_of(tree)
    times, every = found["INTEGER"], found.get("DURATION")
    return Repeat(
        int(row.number_of(times, "times")),
        row.duration(every, "every") if every is not None else None,
        row.span(found["TIMES"]),
        row.spans(times=times),
    )


def _canon(tree: Tree, row: Row) -> Canon:
    word, delay, *rest = tree.children
    origin = rest[1] if rest else None
    return Canon(
        row.duration(delay, "canon"), "start" if origin is None else str(origin), row.span(word), row.spans(origin=origin)
    )


def _ripple(tree: Tree, row: Row) -> Ripple:
    word, speed, _, axis = tree.children
    away = str(speed).startswith("-")
    size = row.number_of(Token("SPEED", str(speed)[away:], start_pos=speed.start_pos + away), "ripple")
    return Ripple(-size if away else size, "xyz".index(axis), row.span(word), row.spans(speed=speed, axis=axis))


def _scatter(tree: Tree, row: Row) -> Scatter:
    word, within, _, seed = tree.children
    return Scatter(row.duration(within, "scatter"), int(row.number_of(seed, "seed")), row.span(word), row.spans(seed=seed))
