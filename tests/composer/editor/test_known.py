"""What the window knows of the text."""

import numpy as np
import pytest

from composer.editor.known import Run
from composer.editor.messages import Simulated


def stretch(begin, count):
    """A stretch of a run of two fibers at 0.02 s a step: one at its instant, the other at twice that."""
    time = np.arange(begin, begin + count) * 0.02
    strain = np.stack([time, 2.0 * time]).astype(np.float32)
    return Simulated(1, time, strain, np.zeros(count), np.zeros(count), 0.5, 0.02, False)


def test_a_run_grows_by_stretches_and_is_had_by_fiber_and_by_instant():
    run = Run(2, stretch(0, 700))
    run.add(stretch(700, 900))
    run.add(stretch(1600, 3000))
    time, strain = run.of(1)
    assert len(time) == len(strain) == 4600
    assert np.allclose(strain, 2.0 * time, rtol=1e-6)
    assert run.at(50.0) == pytest.approx([50.0, 100.0])


def test_beyond_what_has_come_nothing_is_known():
    run = Run(2, stretch(0, 10))
    assert run.at(0.18) is not None
    assert run.at(0.19) is None
