"""The screen of a session as lines of text: sources, meters, supply, state, lateness, what was told, keys. No terminal."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from player.engine.status import Status
from player.governor.causes import CAUSES, NONE
from player.live.inbox import Seen
from player.live.source import View

Array = NDArray[np.float64]

KEYS = (
    ("a", "arm"),
    ("r", "rest"),
    ("v", "vent"),
    ("space", "pause"),
    ("Return", "go on"),
    ("n", "next cue"),
    ("l", "let go"),
    ("t", "record"),
    ("d", "leave"),
    ("Ctrl-C", "end"),
)
"""Keys and what they do, as the last line has them."""

HOLD_KEY = ("h", "hold to run")

_COLOURS = {"armed": "32", "playing": "32", "paused": "33", "resting": "33", "vented": "31"}
BOLD, DIM, RED, YELLOW = "1", "2", "31", "33"
SINGLE = 40
"""Characters that a fiber's own meter takes at least."""

AGE_S = 2.0
"""A source that has said something within this time is shown as lively."""


@dataclass(frozen=True, slots=True, eq=False)
class Scene:
    """All that a screen shows. now_s: the steady clock; supply_kPa: of the drivers that measure it; told: the latest last."""

    title: str
    status: Status
    place: str
    view: View
    seen: Sequence[Seen]
    refused: Mapping[str, int]
    supply_kPa: Mapping[str, float]
    late_ms: float
    now_s: float
    told: Sequence[str]
    take: str = ""
    hold_wanted: bool = False


@dataclass(frozen=True, slots=True, eq=False)
class Meters:
    """Rows of the meters: names, and the fibers (indices) of each; fibers: their names; stroke: (F,)."""

    rows: tuple[tuple[str, NDArray[np.int64]], ...]
    fibers: tuple[str, ...]
    stroke: Array


def meters_of(groups: Mapping[str, Sequence[int]], fibers: Sequence[str], stroke: Array) -> Meters:
    """A row for each group, in their order; fibers of no group share one with those whose names begin alike, as reed.*."""
    rows = [(name, np.array(of, dtype=np.int64)) for name, of in groups.items() if of]
    grouped = {int(index) for _, of in rows for index in of}
    stems: dict[str, list[int]] = {}
    for index, name in enumerate(fibers):
        if index not in grouped:
            stem, dot, _ = name.rpartition(".")
            stems.setdefault(f"{stem}.*" if dot else name, []).append(index)
    rows += [(fibers[of[0]] if len(of) == 1 else stem, np.array(of)) for stem, of in stems.items()]
    return Meters(tuple(rows), tuple(fibers), stroke)


