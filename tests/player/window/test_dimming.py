"""Dimmed themes: less light, and everything that is read as readable as WCAG 2.2 asks."""

import numpy as np
import pytest

from composer.picture.palette import DARK, MARKS_ON, TEXT_ON, contrast, luminance
from player.window.dimming import DIMS, MARK, TEXT, dimmed


@pytest.mark.parametrize("share", DIMS)
def test_text_keeps_its_contrast_in_every_light(share):
    found = dimmed(DARK, share)
    for name, behind in TEXT_ON:
        for back in behind:
            assert contrast(getattr(found, name), getattr(found, back)) >= TEXT, (name, back)


@pytest.mark.parametrize("share", DIMS)
def test_marks_keep_theirs(share):
    found = dimmed(DARK, share)
    for name, behind in MARKS_ON:
        for back in behind:
            assert contrast(getattr(found, name), getattr(found, back)) >= MARK, (name, back)


def test_each_step_gives_less_light():
    grounds = [float(luminance(dimmed(DARK, share).ground)) for share in DIMS]
    inks = [float(luminance(dimmed(DARK, share).ink)) for share in DIMS]
    assert grounds == sorted(grounds, reverse=True) and inks[-1] <= inks[0]
    ramps = [int(np.sum(dimmed(DARK, share).contract)) for share in DIMS]
    assert ramps == sorted(ramps, reverse=True) and len(set(ramps)) == len(DIMS)


def test_full_light_is_the_theme_itself():
    assert dimmed(DARK, 1.0) is DARK
