"""What a run is just now, in words for an operator: state, banner, instruments, cautions. No Qt."""

from collections.abc import Collection, Sequence
from typing import Any

import numpy as np

from composer.rig.model import Rig
from player.engine.process.layout import Snapshot
from player.governor.causes import CAUSES

OVER_HEADS_M = 1.9
"""A fiber that hangs from so high over the floor (z = 0 of the rig file) hangs over people's heads."""

STANDS_S = 1.0
LIVELY = ("playing", "paused", "resting")
MOVES = ("armed", *LIVELY)

GONE = (
    "THE PROCESS OF THE RUN IS GONE: nothing is sent any more, VENT reaches nobody. Boards that were armed vent by their own"
    " watchdog. Look at the rig before anything else."
)
STANDS = "THE RUN'S PROCESS STANDS STILL: nothing that is asked of it is done, VENT neither. Vent by hand where need be."
NOT_VENTED = "VENT WAS ASKED FOR AND IS NOT CONFIRMED. Vent by hand where need be."
NOT_SENT = "VENT DID NOT GET OUT: the run does not take what is said to it. Vent by hand where need be."

NO_DEVICE = (
    "This software is no safety device. Have the hard-wired exhaust in reach and tried today, the relief valve in place; local"
    " codes and a qualified person decide what else."
)
CAUTIONS = {
    "worn": (
        "WORN: the wearer is ready and told, and knows how to have it vented.",
        "Somebody holds the hold-to-run all the while; letting go brings all to rest.",
        NO_DEVICE,
    ),
    "overhead": ("OVERHEAD: everybody is clear of the fibers and of what hangs from them.", NO_DEVICE),
}

_AFTERWARDS = "All is at rest or vented"
"""How the line begins that says what can be done after a fault."""

_STATES = {
    "idle": ("AT REST", "disarmed"),
    "armed": ("ARMED", "the fibers may move"),
    "playing": ("PLAYING", ""),
    "paused": ("PAUSED", "fibers hold"),
    "resting": ("TO REST", "at the safe rate"),
    "vented": ("VENTED", "every valve exhausts"),
}


def cautions(rig: Rig) -> tuple[str, ...]:
    """What to see to before arming a rig that is worn or hangs over people; none for others."""
    if rig.worn:
        return CAUTIONS["worn"]
    return CAUTIONS["overhead"] if is_overhead(rig) else ()


def is_overhead(rig: Rig) -> bool:
    """Whether a fiber hangs over people's heads."""
    return any(fiber.at_m[2] >= OVER_HEADS_M for fiber in rig.fibers)


def state_of(now: Snapshot, stage: str) -> tuple[str, str]:
    """The state as one large word, and a few more behind it."""
    if stage == "none":
        return "NO RUN", ""
    word, more = _STATES[now.state]
    if stage == "before" and now.state == "idle":
        return "NOT ARMED", "nothing moves"
    if stage == "over":
        return ("VENTED", "the run is over") if now.state == "vented" else ("OVER", "")
    if waiting := now.text("waiting"):
        return "WAITS", f'at "{waiting}", Return goes on'
    phase = now.text("phase")
    if now.state == "playing" and phase == "bringing":
        return "TO PLACE", "fibers are brought to where the score has them"
    if now.state == "playing" and phase == "to be held":
        return "HOLD", "it runs while it is held (H)"
    return word, more


def boards_said(names: Sequence[str], links: Sequence[str]) -> tuple[str, bool]:
    """The link of each board, and whether one is in trouble."""
    bad = any(link in ("lost", "fault", "vented") for link in links)
    if len(names) > 1 and len(set(links)) == 1:
        return f"all {len(names)} {links[0] or 'closed'}", bad
    said = [f"{name} {link or 'closed'}" for name, link in zip(names, links, strict=True)]
    # Those in trouble come first, as there may be more boards than room.
    said.sort(key=lambda one: one.rsplit(" ", 1)[1] not in ("lost", "fault", "vented"))
    return ", ".join(said[:6]) + (f" and {len(said) - 6} more" if len(said) > 6 else ""), bad


