"""The limit of air, against closed forms and a receiver that is emptied tick by tick."""

import dataclasses

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from composer.limits.abilities import abilities_of
from composer.limits.air import demand, refill_L_s, snags, store_L, use
from composer.limits.tables import strain_after
from composer.tracks import SUDDEN, durations

SMALL = {"receiver_L": 1.0, "max_receiver_kPa": 500.0, "min_pressure_kPa": 450.0, "compressor_L_min": 6.0}
"""A store of 0.5 L, refilled by 0.1 L/s."""


def _use(tracks, rig):
    return use(tracks, rig.supply, abilities_of(rig))


def test_store_and_refill_are_litres_of_free_air(make_rig):
    supply = make_rig(1, **SMALL).supply
    assert (store_L(supply), refill_L_s(supply)) == pytest.approx((0.5, 0.1))


def test_a_linear_fill_empties_the_receiver_by_what_the_compressor_does_not_put_back(make_rig, make_tracks):
    used = _use(make_tracks([(1.0, 0.3, "linear"), (9.0, 0.3, "hold")]), make_rig(1, air_mL=300.0, **SMALL))
    assert used.used_L == pytest.approx(0.3)
    assert used.lowest_kPa == pytest.approx(500.0 - 100.0 * (0.3 - 0.1))
    assert used.spans == ()


def test_more_than_the_store_is_a_snag_over_the_span_that_draws_it(make_rig, make_tracks):
    rig = make_rig(2, air_mL=500.0, **SMALL)
    tracks = make_tracks([(1.0, 0.0, "hold"), (1.0, 0.3, "linear")], [(1.0, 0.0, "hold"), (1.0, 0.3, "linear")])
    (snag,) = snags(tracks, rig, abilities_of(rig))
    assert (snag.from_s, snag.to_s, snag.needs, snag.has) == pytest.approx((1.0, 2.0, 1.0, 0.6))
    assert (snag.kind, snag.fiber, snag.unit, snag.knot, snag.line) == ("air", None, "L", -1, 11)
    assert _use(tracks, rig).lowest_kPa == pytest.approx(500.0 - 90.0)


def test_a_smooth_fill_is_deepest_where_it_draws_as_much_as_the_compressor_gives(make_rig, make_tracks):
    used = _use(make_tracks([(2.0, 0.3, "smooth")]), make_rig(1, air_mL=600.0, **SMALL))
    # 0.6 p'(u) / 2 = 0.1, twice; the span from the one to the other is the deepest.
    first, second = sorted(
        u.real for u in np.roots([30.0, -60.0, 30.0, 0.0, -1.0 / 3.0]) if abs(u.imag) < 1e-9 and 0 < u.real < 1
    )
    gone = 0.6 * (np.polyval([6, -15, 10, 0, 0, 0], second) - np.polyval([6, -15, 10, 0, 0, 0], first))
    assert used.lowest_kPa == pytest.approx(500.0 - 100.0 * (gone - 0.1 * 2.0 * (second - first)), abs=1e-9)


def test_exhausting_gives_nothing_back_and_draws_nothing(make_rig, make_tracks):
    rig = make_rig(1, air_mL=300.0, **SMALL)
    both = _use(make_tracks([(1.0, 0.3, "linear"), (1.0, 0.0, "linear"), (1.0, 0.3, "linear")]), rig)
    assert both.used_L == pytest.approx(0.6)
    assert both.lowest_kPa == pytest.approx(500.0 - 100.0 * (0.6 - 0.3))


def test_the_compressor_stops_at_its_cut_out(make_rig, make_tracks):
    rig = make_rig(1, air_mL=300.0, **SMALL)
    late = _use(make_tracks([(1000.0, 0.0, "hold"), (1.0, 0.3, "linear")]), rig)
    assert late.lowest_kPa == pytest.approx(480.0)


def test_an_empty_receiver_is_empty_and_no_emptier(make_rig, make_tracks):
    assert _use(make_tracks([(1.0, 0.3, "linear")]), make_rig(1, air_mL=1e5, **SMALL)).lowest_kPa == 0.0


