import numpy as np
import pytest

from composer.faults import Faults
from composer.limits.abilities import abilities_of
from composer.limits.tables import travel_time_s
from composer.motion import strain_at
from composer.shapes import NAMES
from composer.tracks import HOLD, MOVE, STEP, SUDDEN

from .playing import faster_when_full, played, thread


def shape(name: str) -> int:
    return NAMES.index(name)


def test_a_score_that_moves_nothing_is_fibers_at_rest(make_rig):
    tracks = played('title "still"\n', make_rig(3))
    assert tracks.fibers == 3 and tracks.moves == 0 and tracks.duration_s == 0.0
    assert thread(tracks, 2).time_s == [0.0]


def test_lines_move_from_the_line_before_and_hold_after_the_last(make_rig):
    tracks = played("phrase p\n  2 full\n  3 hold\n  5 0.5 swell\nsection a at 1:2\n  r.1 p\n", make_rig())
    one = thread(tracks, 0)
    assert one.time_s == [0.0, 1.0, 3.0, 4.0, 6.0]
    assert one.manner == [HOLD, MOVE, HOLD, MOVE, HOLD]
    assert one.shape == [-1, shape("smooth"), -1, shape("swell"), -1]
    assert one.end == [0.0, 0.3, 0.3, 0.15, 0.15]
    assert one.line == [0, 6, 6, 6, 6]
    assert one.phrase_line == [0, 2, 3, 4, 4]
    assert tracks.duration_s == 6.0


def test_a_move_over_a_time_waits_before_it(make_rig):
    one = thread(played("phrase p\n  8 full over 2\nsection a at 1:1\n  r.1 p\n", make_rig()), 0)
    assert one.time_s == [0.0, 6.0, 8.0] and one.manner == [HOLD, MOVE, HOLD]


def test_over_in_seconds_reaches_back_in_seconds(make_rig):
    one = thread(played("tempo 120\nphrase p\n  8 full over 1.5s\nsection a at 1:1\n  r.1 p\n", make_rig()), 0)
    assert one.time_s == [0.0, 2.5, 4.0]


def test_offsets_in_bars_follow_the_meter(make_rig):
    text = "meter 4/4\nmeter 3/4 at 2:1\nphrase p\n  1bars full\n  2bars rest\nsection a at 1:3\n  r.1 p\n"
    # Half of the bar of four is left at 1:3, so one bar on is the middle of the first bar of three.
    assert thread(played(text, make_rig()), 0).time_s == [0.0, 2.0, 5.5, 8.5]


def test_amounts_in_every_unit_become_strain(make_rig):
    text = "phrase p\n  1 0.5\n  2 12%\n  3 20mm\n  4 full\nsection a at 1:1\n  r.1 p\n  r.2 p scale 1/2\n"
    tracks = played(text, make_rig())
    assert thread(tracks, 0).end[:4] == [0.15, 0.12, 0.05, 0.3]
    assert thread(tracks, 1).end[:4] == [0.075, 0.06, 0.025, 0.15]


def test_a_line_at_0_for_a_fiber_elsewhere_is_a_step_and_for_one_that_is_there_nothing(make_rig):
    one = thread(played("phrase p\n  0 0.5\n  2 rest\nsection a at 1:2\n  r.1 p\n", make_rig()), 0)
    assert one.time_s == [0.0, 1.0, 1.0, 3.0] and one.manner == [HOLD, STEP, MOVE, HOLD]
    one = thread(played("phrase p\n  0 rest\n  2 full\nsection a at 1:2\n  r.1 p\n", make_rig()), 0)
    assert one.time_s == [0.0, 1.0, 3.0] and one.manner == [HOLD, MOVE, HOLD]


def test_a_step_holds_and_jumps_on_the_count(make_rig):
    one = thread(played("phrase p\n  2 full step\nsection a at 1:1\n  r.1 p\n", make_rig()), 0)
    assert one.time_s == [0.0, 2.0, 2.0] and one.manner == [HOLD, STEP, HOLD]
    assert one.start == [0.0, 0.0, 0.3] and one.end == [0.0, 0.3, 0.3]


