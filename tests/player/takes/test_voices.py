"""Fibers that moved alike play one phrase."""

import numpy as np
import pytest

from composer.limits.abilities import abilities_of

from .hands import governed, hand


def test_fibers_under_one_fader_are_one_voice(make_rig, fitted):
    rig = make_rig(4)
    abilities = abilities_of(rig)
    one, other = hand(10.0, 2), hand(10.0, 4)
    _, let = governed(rig, abilities, np.array([one, other, one, other]))
    settled = fitted(rig, let / abilities.stroke[:, None])
    assert [voice.fibers.tolist() for voice in settled.voices] == [[0, 2], [1, 3]]


def test_a_fiber_that_did_half_of_what_another_did_plays_its_phrase_at_half_scale(make_rig, fitted):
    whole = hand(10.0, 2)
    settled = fitted(make_rig(3, fill=3.0, exhaust=3.0), [0.5 * whole, whole, np.zeros_like(whole)])
    (voice,) = settled.voices
    assert voice.fibers.tolist() == [0, 1] and voice.scales == pytest.approx([0.5, 1.0])
    assert settled.worst.max() <= 0.01 and settled.checked.ok


def test_fibers_that_differ_by_more_than_their_share_of_the_tolerance_have_voices_of_their_own(make_rig, fitted):
    value = hand(6.0, 2, top=0.8)
    times = np.arange(len(value)) * 0.005
    settled = fitted(make_rig(2, fill=3.0, exhaust=3.0), [value, np.clip(value + 0.02 * np.sin(times), 0.0, 1.0)])
    assert [voice.fibers.tolist() for voice in settled.voices] == [[0], [1]]


def test_a_fiber_that_stood_still_has_no_voice(make_rig, fitted):
    value = hand(6.0, 2)
    settled = fitted(make_rig(2, fill=3.0, exhaust=3.0), [np.zeros_like(value), value])
    assert [voice.fibers.tolist() for voice in settled.voices] == [[1]]
