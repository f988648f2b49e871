import numpy as np
import pytest

from composer.score.expand_starts import GOLDEN, mixed, ranks, scattered

from .playing import played, thread

FLICK = "phrase flick\n  1 full\n  2 rest\nsection a at 1:1\n"


def starts(rig, entry: str, above: str = "") -> list[float]:
    """When each fiber first leaves rest, in seconds; inf where it never does."""
    tracks = played(above + FLICK + f"  {entry}\n", rig)
    found = []
    for fiber in range(tracks.fibers):
        one = thread(tracks, fiber)
        found.append(next((t for t, manner in zip(one.time_s, one.manner, strict=True) if manner != 0), np.inf))
    return found


@pytest.mark.parametrize(
    ("origin", "odd", "even"),
    [
        ("start", [0, 1, 2, 3, 4], [0, 1, 2, 3]),
        ("end", [4, 3, 2, 1, 0], [3, 2, 1, 0]),
        ("middle", [2, 1, 0, 1, 2], [1, 0, 0, 1]),
        ("edges", [0, 1, 2, 1, 0], [0, 1, 1, 0]),
    ],
)
def test_a_canon_starts_each_fiber_so_many_delays_after_the_first(origin, odd, even):
    assert ranks(origin, 5).tolist() == odd and ranks(origin, 4).tolist() == even


def test_a_canon_goes_by_the_fibers_named_in_the_order_of_the_rig(make_rig):
    assert starts(make_rig(), "r.4, r.2 flick canon 1/2") == [np.inf, 0.0, np.inf, 0.5]


def test_a_canon_in_seconds_keeps_its_seconds_at_any_tempo(make_rig):
    assert starts(make_rig(3), "r.* flick canon 0.25s", "tempo 120 to 60 from 1:1 to 3:1\n") == [0.0, 0.25, 0.5]


def test_a_ripple_starts_each_fiber_when_the_wave_is_there(make_rig):
    # Fibers hang 0.05 m apart along x.
    assert starts(make_rig(), "r.2-4 flick ripple 0.5 m/s along x") == pytest.approx([np.inf, 0.0, 0.1, 0.2])
    assert starts(make_rig(), "r.* flick ripple -0.5 m/s along x") == pytest.approx([0.3, 0.2, 0.1, 0.0])
    assert starts(make_rig(), "r.* flick ripple 0.5 m/s along z") == [0.0, 0.0, 0.0, 0.0]


def test_mirror_hands_each_start_to_the_partner(make_rig):
    assert starts(make_rig(), "r.1-2 flick mirror canon 1") == [np.inf, np.inf, 1.0, 0.0]


def test_repeats_are_a_phrase_apart_unless_told(make_rig):
    one = thread(played(FLICK + "  r.1 flick times 3\n", make_rig()), 0)
    assert one.time_s == [0.0, 1.0, 2.0, 3.0, 4.0, 5.0, 6.0]
    one = thread(played(FLICK + "  r.1 flick times 2 every 3\n", make_rig()), 0)
    assert one.time_s == [0.0, 1.0, 2.0, 3.0, 4.0, 5.0]
    one = thread(played(FLICK + "  r.1 flick times 2 stretch 2\n", make_rig()), 0)
    assert one.time_s == [0.0, 2.0, 4.0, 6.0, 8.0]


def test_an_entry_at_a_place_moves_with_the_repeats_of_its_section(make_rig):
    text = FLICK.replace("at 1:1", "at 1:1 times 2 every 2bars") + "  r.1 flick at 1:3\n  r.2 flick after 1\n"
    tracks = played(text, make_rig())
    assert thread(tracks, 0).time_s == [0.0, 2.0, 3.0, 4.0, 10.0, 11.0, 12.0]
    assert thread(tracks, 1).time_s == [0.0, 1.0, 2.0, 3.0, 9.0, 10.0, 11.0]


def test_splitmix64_draws_what_was_published(outside):
    row = outside["splitmix64"]
    states = np.array([row["seed"]], dtype=np.uint64) + GOLDEN * np.arange(1, 6, dtype=np.uint64)
    assert mixed(states).tolist() == row["outputs"]


def test_scatter_stays_within_its_bounds_and_is_the_same_for_the_same_seed(make_rig):
    drawn = scattered(7, np.arange(20_000))
    assert np.all(drawn >= -1.0) and np.all(drawn < 1.0)
    assert abs(drawn.mean()) < 0.02 and np.var(drawn) == pytest.approx(1 / 3, rel=0.03)
    assert np.array_equal(drawn[5:9], scattered(7, np.arange(5, 9)))
    assert not np.any(scattered(8, np.arange(50)) == drawn[:50])
    rig = make_rig()
    once, again = (starts(rig, "r.* flick after 4 scatter 1/2 seed 7") for _ in range(2))
    assert once == again and len(set(once)) == 4
    np.testing.assert_allclose(once, 4 + 0.5 * scattered(7, np.arange(4)), atol=1e-12)