def test_a_sudden_move_starts_as_late_as_the_fiber_can_and_arrives_on_the_count(make_rig):
    text = "phrase p\n  2 full sudden\n  4 rest sudden\nsection a at 1:1\n  r.1 p\n"
    one = thread(played(text, make_rig(fill=0.6, exhaust=0.3)), 0)
    assert one.time_s == [0.0, 1.5, 2.0, 3.0, 4.0] and one.manner == [HOLD, SUDDEN, HOLD, SUDDEN, HOLD]


def test_a_sudden_move_follows_its_rate_table(make_rig):
    rig = make_rig()
    abilities = faster_when_full(abilities_of(rig))
    one = thread(played("phrase p\n  2 full sudden\nsection a at 1:1\n  r.1 p\n", rig, abilities), 0)
    # d(strain) / (0.6 (1 + 2 strain / 0.3)) from 0 to 0.3: 0.25 ln 3.
    assert one.time_s == pytest.approx([0.0, 2 - 0.25 * np.log(3), 2.0], abs=1e-12)


def test_a_sudden_move_with_too_little_time_fills_all_there_is(make_rig):
    one = thread(played("phrase p\n  1 hold\n  1.25 full sudden\nsection a at 1:1\n  r.1 p\n", make_rig(fill=0.6)), 0)
    assert one.time_s == [0.0, 1.0, 1.25] and one.manner == [HOLD, SUDDEN, HOLD]


def test_a_later_entry_takes_over_at_its_instant_and_from_the_value_reached(make_rig):
    text = "phrase up\n  4 full linear\nphrase down\n  2 rest linear\nsection a at 1:1\n  r.1 up\n  r.1 down after 3\n"
    tracks = played(text, make_rig())
    one = thread(tracks, 0)
    assert one.time_s == [0.0, 3.0, 5.0]
    assert one.end == [0.225, 0.0, 0.0] and one.shape == [-1, shape("linear"), -1]
    assert one.line == [6, 7, 7]
    assert tracks.duration_s == 5.0


def test_what_is_cut_keeps_its_curve(make_rig):
    text = "phrase up\n  4 full\nphrase down\n  2 rest\nsection a at 1:1\n  r.1-2 up\n  r.1 down after 3\n"
    rig = make_rig()
    tracks = played(text, rig)
    times = np.linspace(0, 3, 50)
    cut, whole = strain_at(tracks, abilities_of(rig), times)[:2]
    np.testing.assert_allclose(cut, whole, atol=1e-15)


def test_a_move_that_ends_where_a_later_entry_starts_is_whole(make_rig):
    text = "phrase up\n  3 full\nsection a at 1:1\n  r.1 up\n  r.1 up after 3 scale 1/2\n"
    assert thread(played(text, make_rig()), 0).shape == [shape("smooth"), shape("smooth"), -1]


def test_a_sudden_move_that_is_cut_ends_on_its_own_way(make_rig):
    rig = make_rig(fill=0.6)
    text = "phrase up\n  2 full sudden\nphrase wait\n  1 hold\nsection a at 1:1\n  r.1-2 up\n  r.1 wait after 1.75\n"
    abilities = faster_when_full(abilities_of(rig))
    tracks = played(text, rig, abilities)
    one = thread(tracks, 0)
    assert one.manner == [HOLD, SUDDEN, HOLD] and one.time_s[2] == 1.75
    times = np.linspace(1.7, 1.75, 30)
    cut, whole = strain_at(tracks, abilities, times)[:2]
    np.testing.assert_allclose(cut, whole, atol=1e-12)


def test_sudden_moves_cut_again_and_again_go_on_from_where_they_were_cut(make_rig):
    rig = make_rig(fill=0.6)
    text = "phrase up\n  1 full sudden\nsection a at 1:1\n  r.1 up times 40 every 0.02\n"
    abilities = faster_when_full(abilities_of(rig))
    one = thread(played(text, rig, abilities), 0)
    # Each starts anew and has a count's time, so none but the last begins before it is cut.
    begins = 0.02 * 39 + 1 - 0.25 * np.log(3)
    assert one.time_s == pytest.approx([0.0, begins, 0.02 * 39 + 1], abs=1e-12)