def test_a_score_without_moves_leaves_the_receiver_full(make_rig, make_tracks):
    used = _use(make_tracks([(3.0, 0.0, "hold")]), make_rig(1, **SMALL))
    assert (used.lowest_kPa, used.used_L, used.spans) == (500.0, 0.0, ())


def test_demand_ends_at_all_that_was_drawn(make_rig, make_tracks):
    rig = make_rig(2, air_mL=300.0)
    tracks = make_tracks([(1.0, 0.3, "smooth")], [(0.5, 0.0, "hold"), (1.0, 0.15, "settle")])
    asked = demand(tracks, abilities_of(rig))
    assert asked.litres[-1] == pytest.approx(0.45)
    assert np.all(np.diff(asked.litres) >= 0.0)


parts = st.lists(
    st.tuples(st.floats(0.2, 3.0), st.floats(0.0, 0.3), st.sampled_from(["smooth", "linear", "swell", "settle", "hold"])),
    min_size=1,
    max_size=6,
)


@settings(deadline=None, max_examples=50)
@given(st.lists(parts, min_size=1, max_size=3), st.booleans())
def test_a_receiver_emptied_tick_by_tick_falls_as_low(make_rig, make_tracks, make_abilities, fibers, table):
    rig = make_rig(len(fibers), air_mL=300.0, **SMALL)
    tracks = make_tracks(*fibers)
    abilities = abilities_of(rig)
    if table:
        abilities = dataclasses.replace(
            make_abilities(*[([0.0, 0.1, 0.3], [1.0, 0.5, 0.2], [1.0] * 3)] * len(fibers)),
            air_L=np.tile([0.0, 0.2, 0.3], (len(fibers), 1)),
        )
    found = use(tracks, rig.supply, abilities)
    end = tracks.time_s.max()
    ticks = np.union1d(np.linspace(0.0, end, 20001), tracks.time_s)
    drawn = np.zeros(len(ticks))
    lasts = durations(tracks)
    for k in range(len(tracks.time_s)):
        fiber = int(np.searchsorted(tracks.first, k, side="right") - 1)
        u = np.clip((ticks - tracks.time_s[k]) / max(lasts[k], 1e-12), 0.0, 1.0)
        strain = np.polyval(tracks.curve[k][::-1], u)
        if tracks.manner[k] == SUDDEN:
            whole = np.full(len(ticks), fiber), np.full(len(ticks), strain[0]), np.full(len(ticks), strain[-1])
            strain = strain_after(abilities, *whole, u * lasts[k])
        air = np.interp(strain, abilities.strain[abilities.which[fiber]], abilities.air_L[abilities.which[fiber]])
        drawn += np.concatenate([[0.0], np.cumsum(np.maximum(np.diff(air), 0.0))])
    short = drawn - 0.1 * ticks
    missing = (short - np.minimum.accumulate(short)).max()
    assert found.used_L == pytest.approx(drawn[-1], abs=1e-9)
    lowest, tick = max(500.0 - 100.0 * missing, 0.0), 100.0 * 0.1 * end / 20000 + 1e-6
    assert lowest - tick <= found.lowest_kPa <= lowest + tick + 200.0 * demand(tracks, abilities).strays_L
    if abs(missing - 0.5) > 1e-3:
        assert bool(found.spans) == (missing > 0.5)
    if found.spans:
        assert max(asked - bears for _, _, asked, bears in found.spans) == pytest.approx(missing - 0.5, abs=tick)


@pytest.mark.parametrize("together", [True, False])
def test_only_what_lands_suddenly_together_and_draws_more_than_a_full_receiver_is_past_mending_by_time(
    make_rig, make_tracks, together
):
    # Two sudden fills of 30 mL and 52.5 mL in the receiver: too much at once, enough where they are far enough apart.
    rig = make_rig(2, air_mL=30.0, receiver_L=0.015, compressor_L_min=0.06)
    waits = (1.5, 1.5 if together else 3.5)
    tracks = make_tracks(*([(wait, 0.0, "hold"), (0.5, 0.3, "sudden")] for wait in waits), duration_s=5.0)
    (snag,) = snags(tracks, rig, abilities_of(rig))
    assert snag.mends is not together
    assert (snag.knot == 1) is together
