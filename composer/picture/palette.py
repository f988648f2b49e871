"""The colours of all pictures and windows, dark and light in one table, named by what they are for.

Two hues tell contracting from extending fibers, an amber and a blue, which every common kind of colour blindness keeps apart;
how far a fiber has moved is told by lightness alone, so that a grey print tells it too. No meaning hangs on a colour alone:
snags are hatched, hits, pins and cues have shapes, states have words.
"""

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike, NDArray

Array = NDArray[np.float64]
Colour = tuple[int, int, int]

GROUND: Colour = (17, 19, 22)
PANEL: Colour = (26, 29, 33)
INK: Colour = (236, 231, 220)
QUIET_INK: Colour = (170, 168, 160)
LINE: Colour = (74, 78, 84)
FAINT_LINE: Colour = (48, 52, 57)
CUE: Colour = (140, 222, 164)
PIN: Colour = (236, 231, 220)
LIMIT: Colour = (255, 150, 130)
HATCH_LIGHT: Colour = (255, 255, 255)
HATCH_DARK: Colour = (0, 0, 0)
SUPPLY: Colour = (166, 208, 245)
DUTY: Colour = (226, 190, 120)
MISS: Colour = (214, 170, 228)
BEYOND: Colour = (255, 255, 255)

STEPS = 256
CONTRACT_HUE_DEG, EXTEND_HUE_DEG = 70.0, 240.0
REST_LIGHTNESS, FULL_LIGHTNESS = 0.27, 0.90


def luminance(colour: ArrayLike) -> Array:
    """Relative luminance, 0 to 1, of sRGB colours (..., 3) in 0 to 255 (IEC 61966-2-1, as WCAG 2.2 defines it)."""
    share = np.asarray(colour, dtype=float) / 255.0
    linear = np.where(share <= 0.04045, share / 12.92, ((share + 0.055) / 1.055) ** 2.4)
    return linear @ np.array([0.2126, 0.7152, 0.0722])


def contrast(one: ArrayLike, other: ArrayLike) -> Array:
    """Contrast ratio of two colours, 1 to 21 (WCAG 2.2)."""
    a, b = luminance(one), luminance(other)
    return (np.maximum(a, b) + 0.05) / (np.minimum(a, b) + 0.05)


def from_oklch(lightness: ArrayLike, chroma: ArrayLike, hue_deg: ArrayLike) -> NDArray[np.uint8]:
    """sRGB (..., 3) of colours in OKLCh (Ottosson 2020, "A perceptual color space for image processing")."""
    lightness, chroma, hue = np.broadcast_arrays(lightness, chroma, np.radians(hue_deg))
    a, b = chroma * np.cos(hue), chroma * np.sin(hue)
    cones = np.stack(
        [
            lightness + 0.3963377774 * a + 0.2158037573 * b,
            lightness - 0.1055613458 * a - 0.0638541728 * b,
            lightness - 0.0894841775 * a - 1.2914855480 * b,
        ],
        axis=-1,
    )
    mix = np.array(
        [
            [4.0767416621, -3.3077115913, 0.2309699292],
            [-1.2684380046, 2.6097574011, -0.3413193965],
            [-0.0041960863, -0.7034186147, 1.7076147010],
        ]
    )
    linear = np.clip(cones**3 @ mix.T, 0.0, 1.0)
    share = np.where(linear <= 0.0031308, 12.92 * linear, 1.055 * linear ** (1 / 2.4) - 0.055)
    return np.rint(255.0 * share).astype(np.uint8)


def ramp(hue_deg: float, rest: float = REST_LIGHTNESS, full: float = FULL_LIGHTNESS) -> NDArray[np.uint8]:
    """Colours (STEPS, 3) of a thread from rest to full stroke: even steps of lightness, colour richest half way."""
    share = np.linspace(0.0, 1.0, STEPS)
    lightness = rest + (full - rest) * share
    return from_oklch(lightness, 0.025 + 0.115 * np.sin(np.pi * np.clip(share * 0.85 + 0.02, 0.0, 1.0)), hue_deg)


CONTRACT = ramp(CONTRACT_HUE_DEG)
EXTEND = ramp(EXTEND_HUE_DEG)


@dataclass(frozen=True, slots=True, eq=False)
class Theme:
    """The colours of one look, each (red, green, blue) in 0 to 255.

    ground, panel, raised, field: behind everything, behind a plot, of a button, behind text that is written
    ink, quiet_ink: of text; edge: round a control that is used; line, faint_line: rules that only help the eye
    contract, extend: (STEPS, 3) a thread's colour from rest to full stroke
    hatch_light, hatch_dark: the two strokes of a snag's hatch; limit: a level not to be passed, an error
    head: the play head; chosen: what is chosen or lit; ghost: what would be instead; hit: where a move lands
    written, retimed, simulated: the three curves of a strand; able: the band of what a fiber can do
    good, caution, fault: a state that also has a word
    """

    name: str
    ground: Colour
    panel: Colour
    raised: Colour
    field: Colour
    ink: Colour
    quiet_ink: Colour
    edge: Colour
    line: Colour
    faint_line: Colour
    cue: Colour
    pin: Colour
    limit: Colour
    hatch_light: Colour
    hatch_dark: Colour
    supply: Colour
    duty: Colour
    miss: Colour
    head: Colour
    chosen: Colour
    ghost: Colour
    hit: Colour
    hit_edge: Colour
    written: Colour
    retimed: Colour
    simulated: Colour
    able: Colour
    good: Colour
    caution: Colour
    fault: Colour
    contract: NDArray[np.uint8]
    extend: NDArray[np.uint8]