def test_too_hasty_sudden_moves_in_a_row_are_each_cut_where_they_are(make_rig):
    rig = make_rig(fill=0.6)
    abilities = faster_when_full(abilities_of(rig))
    text = "phrase up\n  0.1 full sudden\nsection a at 1:1\n  r.1 up times 30 every 0.01\n"
    one = thread(played(text, rig, abilities), 0)
    value = 0.0
    for k in range(10):
        # With too little time it runs through its way faster, and is cut after a tenth of it.
        left = 0.9 * float(travel_time_s(abilities, [0], [value], [0.3])[0])
        # From strain e to full takes ln(0.9 / (0.3 + 2 e)) / 4 on this table.
        value = (0.9 * np.exp(-4 * left) - 0.3) / 2
        assert one.end[k] == pytest.approx(value, abs=1e-12)
    # From there on there is time enough: once begun it has 90 ms to go when it is cut, and only the last goes on.
    assert one.manner[10:] == [HOLD, SUDDEN, HOLD, SUDDEN, HOLD]
    assert one.time_s[12:] == pytest.approx([0.11, 0.3, 0.39], abs=1e-12)


def test_entries_added_sum_with_a_knot_wherever_either_has_one(make_rig):
    text = "phrase up\n  4 0.5\nphrase dip\n  1 0.2\n  2 rest\nsection a at 1:1\n  r.1 up\n  r.1 dip after 3 add\n"
    rig = make_rig()
    tracks = played(text, rig)
    one = thread(tracks, 0)
    assert one.time_s == [0.0, 3.0, 4.0, 5.0]
    assert one.shape == [-1, -1, shape("smooth"), -1]
    assert one.line == [7, 8, 8, 8]
    abilities, times = abilities_of(rig), np.linspace(0, 6, 61)
    up = strain_at(played(text.replace("  r.1 dip after 3 add\n", ""), rig), abilities, times)[0]
    dip = strain_at(played(text.replace("  r.1 up\n", ""), rig), abilities, times)[0]
    np.testing.assert_allclose(strain_at(tracks, abilities, times)[0], up + dip, atol=1e-15)


def test_layers_that_rise_and_fall_come_back_to_exactly_where_they_were(make_rig):
    text = (
        "phrase b\n  1/3 0.1\n  1 rest\nphrase up\n  1 1/3\nsection a at 1:1\n  r.1 up\n  r.1 b at 1:3 times 99 every 1/7 add\n"
    )
    tracks = played(text, make_rig())
    one = thread(tracks, 0)
    assert one.manner[-1] == HOLD
    assert tracks.curve[tracks.first[1] - 1, 0] == tracks.curve[1, 0]


def test_steps_of_layers_that_cancel_leave_nothing(make_rig):
    text = (
        "phrase on\n  1 0.4 step\n  2 0.1 step\nphrase off\n  1 0.4\n  2 0.7 step\nsection a at 1:1\n  r.1 off\n  r.1 on add\n"
    )
    one = thread(played(text, make_rig()), 0)
    assert one.time_s == [0.0, 1.0, 1.0] and one.manner == [MOVE, STEP, HOLD]


def test_a_sudden_layer_over_a_still_base_takes_the_time_it_needs_up_there(make_rig):
    rig = make_rig()
    abilities = faster_when_full(abilities_of(rig))
    text = "phrase up\n  1 1/2\nphrase hit\n  1 1/2 sudden\nsection a at 1:1\n  r.1 up\n  r.1 hit after 2 add\n"
    one = thread(played(text, rig, abilities), 0)
    needs = float(travel_time_s(abilities, [0], [0.15], [0.3])[0])
    assert one.manner == [MOVE, HOLD, SUDDEN, HOLD]
    assert one.time_s == pytest.approx([0.0, 1.0, 3 - needs, 3.0], abs=1e-12)


def test_a_sudden_layer_over_a_moving_base_is_linear(make_rig):
    text = "phrase up\n  4 0.4 linear\nphrase hit\n  1 0.2 sudden\nsection a at 1:1\n  r.1 up\n  r.1 hit after 1 add\n"
    one = thread(played(text, make_rig(fill=0.6)), 0)
    assert one.time_s == pytest.approx([0.0, 1.9, 2.0, 4.0]) and one.manner == [MOVE, MOVE, MOVE, HOLD]


