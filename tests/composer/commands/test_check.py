"""`drawcord check`, as a person calls it."""

import json

import pytest

SCORE = """title "Small"
rig small.rig.toml
tempo 60
meter 4/4
phrase up
  0 rest
  {seconds} full linear
section a at 2:1
  reed.1 up
"""


@pytest.fixture
def run(tmp_path, monkeypatch, capsys, small_rig):
    """Write the rig and a score whose move takes some counts, run `drawcord check`, give its code, stdout and stderr."""
    from player.commands.main import run as drawcord

    monkeypatch.chdir(tmp_path)
    (tmp_path / "small.rig.toml").write_text(
        small_rig(title="Small", rows=(("reed", "main"),), count=3, drive="pressure", duty=0.6)
    )

    def check(seconds: str, *options: str, text: str = SCORE):
        (tmp_path / "small.score").write_text(text.format(seconds=seconds))
        code = drawcord(["check", "small.score", *options])
        return code, *capsys.readouterr()

    return check


def test_a_score_that_the_rig_can_do_ends_with_0(run):
    code, out, err = run("1")
    assert (code, err) == (0, "")
    assert "the rig can do all of it" in out


def test_a_move_that_is_too_fast_ends_with_1_and_names_line_bar_and_count(run):
    code, out, err = run("1/4")
    assert (code, err) == (1, "")
    assert "small.score:9: reed.1 is asked to fill in 0.25 s, landing at bar 2 count 1.25; it needs 0.50 s." in out
    assert "(Its phrase: line 7.)" in out


def test_json_is_one_object_and_nothing_else(run):
    code, out, err = run("1/4", "--json")
    told = json.loads(out)
    assert (code, err, out.count("\n")) == (1, "", 1)
    assert (told["score"], told["ok"], told["fibers"], told["moves"]) == ("small.score", False, 3, 1)
    (snag,) = told["snags"]
    assert (snag["fiber"], snag["place"], snag["needs"], snag["has"], snag["line"]) == ("reed.1", "2:1", 1.2, 0.6, 9)


def test_a_wrong_name_ends_with_2_and_says_where(run):
    code, out, err = run("1", text=SCORE.replace("reed.1 up", "reeds up"))
    assert (code, out) == (2, "")
    assert "small.score:9:3" in err
    assert "Traceback" not in err


def test_a_score_that_is_not_there_ends_with_2(run, tmp_path, capsys):
    from player.commands.main import run as drawcord

    assert drawcord(["check", "none.score"]) == 2
    assert "none.score" in capsys.readouterr().err
