"""A line that loses too much."""

from hypothesis import given
from hypothesis import strategies as st

from player.wire.quality import FEW, LATELY_S, Quality


def looks(share, seconds=5.0, hertz=100, begin=(0, 0)):
    """What is said on a line of 100 frames a second of which a share is lost; and the quality."""
    quality, (lost, frames), said = Quality(), begin, []
    for n in range(int(seconds * hertz)):
        frames += 1
        lost += int((n + 1) * share) - int(n * share)
        said.append(quality.look(n / hertz, lost, frames))
    return [one for one in said if one]


def test_a_line_that_loses_a_quarter_is_borne():
    assert looks(0.25) == []


def test_a_line_that_loses_most_is_told_of_once():
    (said,) = looks(0.8)
    assert said[1] >= FEW and said[0] / said[1] > 0.5


def test_of_a_few_frames_nothing_is_said():
    assert looks(1.0, seconds=(FEW - 1) / 100) == []


def test_it_is_told_again_after_it_was_better():
    quality, lost, said = Quality(), 0, 0
    for n in range(600):
        lost += not 200 <= n < 400
        said += quality.look(n / 100, lost, n + 1) is not None
    assert said == 2


def test_a_board_that_counts_anew_is_no_bad_line():
    quality = Quality()
    for n in range(300):
        assert quality.look(n / 100, 4_000_000_000 if n == 150 else 3, n) is None


@given(st.lists(st.tuples(st.floats(0, 0.3), st.integers(0, 1 << 32), st.integers(0, 1 << 32)), max_size=50))
def test_whatever_is_counted_nothing_but_a_share_is_said(steps):
    quality, now = Quality(), 0.0
    for step, lost, frames in steps:
        now += step
        said = quality.look(now, lost, frames)
        assert said is None or 0 < said[0] <= 2 * said[1]
    assert len(quality._kept) <= 25 * LATELY_S


def test_moments_in_which_nothing_is_sent_make_nobody_forget_what_was_lost():
    quality, lost, frames, said = Quality(), 0, 0, []
    for n in range(500):
        if n % 10 == 0:
            frames, lost = frames + 5, lost + 4
        said.append(quality.look(n / 100, lost, frames))
    assert sum(one is not None for one in said) == 1
