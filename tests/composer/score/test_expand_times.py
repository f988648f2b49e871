import numpy as np

from composer.limits.abilities import abilities_of
from composer.rig.select import Selector
from composer.score.expand_lines import phrase_lines
from composer.score.expand_starts import starts_of
from composer.score.expand_times import Moments, moments
from composer.score.reading import read_score
from composer.score.tempo import tempo_map


def moments_of(text: str, rig) -> Moments:
    score, faults = read_score(text, "t.score"), []
    starts = starts_of(score, rig, Selector(rig, {}), tempo_map(score), faults)
    found = moments(starts, phrase_lines(score, starts.variants, faults), tempo_map(score), rig, faults)
    assert not faults and len(abilities_of(rig).stroke) == len(rig.fibers)
    return found


def test_the_next_start_on_a_fiber_cuts_and_an_added_layer_is_a_chain_of_its_own(make_rig):
    text = "phrase p 4\n  1 full\n  2 rest\nsection a at 1:1\n  r.1-2 p\n  r.1 p after 3\n  r.1 p after 1 add\n"
    found = moments_of(text, make_rig(2))
    assert found.chain.tolist() == [0, 0, 1, 2]
    assert found.start.tolist() == [0.0, 3.0, 0.0, 1.0]
    assert found.cut.tolist() == [3.0, np.inf, np.inf, np.inf]
    assert found.end.tolist() == [4.0, 7.0, 4.0, 5.0]
    assert found.before.tolist() == [0.0, 1.0, 3.0, 4.0, 0.0, 1.0, 1.0, 2.0]
    assert found.until.tolist() == [1.0, 2.0, 4.0, 5.0, 1.0, 2.0, 2.0, 3.0]


def test_instants_within_a_nanosecond_are_one_float_and_others_are_not(make_rig):
    text = (
        "phrase p\n  1 full\nphrase q\n  1.0000000005 full\nphrase s\n  1.000000003 full\n"
        "section a at 1:1\n  r.1 p\n  r.2 q\n  r.3 s\n"
    )
    until = moments_of(text, make_rig(3)).until
    assert until[0] == until[1] == 1.0 and until[2] > 1.0


def test_backwards_a_move_over_a_time_comes_before_its_wait(make_rig):
    text = "phrase p 10\n  0 rest\n  8 full over 3\nsection a at 1:1\n  r.1 p retrograde\n"
    found = moments_of(text, make_rig(1))
    assert found.before.tolist() == [0.0, 0.0, 2.0]
    assert found.arrives.tolist() == [0.0, 2.0, 5.0]
    assert found.until.tolist() == [0.0, 2.0, 10.0]