def supply_said(now: Snapshot, names: Sequence[str]) -> str:
    """The supply as sensed, and the air that is left as the governor reckons."""
    kPa = now.array("supply_kPa")
    known = [(name, value) for name, value in zip(names, kPa, strict=True) if np.isfinite(value)]
    parts = []
    if len(known) == 1:
        parts.append(f"{known[0][1]:.0f} kPa")
    elif known:
        low = min(known, key=lambda one: one[1])
        parts.append(f"lowest {low[1]:.0f} kPa ({low[0]})")
    left = now.number("air_left")
    if np.isfinite(left):
        parts.append(f"{100.0 * left:.0f} % of the air left")
    return ", ".join(parts) or "not sensed"


def duty_said(now: Snapshot, fibers: Sequence[str]) -> tuple[str, float]:
    """The coil that has used most of what it may be on at a stretch, and its share; nan where no coil is limited."""
    if now.number("ticks") <= 0:
        return "nothing has moved yet", float("nan")
    duty = now.array("duty")
    if not np.isfinite(duty).any():
        return "no coil is limited", float("nan")
    worst = int(np.nanargmax(duty))
    share = float(duty[worst])
    return (f"{100.0 * share:.0f} % used, {fibers[worst]}" if share > 0.005 else "all coils fresh"), share


def late_said(now: Snapshot) -> tuple[str, bool]:
    """Lateness of the ticks, and whether any came so late that it was seen."""
    late, past = int(now.number("late_ticks")), int(now.number("past_due"))
    worst = now.number("worst_late_s")
    if not np.isfinite(worst):
        return "no ticks yet", False
    said = f"worst {1e3 * worst:.1f} ms, {late} of {int(now.number('ticks'))} late"
    return said + (f", {past} past due" if past else ""), past > 0


def inputs_said(inputs: dict[str, Any], now_s: float, live: bool) -> str:
    """What the sources have said last, a line each; `now_s` of the steady clock."""
    if not live:
        return "none: the score alone"
    lines = []
    for name, last, at_s, count, silent in inputs.get("seen", ())[:4]:
        mark = "silent" if silent else "●" if now_s - at_s < 1.0 else "○"
        lines.append(f"{mark} {name}: {last} ({count})")
    refused = inputs.get("refused", {})
    if refused:
        lines.append("refused: " + ", ".join(f"{why} {count}" for why, count in list(refused.items())[:3]))
    return "\n".join(lines) or "nothing has come yet"


def cut_said(cut: np.ndarray, by: np.ndarray, stroke: np.ndarray) -> tuple[str, float]:
    """Why the governor holds fibers of a group back, the worst cause in its few letters, and by what share of stroke."""
    which = np.flatnonzero(cut != 0)
    if not len(which):
        return "", 0.0
    shares = np.minimum(np.abs(np.nan_to_num(by[which], posinf=9.0, neginf=-9.0)) / stroke[which], 1.0)
    worst = int(np.argmax(shares))
    return CAUSES[int(cut[which[worst]])].shown, float(shares[worst])


def reworded(line: str) -> str:
    """A line as the run tells it, where it speaks of a terminal's keys: of this window's."""
    if line.startswith(_AFTERWARDS):
        return "All is at rest or vented, and disarmed: hold A to arm and go on from here."
    return line


def fault_said(lines: Sequence[str], names: Collection[str]) -> str:
    """The last line that speaks of one of these boards or fibers, "" without one."""
    return next((line for line in reversed(lines) if line.partition(" ")[0].removesuffix(":") in names), "")


def why_vented(lines: Sequence[str], boards: Sequence[str]) -> str:
    """Why all is vented, by what the run has said since it was armed: what it says of a board before all else."""
    told = [line for line in lines if line.strip() and not line.startswith(_AFTERWARDS)]
    return fault_said(told, boards) or (told[-1] if told else "asked for elsewhere")


def why_rested(lines: Sequence[str], names: Collection[str]) -> str:
    """The fault that has brought all to rest, of a board or a fiber, as the run has said it just before; "" where none has."""
    where = max((place for place, line in enumerate(lines) if line.startswith(_AFTERWARDS)), default=0)
    return fault_said(lines[where - 1 : where], names) if where else ""


def faults_said(report: dict[str, Any]) -> str:
    """The faults that a run has come to its end with, the first of them in full; "" where there were none."""
    faults = [str(one.get("say", "")) for one in report.get("faults", ())]
    if not faults:
        return ""
    return f"{'A fault' if len(faults) == 1 else f'{len(faults)} faults, the first'} on the way: {faults[0]}"


def rule_said(rule: str) -> str:
    """What becomes of the run without this window."""
    return {"rest": "without this window: all come to rest", "go-on": "without this window: the run goes on"}.get(rule, "")
