"""The colours of all pictures, named by what they are for, each with the contrast that it keeps.

Two hues tell contracting from extending fibers, an amber and a blue, which every common kind of colour blindness keeps apart;
how far a fiber has moved is told by lightness alone, so that a grey print tells it too.
"""

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

TEXTS: tuple[tuple[str, Colour, Colour], ...] = (
    ("text", INK, GROUND),
    ("quiet text", QUIET_INK, GROUND),
    ("text in a lane", INK, PANEL),
    ("quiet text in a lane", QUIET_INK, PANEL),
    ("cue", CUE, GROUND),
    ("limit", LIMIT, PANEL),
)
"""What is read as text, on what: each at 4.5 to 1 at least (WCAG 2.2, success criterion 1.4.3)."""

MARKS: tuple[tuple[str, Colour, Colour], ...] = (
    ("pin", PIN, GROUND),
    ("supply", SUPPLY, PANEL),
    ("duty", DUTY, PANEL),
    ("miss", MISS, PANEL),
    ("light hatch on dark hatch", HATCH_LIGHT, HATCH_DARK),
)
"""What is seen as a mark, on what: each at 3 to 1 at least (WCAG 2.2, success criterion 1.4.11)."""

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


def ramp(hue_deg: float) -> NDArray[np.uint8]:
    """Colours (STEPS, 3) of a thread from rest to full stroke: even steps of lightness, colour richest half way."""
    share = np.linspace(0.0, 1.0, STEPS)
    lightness = REST_LIGHTNESS + (FULL_LIGHTNESS - REST_LIGHTNESS) * share
    return from_oklch(lightness, 0.025 + 0.115 * np.sin(np.pi * np.clip(share * 0.85 + 0.02, 0.0, 1.0)), hue_deg)


CONTRACT = ramp(CONTRACT_HUE_DEG)
EXTEND = ramp(EXTEND_HUE_DEG)
