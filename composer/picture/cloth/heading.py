"""The headings of what a window shows, as a scene without threads."""

import numpy as np

from composer.picture.cloth.view import View
from composer.picture.cloth.weave import Weave
from composer.picture.scene import Lane, Scene


def scene_of(view: View, weave: Weave, lanes_too: bool = True) -> Scene:
    """The headings of what is shown, as a scene without threads."""
    count = weave.tracks.fibers
    return Scene(
        title="",
        subtitle="",
        from_s=view.from_s,
        to_s=view.to_s,
        share=np.zeros((count, 0)),
        extending=np.zeros(count, dtype=bool),
        bands=weave.bands,
        names=weave.names,
        tempo=weave.tempo,
        snags=tuple(snag for snag in weave.snags if snag.fiber is None),
        pins_s=weave.pins_s,
        cues=weave.cues,
        lanes=tuple(columns(lane, weave.to_s, view.from_s, view.to_s, view.plan.width) for lane in weave.lanes if lanes_too),
    )


def columns(lane: Lane, whole_s: float, from_s: float, to_s: float, width: int) -> Lane:
    """A lane of the whole score as `width` columns of a stretch have it: where one covers several, the worst of them."""
    count = len(lane.values)
    edge = np.linspace(from_s, to_s, width + 1) / whole_s * count
    begin = np.clip(np.floor(edge[:-1]), 0, count - 1).astype(int)
    end = np.clip(np.ceil(edge[1:]), 1, count).astype(int)
    if count and end[-1] - begin[0] > width:
        extreme = np.fmin if lane.supply else np.fmax
        values = extreme.reduceat(lane.values[: end[-1]], begin)
    else:
        values = lane.values[begin] if count else np.zeros(0)
    values = np.where((edge[1:] <= 0.0) | (edge[:-1] >= count), np.nan, values)
    return Lane(
        lane.name, lane.unit, values, lane.low, lane.high, lane.colour, lane.limit, lane.limit_word, lane.supply
    )  # fmt: skip