DARK = Theme(
    name="dark",
    ground=GROUND,
    panel=PANEL,
    raised=(44, 48, 54),
    field=(11, 13, 15),
    ink=INK,
    quiet_ink=QUIET_INK,
    edge=(122, 127, 134),
    line=LINE,
    faint_line=FAINT_LINE,
    cue=CUE,
    pin=PIN,
    limit=LIMIT,
    hatch_light=HATCH_LIGHT,
    hatch_dark=HATCH_DARK,
    supply=SUPPLY,
    duty=DUTY,
    miss=MISS,
    head=(255, 255, 255),
    chosen=(126, 218, 255),
    ghost=(255, 229, 225),
    hit=(255, 255, 255),
    hit_edge=(17, 19, 22),
    written=(166, 168, 172),
    retimed=(255, 206, 92),
    simulated=(110, 176, 255),
    able=(46, 54, 60),
    good=(120, 196, 255),
    caution=(255, 214, 110),
    fault=(255, 138, 120),
    contract=CONTRACT,
    extend=EXTEND,
)

LIGHT = Theme(
    name="light",
    ground=(250, 249, 246),
    panel=(240, 239, 234),
    raised=(226, 225, 219),
    field=(255, 255, 255),
    ink=(27, 29, 33),
    quiet_ink=(84, 85, 84),
    edge=(112, 113, 112),
    line=(190, 190, 184),
    faint_line=(219, 218, 212),
    cue=(0, 98, 62),
    pin=(27, 29, 33),
    limit=(172, 30, 8),
    hatch_light=HATCH_LIGHT,
    hatch_dark=HATCH_DARK,
    supply=(16, 82, 150),
    duty=(128, 80, 0),
    miss=(120, 48, 140),
    head=(0, 0, 0),
    chosen=(0, 84, 142),
    ghost=(153, 26, 79),
    hit=(27, 29, 33),
    hit_edge=(255, 255, 255),
    written=(104, 102, 99),
    retimed=(136, 68, 0),
    simulated=(0, 65, 191),
    able=(222, 228, 228),
    good=(0, 80, 171),
    caution=(122, 92, 0),
    fault=(148, 32, 56),
    contract=ramp(CONTRACT_HUE_DEG, 0.93, 0.30),
    extend=ramp(EXTEND_HUE_DEG, 0.93, 0.30),
)

PAPER = replace(LIGHT, name="paper", ground=(255, 255, 255))

THEMES = {one.name: one for one in (DARK, LIGHT)}
"""What a window may be shown in."""

TEXT_ON: tuple[tuple[str, tuple[str, ...]], ...] = (
    ("ink", ("ground", "panel", "raised", "field")),
    ("quiet_ink", ("ground", "panel", "raised", "field")),
    ("cue", ("ground", "panel")),
    ("limit", ("ground", "panel", "field")),
    ("supply", ("ground", "panel")),
    ("duty", ("ground", "panel")),
    ("miss", ("ground", "panel")),
    ("chosen", ("ground", "panel")),
    ("ghost", ("ground", "panel")),
    ("written", ("ground", "panel")),
    ("retimed", ("ground", "panel")),
    ("simulated", ("ground", "panel")),
    ("good", ("ground", "panel", "raised", "field")),
    ("caution", ("ground", "panel", "raised", "field")),
    ("fault", ("ground", "panel", "raised", "field")),
)
"""What is read as text, and behind it: each at 4.5 to 1 at least (WCAG 2.2, success criterion 1.4.3)."""

MARKS_ON: tuple[tuple[str, tuple[str, ...]], ...] = (
    ("pin", ("ground", "panel")),
    ("head", ("ground", "panel")),
    ("edge", ("ground", "panel", "raised", "field")),
    ("hit", ("ground", "hit_edge")),
    ("written", ("able",)),
    ("retimed", ("able",)),
    ("simulated", ("able",)),
    ("chosen", ("able", "raised")),
    ("ghost", ("able",)),
    ("hatch_light", ("hatch_dark",)),
)
"""What is seen as a mark, and beside what: each at 3 to 1 at least (WCAG 2.2, success criterion 1.4.11)."""

APART: tuple[tuple[str, ...], ...] = (("written", "retimed", "simulated"), ("good", "caution", "fault"), ("chosen", "ghost"))
"""Colours shown together, told apart by every kind of colour vision too."""
