"""What is recorded of a session, and the scores that are made of it."""

import numpy as np
import pytest

from composer.faults import Faults
from composer.limits.abilities import abilities_of
from composer.load import load_rig, load_score
from composer.motion import strain_at
from player.governor import begin, govern, governor_of
from player.live.takes import Takes
from player.takes.file import load_take


@pytest.fixture
def rig(tmp_path, rig_text):
    (tmp_path / "bench.rig.toml").write_text(rig_text)
    return load_rig(str(tmp_path / "bench.rig.toml"))


@pytest.fixture
def make_takes(tmp_path, rig):
    def make(out="out.score"):
        told = []
        return Takes(str(tmp_path / out), rig, abilities_of(rig).stroke, "", 200.0, "2000-01-01", told.append), told

    return make


def play(takes, rig, seconds, from_s=0.0, state=None, at=0.6):
    """A governed hand that goes to `at` of the stroke on all fibers; returns the state it ends in."""
    governor = governor_of(rig, abilities_of(rig))
    state = state or begin(governor)
    for tick in range(round(seconds / 0.005)):
        wanted = at * governor.stroke
        state = govern(governor, state, wanted, 0.005)
        takes.tick(from_s + (tick + 1) * 0.005, True, wanted, state.strain)
    return state


def test_a_take_is_written_as_a_score_that_checks_clean_and_is_near_what_was_played(make_takes, rig, tmp_path):
    takes, _ = make_takes()
    play(takes, rig, 2.0)
    takes.close()
    (one,) = takes.written()
    assert one.good and one.made.worst <= 0.01
    loaded = load_score(str(tmp_path / "out.score"))
    assert strain_at(loaded.tracks, loaded.abilities, [1.5])[:, 0] == pytest.approx(0.6 * loaded.abilities.stroke, rel=0.02)


def test_a_jump_begins_another_take_and_so_does_a_stand_in_which_fibers_moved(make_takes, rig, tmp_path):
    takes, _ = make_takes()
    state = play(takes, rig, 0.5)
    state = play(takes, rig, 0.5, from_s=20.0, state=state)
    for _ in range(50):
        takes.tick(20.5, False, state.strain, 0.5 * state.strain)
    play(takes, rig, 0.5, from_s=20.5)
    takes.close()
    assert sorted(path.name for path in tmp_path.glob("*.take")) == ["out-2.take", "out-3.take", "out.take"]
    assert load_take(str(tmp_path / "out-2.take")).time_s[0] == pytest.approx(20.005)


def test_a_stand_in_which_nothing_moved_is_no_break(make_takes, rig, tmp_path):
    takes, _ = make_takes()
    state = play(takes, rig, 0.5)
    takes.tick(0.5, False, state.strain, state.strain)
    play(takes, rig, 0.5, from_s=0.5, state=state)
    takes.close()
    assert [path.name for path in tmp_path.glob("*.take")] == ["out.take"]


def test_recording_can_be_turned_off_and_on_again(make_takes, rig, tmp_path):
    takes, told = make_takes()
    state = play(takes, rig, 0.2)
    takes.turn()
    state = play(takes, rig, 0.2, from_s=0.2, state=state)
    takes.turn()
    play(takes, rig, 0.2, from_s=0.4, state=state)
    takes.close()
    assert load_take(str(tmp_path / "out.take")).time_s[-1] == pytest.approx(0.2)
    assert load_take(str(tmp_path / "out-2.take")).time_s[0] == pytest.approx(0.405)
    assert told[0] == "not recording"


def test_what_was_played_is_in_the_file_before_it_is_closed(make_takes, rig, tmp_path):
    takes, _ = make_takes()
    state = play(takes, rig, 1.0)
    take = load_take(str(tmp_path / "out.take"))
    assert len(take.time_s) == 200 and not take.complete
    assert take.strain(take.governed, 0)[-1] == pytest.approx(state.strain[0], rel=1e-6)


def test_a_take_is_never_written_over_another(make_takes, tmp_path):
    (tmp_path / "out.take").write_bytes(b"precious")
    with pytest.raises(Faults, match="never written over another"):
        make_takes()


def test_a_folder_that_is_not_there_is_told_before_anything_moves(make_takes):
    with pytest.raises(Faults):
        make_takes("nowhere/out.score")


def test_a_touch_too_short_for_a_score_is_said_to_be(make_takes, rig):
    takes, _ = make_takes()
    takes.tick(0.005, True, np.zeros(4), np.zeros(4))
    takes.close()
    (one,) = takes.written()
    assert one.good and one.made is None and "too few" in one.why


def test_a_take_in_which_nothing_moved_is_no_score(make_takes, rig, tmp_path):
    takes, _ = make_takes()
    play(takes, rig, 0.5, at=0.0)
    takes.close()
    (one,) = takes.written()
    assert one.good and one.why == "nothing moved in it" and not (tmp_path / "out.score").exists()
