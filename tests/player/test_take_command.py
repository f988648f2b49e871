"""`drawcord take`, as it is called."""

import json
import re

import numpy as np
import pytest

from composer.limits.abilities import abilities_of
from composer.limits.check import check
from composer.load import load_rig, load_score
from composer.motion import strain_at
from composer.score.flat import write_flat
from player.commands.main import run
from player.takes.file import TakeFile

from .takes.hands import governed, hand

SCORE = """title "Beneath"
rig bench.rig.toml
tempo 120
cue "middle" at 3:1
phrase nod
  1 0.5
  2 rest
section all at 1:1
  r.* nod times 5          # all four, five times
section late at 4:1
  r.1, r.2 nod             # these two
  r.4 nod canon 1/2
"""


@pytest.fixture
def folder(tmp_path, monkeypatch, rig_text):
    monkeypatch.chdir(tmp_path)
    (tmp_path / "bench.rig.toml").write_text(rig_text)
    return tmp_path


def play(folder, name="a.take", seconds=12.0, fibers=(0, 1, 2, 3), onto=None, from_s=0.0, every_s=0.005):
    """Record a take of a hand on some fibers, a value `every_s`, others as a score has them; returns times, strains (F, T)."""
    rig = load_rig("bench.rig.toml")
    abilities = abilities_of(rig)
    one = hand(seconds, 6, rest_s=1.0)
    one = one[np.arange(len(one)) // round(every_s / 0.005) * round(every_s / 0.005)]
    times = np.arange(len(one)) * 0.005
    wanted = np.zeros((4, len(one)))
    if onto is not None:
        loaded = load_score(onto)
        wanted = strain_at(loaded.tracks, abilities, times) / abilities.stroke[:, None]
    played = np.where(times >= from_s, np.roll(one, round(from_s / 0.005)), np.nan)
    for fiber in fibers:
        wanted[fiber] = np.where(times >= from_s, played, wanted[fiber])
    times, let = governed(rig, abilities, wanted)
    take = TakeFile(name, rig, onto or "")
    for k, now in enumerate(times):
        take.sample(now, wanted[:, k] * abilities.stroke, let[:, k])
    take.close()
    return times, let


def off(score, times, let):
    """By how much a score is off what was played at worst, share of stroke."""
    loaded = load_score(score)
    assert check(loaded.tracks, loaded.rig, loaded.abilities).ok
    return np.abs(strain_at(loaded.tracks, loaded.abilities, times) - let).max() / 0.3


def test_a_take_becomes_a_score_that_checks_clean_and_plays_back_alike(folder, capsys):
    times, let = play(folder)
    assert run(["take", "a.take", "-o", "a.score", "--tempo", "90", "--json"]) == 0
    told = json.loads(capsys.readouterr().out)
    assert told["stepped"] is None
    assert (told["ok"], told["complete"], told["fibers"], told["snags"]) == (True, True, 4, [])
    assert off("a.score", times, let) <= 0.01 + 1e-6
    assert run(["check", "a.score"]) == 0
    text = (folder / "a.score").read_text()
    assert "tempo   90" in text and "rig     bench.rig.toml" in text


def test_a_greater_tolerance_takes_fewer_moves(folder, capsys):
    times, let = play(folder)
    knots = []
    for percent in ("0.5", "1", "4"):
        assert run(["take", "a.take", "-o", "a.score", "--tolerance", percent, "--json"]) == 0
        knots.append(json.loads(capsys.readouterr().out)["knots"])
        assert off("a.score", times, let) <= float(percent) / 100.0 + 1e-6
    assert knots[0] > knots[1] > knots[2]


def test_a_control_that_sends_a_few_values_a_second_is_told_the_tolerance_that_makes_a_curve_of_its_steps(folder, capsys):
    play(folder, every_s=0.2)
    assert run(["take", "a.take", "-o", "a.score"]) == 0
    said = re.search(r"--tolerance (\d+) writes the curve through its steps", capsys.readouterr().out)
    stairs = len((folder / "a.score").read_text().splitlines())
    assert run(["take", "a.take", "-o", "a.score", "--tolerance", said[1]]) == 0
    assert "--tolerance" not in capsys.readouterr().out
    assert len((folder / "a.score").read_text().splitlines()) < stairs / 2


def test_a_take_that_was_cut_off_is_written_up_to_there(folder, capsys):
    times, let = play(folder)
    data = (folder / "a.take").read_bytes()
    (folder / "b.take").write_bytes(data[: len(data) // 2])
    assert run(["take", "b.take", "-o", "b.score"]) == 0
    out = capsys.readouterr().out
    assert "b.take: the take was cut off" in out
    until = float(out.split("sound up to ")[1].split(" s")[0])
    some = times <= until - 0.02
    assert 1.0 < until < times[-1] and off("b.score", times[some], let[:, some]) <= 0.01 + 1e-6


def test_a_take_laid_over_a_score_takes_over_its_fibers_from_the_cue_on_and_leaves_the_rest(folder, capsys):
    (folder / "beneath.score").write_text(SCORE)
    times, let = play(folder, seconds=12.0, fibers=(1,), onto="beneath.score", from_s=4.0)
    assert run(["take", "a.take", "-o", "over.score", "--onto", "beneath.score", "--at", "middle"]) == 0
    assert "taken over from the entries on lines 9, 11" in capsys.readouterr().out
    text = (folder / "over.score").read_text()
    for line in ("# all four, five times", "# these two", "  r.4 nod canon 1/2", 'cue "middle" at 3:1'):
        assert line in text
    before = load_score("beneath.score")
    after = load_score("over.score")
    there = strain_at(after.tracks, after.abilities, times)
    was = strain_at(before.tracks, before.abilities, times)
    for fiber in (0, 2, 3):
        assert there[fiber] == pytest.approx(was[fiber], abs=1e-9)
    first = times < 4.0
    assert there[1][first] == pytest.approx(was[1][first], abs=1e-9)
    assert np.abs(there[1] - let[1]).max() <= 0.01 * 0.3 + 1e-9


def test_a_take_over_a_score_keeps_its_tempo_where_it_is_written_by_itself(folder):
    (folder / "beneath.score").write_text(SCORE)
    times, let = play(folder, onto="beneath.score", fibers=(0, 1))
    assert run(["take", "a.take", "-o", "alone.score"]) == 0
    assert "tempo 120" in (folder / "alone.score").read_text()
    assert off("alone.score", times, let) <= 0.01 + 1e-6


def test_an_entry_that_would_add_to_what_was_played_is_refused_with_its_line(folder, capsys):
    (folder / "beneath.score").write_text(SCORE + "phrase lift\n  1 0.1\nsection more at 1:1\n  r.2 lift add\n")
    play(folder, fibers=(1,), onto="beneath.score", from_s=4.0)
    assert run(["take", "a.take", "-o", "over.score", "--onto", "beneath.score", "--at", "middle"]) == 2
    err = capsys.readouterr().err
    assert "beneath.score:16:" in err and "punch in before it begins" in err
    assert not (folder / "over.score").exists()


LONG = """rig bench.rig.toml
tempo 60
phrase sway
  2  0.4
  4  hold quiver 3Hz by 0.03
  6  0.1
  8  0.5
  9  hold
  11 0.3
  13 hold quiver 3Hz by 0.03
  16 rest
phrase tremble
  5 hold quiver 2Hz by 0.02
section all at 1:1
  r.* sway
  r.2, r.3 tremble after 2 add
  r.1-2 tremble after 9 add
"""


def punched(folder, score, at, seconds, fibers=(1,)):
    """Record a hand on some fibers from `at` s on, for so long, over a score as the governor lets it play."""
    rig, loaded = load_rig("bench.rig.toml"), load_score(score)
    abilities = abilities_of(rig)
    times = np.arange(round((at + seconds) / 0.005) + 1) * 0.005
    wanted = strain_at(loaded.tracks, abilities, times) / abilities.stroke[:, None]
    one = np.interp(times - at, np.arange(round((seconds + 4.0) / 0.005) + 1) * 0.005, hand(seconds + 4.0, 6, rest_s=0.5))
    for fiber in fibers:
        wanted[fiber] = np.where(times >= at, one, wanted[fiber])
    times, let = governed(rig, abilities, wanted)
    take = TakeFile("p.take", rig, score)
    for k, now in enumerate(times):
        take.sample(now, wanted[:, k] * abilities.stroke, let[:, k])
    take.close()
    return times, let


def test_a_score_that_somebody_may_have_worked_on_is_replaced_by_force_alone(folder, capsys):
    (folder / "beneath.score").write_text(SCORE)
    (folder / "other.score").write_text("# mine\n")
    play(folder, fibers=(1,), onto="beneath.score")
    for out in ("other.score", "beneath.score"):
        kept = (folder / out).read_text()
        laid = ["take", "a.take", "-o", out, "--onto", "beneath.score"]
        assert run(laid) == 2
        assert "it would be lost" in (err := capsys.readouterr().err) and "--force" in err
        assert (folder / out).read_text() == kept
        assert run([*laid, "--force"]) == 0
        assert "section take" in (folder / out).read_text()
    # What a take itself was written to is nobody's work.
    assert run(["take", "a.take", "-o", "alone.score"]) == 0
    assert run(["take", "a.take", "-o", "alone.score"]) == 0


def test_snags_are_told_as_the_check_tells_them(folder, capsys):
    text = SCORE.replace("r.* nod times 5 ", "r.* leap times 5 ").replace(
        "phrase nod", "phrase leap\n  0.02 full\n  1 rest\nphrase nod"
    )
    (folder / "beneath.score").write_text(text)
    play(folder, fibers=(1,), onto="beneath.score", from_s=4.0, seconds=6.0)
    assert run(["take", "a.take", "-o", "over.score", "--onto", "beneath.score", "--at", "4s"]) == 1
    told = capsys.readouterr().out
    assert run(["check", "over.score"]) == 1
    assert told.endswith(capsys.readouterr().out)
    assert run(["take", "a.take", "-o", "over.score", "--onto", "beneath.score", "--at", "4s", "--force", "--json"]) == 1
    snags = json.loads(capsys.readouterr().out)["snags"]
    assert snags and {snag["kind"] for snag in snags} == {"rate"}


@pytest.mark.parametrize("flat", [False, True])
@pytest.mark.parametrize(("at", "seconds"), [(3.0, 2.5), (3.0, 5.0), (7.0, 3.3), (9.5, 2.0), (0.5, 10.0)])
def test_after_a_punch_in_fibers_come_back_to_the_score_and_do_as_it_has_them(folder, capsys, flat, at, seconds):
    (folder / "long.score").write_text(LONG)
    before = load_score("long.score")
    if flat:
        (folder / "long.score").write_text(write_flat(before.tracks, before.score, before.rig, before.tempo))
    times, let = punched(folder, "long.score", at, seconds)
    assert run(["take", "p.take", "-o", "over.score", "--onto", "long.score", "--at", f"{at}s"]) == 0, capsys.readouterr()
    after = load_score("over.score")
    assert check(after.tracks, after.rig, after.abilities).ok
    grid = np.arange(0.0, 16.5, 0.005)
    there, was = strain_at(after.tracks, after.abilities, grid), strain_at(before.tracks, before.abilities, grid)
    for fiber in (0, 2, 3):
        assert there[fiber] == pytest.approx(was[fiber], abs=1e-9)
    # A quiver fades out before the take and in after it, which takes a quarter of its period.
    assert there[1][grid < at - 0.15] == pytest.approx(was[1][grid < at - 0.15], abs=1e-9)
    taken = (times > at + 0.25) & (times <= at + seconds)
    assert np.abs(there[1][: len(times)][taken] - let[1][taken]).max() <= 0.01 * 0.3 + 1e-9
    back = grid >= 15.0 if at + seconds > 10.0 else grid >= 13.1
    assert there[1][back] == pytest.approx(was[1][back], abs=1e-9)


def test_a_fiber_is_handed_back_before_the_next_of_the_scores_entries_begins(folder):
    (folder / "beneath.score").write_text(SCORE)
    _, let = punched(folder, "beneath.score", 1.0, 2.2)
    assert let[1][-1] > 0.02
    assert run(["take", "p.take", "-o", "over.score", "--onto", "beneath.score", "--at", "1s"]) == 0
    before, after = load_score("beneath.score"), load_score("over.score")
    assert check(after.tracks, after.rig, after.abilities).ok
    grid = np.arange(5.0, 9.0, 0.005)
    there, was = (strain_at(score.tracks, score.abilities, grid) for score in (after, before))
    assert there == pytest.approx(was, abs=1e-9)


@pytest.mark.parametrize(
    ("arguments", "says"),
    [
        (["nothing.take", "-o", "o.score"], "nothing.take: cannot read: there is no such file"),
        (["bench.rig.toml", "-o", "o.score"], "bench.rig.toml: this is no take"),
        (["a.take", "-o", "a.take"], "would overwrite a.take"),
        (["a.take", "-o", "o.score", "--tolerance", "0"], "0.01 to 20 per cent"),
        (["a.take", "-o", "o.score", "--tolerance", "nan"], "0.01 to 20 per cent"),
        (["a.take", "-o", "o.score", "--tempo", "0"], "1 to 1000"),
        (["a.take", "-o", "o.score", "--at", "middle"], "name the score with --onto"),
        (["a.take", "-o", "o.score", "--meter", "four"], "four"),
        (["a.take", "-o", "o.score", "--onto", "beneath.score", "--at", "midle"], "did you mean 'middle'?"),
        (["a.take", "-o", "o.score", "--onto", "beneath.score", "--at", "900s"], "the take ends before"),
        (["a.take", "-o", "nowhere/o.score"], "nowhere"),
    ],
)
def test_what_is_wrong_with_the_call_is_told_and_nothing_is_written(folder, capsys, arguments, says):
    (folder / "beneath.score").write_text(SCORE)
    play(folder, seconds=4.0)
    kept = sorted(path.name for path in folder.iterdir())
    assert run(["take", *arguments]) == 2
    assert says in capsys.readouterr().err
    assert sorted(path.name for path in folder.iterdir()) == kept


def test_a_take_in_which_nothing_moved_is_a_score_without_moves(folder, capsys):
    take = TakeFile("still.take", load_rig("bench.rig.toml"))
    for k in range(400):
        take.sample(0.005 * k, np.zeros(4), np.zeros(4))
    take.close()
    assert run(["take", "still.take", "-o", "still.score"]) == 0
    assert "0 fibers in 0 phrases" in capsys.readouterr().out
    assert load_score("still.score").tracks.moves == 0


def test_a_take_of_one_sample_is_a_score_too(folder):
    take = TakeFile("one.take", load_rig("bench.rig.toml"))
    take.sample(0.0, np.full(4, 0.1), np.full(4, 0.1))
    take.close()
    assert run(["take", "one.take", "-o", "one.score"]) == 0
