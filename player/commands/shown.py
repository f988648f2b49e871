"""A run's shared memory as the terminal's fronts show it."""

from typing import Any

import numpy as np

from player.engine.process.layout import Snapshot
from player.engine.status import Status
from player.live.inbox import Seen
from player.live.screen import Meters, Scene, meters_of
from player.live.source import View


def status_of(snapshot: Snapshot, about: dict[str, Any]) -> Status:
    """The snapshot as the engine itself would give it, without what is told."""
    return Status(
        state=snapshot.state,
        phase=snapshot.text("phase"),
        position_s=snapshot.number("position_s"),
        duration_s=snapshot.number("duration_s"),
        cue=snapshot.text("cue"),
        next_cue=snapshot.text("next_cue"),
        waiting=snapshot.text("waiting"),
        moving=int(snapshot.number("moving")),
        let_down=int(snapshot.number("let_down")),
        ticks=int(snapshot.number("ticks")),
        late_ticks=int(snapshot.number("late_ticks")),
        past_due=int(snapshot.number("past_due")),
        late_s=snapshot.number("late_s"),
        links=tuple(zip(about["boards"], snapshot.texts("link"), strict=True)),
    )


def scene_of(snapshot: Snapshot, about: dict[str, Any], inputs: dict[str, Any], told: tuple[str, ...], now_s: float) -> Scene:
    """The snapshot as the screen of a live session shows it; `inputs` as the run last told them."""
    supply = zip(about["boards"], snapshot.array("supply_kPa"), strict=True)
    return Scene(
        title=about["title"],
        status=status_of(snapshot, about),
        place=snapshot.text("place"),
        view=view_of(snapshot),
        seen=tuple(Seen(*one) for one in inputs.get("seen", ())),
        refused=inputs.get("refused", {}),
        supply_kPa={name: float(kPa) for name, kPa in supply if np.isfinite(kPa)},
        late_ms=1e3 * snapshot.number("late_s"),
        now_s=now_s,
        told=told,
        take=inputs.get("take", ""),
        hold_wanted=about["hold_to_run"],
    )


def view_of(snapshot: Snapshot) -> View:
    """What the hands want and get."""
    return View(
        wanted=snapshot.array("wanted"),
        allowed=snapshot.array("allowed"),
        cut=snapshot.array("cut"),
        by=snapshot.array("by"),
        touched=snapshot.array("touched").astype(bool),
        air_share=snapshot.number("air_share"),
        air_left=snapshot.number("air_left"),
        counts_a_minute=snapshot.number("counts_a_minute"),
        held=bool(snapshot.number("held")),
        binds_playing=frozenset(),
    )


def inputs_told(seen: tuple[Seen, ...], refused: dict[str, int], take: str) -> dict[str, Any]:
    """What `scene_of` reads as `inputs`, as a run tells it."""
    rows = [[one.name, one.last, max(one.at_s, -1e9), one.count, one.silent] for one in seen]
    return {"seen": rows, "refused": refused, "take": take}


def meters_for(about: dict[str, Any]) -> Meters:
    """The rows of meters for a run."""
    return meters_of(dict(map(tuple, about["groups"])), about["fibers"], np.array(about["stroke"]))
