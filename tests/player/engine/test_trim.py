"""The slow correction of set-points."""

import numpy as np
import pytest

from player.engine.trim import MOST, Trim

ONE = np.array([0])


def trimmed(lacks, seconds, drive="pressure", frozen=False, moves=0.0):
    """What is added after so long to a fiber that does `lacks` less than it is set to."""
    trim, by = Trim((drive,)), []
    for tick in range(round(seconds / 0.05)):
        share = np.array([0.5 - lacks + trim.by[0]])
        low = np.array([0.5])
        trim.sense(tick * 0.05, ONE, share, low, low + moves, np.array([frozen]))
        by.append(trim.by[0])
    return np.array(by)


def test_what_is_missing_is_made_up_slowly_and_not_overdone():
    by = trimmed(0.04, 60.0)
    assert by[-1] == pytest.approx(0.04, abs=1e-3) and by.max() <= 0.0401 and np.diff(by).max() < 0.0004


def test_a_correction_is_bounded():
    assert np.abs(trimmed(0.5, 60.0)).max() == MOST and np.abs(trimmed(-0.5, 60.0)).max() == MOST


@pytest.mark.parametrize("more", [{"frozen": True}, {"drive": "strain"}, {"drive": "valve"}, {"moves": 0.1}])
def test_nothing_is_corrected_on_alarm_in_motion_or_where_the_drive_is_no_pressure(more):
    assert not trimmed(0.04, 10.0, **more).any()


def test_a_set_point_at_rest_is_left_alone():
    trim = Trim(("pressure", "pressure"))
    trim.by[:] = 0.05
    assert trim.applied(np.array([0.0, 0.5])) == pytest.approx([0.0, 0.55])
    assert trim.applied(np.array([0.01, 0.99])) == pytest.approx([0.01, 1.0])