def test_a_phrase_backwards_ends_where_it_began_with_shapes_turned_round(make_rig):
    text = "phrase p 6\n  0 0.2\n  2 full swell\n  5 rest settle over 2\nsection a at 1:1\n  r.1 p retrograde\n"
    one = thread(played(text, make_rig()), 0)
    # Rest for 1 count, two counts of swell to full, wait 1, two of settle down to where it began.
    assert one.time_s == [0.0, 1.0, 3.0, 4.0, 6.0]
    assert one.manner == [HOLD, MOVE, HOLD, MOVE, HOLD]
    assert one.end == [0.0, 0.3, 0.3, 0.06, 0.06]
    assert one.shape == [-1, shape("swell"), -1, shape("settle"), -1]


def test_backwards_twice_is_forwards(make_rig):
    rig = make_rig()
    forwards = "phrase p 6\n  0 rest\n  2 full swell\n  3 0.5 curve 0.9 0.8 0.2 0.6\n  6 rest\nsection a at 1:1\n  r.1 p\n"
    times = np.linspace(0, 6, 97)
    there = strain_at(played(forwards, rig), abilities_of(rig), times)[0]
    back = strain_at(played(forwards.replace("r.1 p", "r.1 p retrograde"), rig), abilities_of(rig), 6 - times)[0]
    np.testing.assert_allclose(there, back, atol=1e-14)


def test_fibers_that_land_together_share_the_very_instant(make_rig):
    text = (
        "tempo 97 to 61 from 1:1 to 5:1\nphrase p\n  1/3 full\nphrase q\n  2/3 full\nphrase s\n  0.1s full\n"
        "section a at 2:1\n  r.1 p after 1/3\n  r.2 q\n  r.3 q canon 1/7\n"
    )
    tracks = played(text, make_rig())
    assert thread(tracks, 0).time_s[2] == thread(tracks, 1).time_s[-1]
    assert tracks.time_s[tracks.first[1] - 1] == tracks.time_s[tracks.first[2] - 1] == tracks.time_s[tracks.first[3] - 1]


def test_the_length_of_a_phrase_is_part_of_the_score_but_not_where_it_is_cut(make_rig):
    text = "phrase p 20\n  1 full\nphrase q 4\n  1 rest\nsection a at 1:1\n  r.1 p\n"
    assert played(text, make_rig()).duration_s == 20.0
    assert played(text + "  r.1 q after 2\n", make_rig()).duration_s == 6.0


@pytest.mark.parametrize(
    ("text", "line", "says"),
    [
        ("phrase p\n  1 full\nsection a at 1:1\n  r.1-3 p\n  r.2 p\n", 5, "lines 4 and 5 start on 'r.2' at one instant"),
        ("phrase p\n  1 full\nsection a at 1:1\n  r.1 p\n  r.1 p at 0s\n", 5, "lines 4 and 5"),
        ("phrase p\n  1 full\n  1.5s rest\nsection a at 1:1\n  r.1 p stretch 2\n  r.2 p\ntempo 30\n", 3, "no later"),
        ("phrase p\n  1 full\n  2 rest over 1.5s\nsection a at 1:1\n  r.1 p\n", 3, "before the line before it"),
        ("phrase p 2s\n  1 full\n  3 rest\nsection a at 1:1\n  r.1 p\n", 1, "shorter than its last line"),
        ("phrase p\n  1 full\nsection a at 1:1\n  r.* p scatter 1 seed 1\n", 4, "before the score does"),
        ("phrase p\n  1 full\nsection a at 1:1\n  s.* p\n", 4, "s.*"),
        ("phrase p\n  1 full\nsection a at 1:1\n  r.1 p times 99 every 20000\n", 4, "lasts 1.96e+06 s"),
        ("phrase p\n  1 full\n  9999s hold quiver 99Hz by 0.05\nsection a at 1:1\n  r.* p\n", 3, "swing 3959208 times in all"),
    ],
)
def test_what_only_expansion_can_see_is_told_with_its_line(make_rig, text, line, says):
    with pytest.raises(Faults) as caught:
        played(text, make_rig())
    fault = caught.value.faults[0]
    assert fault.where.line == line and fault.where.text == text.splitlines()[line - 1]
    assert says in fault.found


def test_one_collision_on_many_fibers_is_one_fault(make_rig):
    with pytest.raises(Faults) as caught:
        played("phrase p\n  1 full\nsection a at 1:1\n  r.* p times 3 every 4\n  r.* p times 3 every 4\n", make_rig(9))
    assert len(caught.value.faults) == 1 and "and 26 more" in caught.value.faults[0].found