def frame(scene: Scene, meters: Meters, width: int, height: int, colour: bool) -> list[str]:
    """Exactly `height` lines of at most `width` characters, colours not counted."""
    paint = _Paint(colour)
    head = _head(scene, width, paint)
    keys = _keys(scene, width, paint)
    room = max(0, height - len(head) - len(keys))
    told_rows = min(max(2, room // 5), 12, len(scene.told))
    sources = _sources(scene, width, max(1, min(len(scene.seen), room // 4)), paint)
    rows = max(1, room - len(sources) - told_rows - 2)
    bars = _bars(scene, meters, width, rows, paint)
    bars += _singles(scene, meters, width, rows - len(bars), paint)
    middle = [*sources, _rule("wanted ▏ allowed", width, paint), *bars, _rule("", width, paint)]
    told_rows = max(0, room - len(middle))
    told = [_cut(f"  {said}", width) for said in list(scene.told)[-told_rows:]] if told_rows else []
    body = (middle + told)[:room]
    body += [""] * (room - len(body))
    return (head + body + keys)[:height]


class _Paint:
    def __init__(self, colour: bool):
        self._colour = colour

    def __call__(self, text: str, code: str) -> str:
        return f"\x1b[{code}m{text}\x1b[0m" if self._colour and code and text else text


def _head(scene: Scene, width: int, paint: _Paint) -> list[str]:
    status, view = scene.status, scene.view
    state = status.state
    if state == "playing" and status.phase == "to be held":
        state = "armed, to be held"
    elif status.waiting:
        state = f'waiting at "{status.waiting}"'
    elif state == "playing" and status.phase == "bringing":
        state = "moving to place"
    right = f"{scene.place}  {view.counts_a_minute:.0f}/min"
    if status.next_cue:
        right += f'  next "{status.next_cue}"'
    room = width - len(state) - len(right) - 6
    title = _cut(scene.title, max(0, room))
    gap = " " * max(1, width - len(state) - len(title) - len(right) - 4)
    first = _cut_painted(paint(f" {state} ", f"7;{_COLOURS.get(status.state, '37')}") + f" {title}{gap}{right}", width)
    air = f"air {100.0 * max(0.0, view.air_left):3.0f} %"
    air = paint(air, RED if view.air_left < 0.1 else YELLOW if view.air_left < 0.3 else "")
    supply = "".join(f"  {name} {kPa:.0f} kPa" for name, kPa in scene.supply_kPa.items())
    share = f"  filling at {100.0 * view.air_share:.0f} %" if view.air_share < 0.995 else ""
    late = f"late {status.late_ticks} of {status.ticks}, {scene.late_ms:.1f} ms"
    links = "  ".join(f"{driver} {state}" for driver, state in status.links)
    parts = [air + supply + share, links, late] + ([scene.take] if scene.take else [])
    second = _cut_painted(" " + "   ".join(part for part in parts if part), width)
    return [first, second, _rule("sources", width, paint)]


def _sources(scene: Scene, width: int, rows: int, paint: _Paint) -> list[str]:
    lines = []
    shown = sorted(scene.seen, key=lambda seen: -seen.at_s)[:rows]
    for seen in scene.seen:
        if seen not in shown:
            continue
        lively = scene.now_s - seen.at_s < AGE_S
        mark = "!" if seen.silent else "•" if lively else " "
        name = _cut(seen.name, max(12, width // 3))
        line = _cut(f" {mark} {name:<{max(12, width // 3)}} {seen.last}", width)
        lines.append(paint(line, RED if seen.silent else BOLD if lively else ""))
    if scene.refused:
        said = ", ".join(f"{count} {why}" for why, count in scene.refused.items())
        lines.append(paint(_cut(f"   refused: {said}", width), YELLOW))
    return lines


def _bars(scene: Scene, meters: Meters, width: int, rows: int, paint: _Paint) -> list[str]:
    """A meter for each row; on a wide screen they stand in columns."""
    count = len(meters.rows)
    columns = max(1, min(width // 66, -(-count // max(1, rows))))
    room = rows * columns
    shown = meters.rows if count <= room else meters.rows[: max(0, room - 1)]
    each = (width - 2 * (columns - 1)) // columns
    cells = [_meter(name, of, scene.view, meters.stroke, each, paint) for name, of in shown]
    if count > room:
        cells.append(_pad(f"   and {count - len(shown)} more", each))
    tall = -(-len(cells) // columns)
    return ["  ".join(cells[row::tall]) for row in range(tall)]


def _singles(scene: Scene, meters: Meters, width: int, rows: int, paint: _Paint) -> list[str]:
    """Every fiber by itself, where there is room for all of them."""
    columns = max(1, width // SINGLE)
    tall = -(-len(meters.fibers) // columns)
    if tall + 1 > rows or len(meters.rows) >= len(meters.fibers):
        return []
    view, cells = scene.view, []
    each = width // columns
    for index, name in enumerate(meters.fibers):
        allowed = float(np.clip(view.allowed[index] / meters.stroke[index], 0.0, 1.0))
        bar = max(4, each - 31)
        full = round(allowed * bar)
        hand = "*" if view.touched[index] else " "
        text = f" {hand}{_pad(name, 12)} {100 * allowed:3.0f} % "
        why = paint(_pad(f" {CAUSES[view.cut[index]].shown}", each - len(text) - bar), YELLOW)
        cells.append(paint(text, BOLD if hand == "*" else "") + "█" * full + "·" * (bar - full) + why)
    return [_rule("fibers", width, paint), *("".join(cells[row::tall]) for row in range(tall))]


def _meter(name: str, of: NDArray[np.int64], view: View, stroke: Array, width: int, paint: _Paint) -> str:
    wanted = float(np.clip(view.wanted[of] / stroke[of], 0.0, 9.99).mean())
    allowed = float((view.allowed[of] / stroke[of]).mean())
    label = max(8, min(16, width // 5))
    why = _why(of, view)
    bar = max(4, width - label - 34)
    full = round(min(1.0, allowed) * bar)
    mark = min(bar - 1, round(min(1.0, wanted) * bar))
    cells = ["█" if at < full else "·" for at in range(bar)]
    if mark != full or not full:
        cells[mark] = "▏" if mark >= full else "▕"
    hand = "*" if bool(view.touched[of].any()) else " "
    text = f" {hand}{_cut(name, label):<{label}} {100 * wanted:4.0f} % ▏{100 * allowed:4.0f} % "
    return paint(text, BOLD if hand == "*" else "") + "".join(cells) + paint(_pad(f" {why}", 14), YELLOW)


def _why(of: NDArray[np.int64], view: View) -> str:
    """What cuts most of these fibers, and how many."""
    cut = view.cut[of]
    causes = np.bincount(cut[cut != NONE], minlength=len(CAUSES))
    if not causes.any():
        return ""
    most = int(causes.argmax())
    return f"{CAUSES[most].shown} {int(causes.sum())}/{len(of)}"


def _keys(scene: Scene, width: int, paint: _Paint) -> list[str]:
    keys = (HOLD_KEY, *KEYS) if scene.hold_wanted else KEYS
    lines, line = [], ""
    for key, does in keys:
        part = f" {key} {does} "
        if len(line) + len(part) > width and line:
            lines.append(line)
            line = ""
        line += part
    lines.append(line)
    painted = [paint(_pad(_cut(line, width), width), "7") for line in lines]
    if scene.hold_wanted and not scene.view.held:
        painted.insert(0, paint(_cut(" Hold the pedal, or the key h: letting go brings all to rest", width), YELLOW))
    return painted


def _rule(text: str, width: int, paint: _Paint) -> str:
    line = f"── {text} " if text else ""
    return paint(_cut(line + "─" * width, width).replace("…", "─"), DIM)


def _cut(text: str, width: int) -> str:
    return text if len(text) <= width else text[: max(0, width - 1)] + "…" if width > 0 else ""


def _pad(text: str, width: int) -> str:
    return f"{_cut(text, width):<{width}}"


def _cut_painted(text: str, width: int) -> str:
    """At most `width` characters, of which colours take none."""
    out, seen, at = [], 0, 0
    while at < len(text):
        if text[at] == "\x1b":
            end = text.index("m", at) + 1
            out.append(text[at:end])
            at = end
            continue
        if seen < width:
            out.append(text[at])
            seen += 1
        at += 1
    return "".join(out)
