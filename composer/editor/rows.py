"""The list of snags as the window shows it: those that a sentence tells alike are one row; the earliest first."""

from composer.editor.messages import Row
from composer.limits.check import Check
from composer.report.check import alike_but_for_the_fiber, fibers_of
from composer.report.sentences import Teller, tell

SAME_ROW_S = 2.0
"""Snags of one line, kind and fiber that begin within this of one another are taken for parts of one row."""

MOST_ROWS = 400
"""Rows that are put into words; so many more are counted."""


def rows_of(check: Check, teller: Teller) -> tuple[tuple[Row, ...], int]:
    """The rows of a check in order of time, and how many more there are than can be told."""
    tracks = teller.tracks
    number = {id(snag): at for at, snag in enumerate(check.snags)}
    same: dict[tuple, list[int]] = {}
    for at, snag in enumerate(check.snags):
        same.setdefault((snag.kind, snag.line, snag.fiber), []).append(at)
    groups = sorted(alike_but_for_the_fiber(check.snags, tracks), key=lambda group: group[0].from_s)
    rows = []
    for alike in groups[:MOST_ROWS]:
        snag, fibers = alike[0], fibers_of(alike)
        said = tell(snag, teller, fibers)
        rows.append(
            Row(
                snag=number[id(snag)],
                kind=snag.kind,
                says=said.says,
                mends=said.mends,
                place=teller.say_place(snag.from_s),
                from_s=snag.from_s,
                to_s=snag.to_s,
                line=snag.line,
                phrase_line=int(tracks.phrase_line[snag.knot]) if snag.knot >= 0 else 0,
                fibers=tuple(fibers),
                count=len(alike),
                others=tuple(
                    at
                    for fiber in fibers
                    for at in same.get((snag.kind, snag.line, fiber), ())
                    if abs(check.snags[at].from_s - snag.from_s) <= SAME_ROW_S
                ),
            )
        )
    return tuple(rows), max(0, len(groups) - MOST_ROWS)
