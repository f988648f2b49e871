"""`drawcord retime`, run as a person runs it: exit codes, JSON, files written whole or not at all."""

import json
from pathlib import Path

import numpy as np
import pytest
from click.testing import CliRunner

from composer.faults import Faults
from composer.limits.check import check
from composer.load import load_score
from composer.play_file import read_play


@pytest.fixture
def demo(tmp_path) -> Path:
    """A rig of the demos and a score of our own beside it."""
    source = Path(__file__).parents[3] / "scores_demo" / "estuary.rig.toml"
    (tmp_path / "estuary.rig.toml").write_text(source.read_text())
    return tmp_path


def score(folder: Path, body: str, pins: str = "") -> Path:
    path = folder / "one.score"
    path.write_text(
        f'title "One"\nrig estuary.rig.toml\n{pins}cue "go" at 2:1\n\nphrase up\n  0.25  full  linear\n  4  rest  linear\n\n'
        f"section one at 1:1\n{body}"
    )
    return path


def run(*arguments):
    from composer.commands.retime import command

    return CliRunner().invoke(command, [str(a) for a in arguments], standalone_mode=False)


def test_a_score_that_time_mends_ends_with_0_and_both_files_are_written(demo):
    path = score(demo, "  reed.1  up\n")
    found = run(path, "-o", demo / "one.play", "--flat", demo / "flat.score", "--json")
    assert found.return_value == 0, found.output
    told = json.loads(found.stdout)
    assert told["ok"] and not told["snags_left"] and told["cost"] == pytest.approx(told["bound"])
    keys = "ok keep duration_s was_s hits_moved leads shrunk pins_short cost bound solve_s snags_left stopped pins"
    assert list(told) == keys.split()
    (hit,) = told["hits_moved"]
    assert hit["held_by"]["kind"] == "move" and hit["held_by"]["says"].startswith("reed.1 needs")
    assert (hit["place"], hit["was_s"], hit["fibers"], hit["line"]) == ("1:1.25", 0.25, ["reed.1"], 10)
    play = read_play(demo / "one.play")
    flat = load_score(demo / "flat.score")
    assert check(flat.tracks, flat.rig, flat.abilities).ok
    moving = play.tracks.time_s[play.tracks.first[0] : play.tracks.first[1]]
    assert flat.tracks.time_s[flat.tracks.first[0] : flat.tracks.first[1]] == pytest.approx(moving, abs=1e-6)
    assert [cue.seconds for cue in play.cues] == [4.0]


def test_the_picture_shows_both_scores_and_is_written_only_where_time_mends(demo):
    from PySide6.QtGui import QImage

    path = score(demo, "  reed.1-8  up\n")
    found = run(path, "--png", demo / "both.png")
    assert found.return_value == 0, found.output
    picture = QImage(str(demo / "both.png"))
    assert (picture.width(), picture.height()) == (1600, 1000)
    bad = score(demo, "  reed.1  up\n", "pin 1:1.25\n")
    assert run(bad, "--png", demo / "none.png").return_value == 1
    assert not (demo / "none.png").exists()


def test_when_time_is_up_the_best_that_is_known_is_told_as_such(demo, monkeypatch):
    import time

    ticks = iter(range(0, 1_000_000, 100))
    # Two hits in their rhythm: what one pass forward in time does not prove by itself.
    path = score(demo, "  reed.1  up\n  reed.2  up after 1\n", "keep rhythm\n")
    with monkeypatch.context() as patched:
        patched.setattr(time, "perf_counter", lambda: float(next(ticks)))
        found = run(path, "--limit", "50")
    assert found.return_value == 0, found.output
    assert "the best known when time was up" in found.output


def test_two_outputs_cannot_be_one_file(demo):
    path = score(demo, "  reed.1  up\n")
    found = run(path, "-o", demo / "same.png", "--png", demo / "same.png")
    assert isinstance(found.exception, Faults) and "a file each" in str(found.exception)


def test_pins_too_close_end_with_1_nothing_written_and_say_what_would_mend_it(demo):
    path = score(demo, "  reed.1  up\n", "pin 1:1.25\n")
    found = run(path, "-o", demo / "one.play")
    assert found.return_value == 1
    assert "reed.1" in found.output and "--shrink" in found.output
    assert not (demo / "one.play").exists()
    told = json.loads(run(path, "--json").stdout)
    assert not told["ok"] and told["cost"] is None
    (short,) = told["pins_short"]
    assert (short["from"], short["to"], short["fibers"]) == ("1:1", "1:1.25", ["reed.1"])


def test_shrinking_mends_pins_too_close(demo):
    path = score(demo, "  reed.1  up\n", "pin 1:1.25\n")
    found = run(path, "--shrink", "--json", "-o", demo / "one.play")
    told = json.loads(found.stdout)
    assert found.return_value == 0 and told["ok"]
    assert [move["fiber"] for move in told["shrunk"]] == ["reed.1"]
    assert 0.0 < told["shrunk"][0]["factor"] < 1.0
    assert (demo / "one.play").exists()


def test_the_report_names_each_hit_that_moved_with_its_line(demo):
    found = run(score(demo, "  reed.1-3  up\n"))
    assert found.return_value == 0
    assert "1:1.25" in found.output and "reed.1-3" in found.output and "line 10" in found.output


def test_what_time_cannot_mend_ends_with_1_and_is_told(demo):
    found = run(score(demo, "  reed.1  up scale 2\n"), "-o", demo / "one.play")
    assert found.return_value == 1
    assert "cannot mend" in found.output
    assert not (demo / "one.play").exists()


def test_keep_on_the_command_line_is_what_is_kept(demo):
    path = score(demo, "  reed.1  up times 2\n")
    assert [json.loads(run(path, "--keep", keep, "--json").stdout)["keep"] for keep in ("clock", "rhythm")] == [
        "clock",
        "rhythm",
    ]


@pytest.mark.parametrize("outputs", ["-o one.score", "--flat estuary.rig.toml", "-o a --flat a", "-o no/a"])
def test_an_output_that_cannot_be_written_is_refused_before_work_starts(demo, outputs):
    path = score(demo, "  reed.1  up\n")
    before = {item.name: item.read_bytes() for item in demo.iterdir()}
    found = run(path, *(demo / word if not word.startswith("-") else word for word in outputs.split()))
    assert isinstance(found.exception, Faults)
    assert {item.name: item.read_bytes() for item in demo.iterdir()} == before


def test_the_flat_score_retimed_again_has_nothing_to_move(demo):
    path = score(demo, "  reed.1-4  up canon 1/4 times 3\n")
    assert run(path, "--flat", demo / "flat.score").return_value == 0
    again = json.loads(run(demo / "flat.score", "--json").stdout)
    assert again["cost"] == pytest.approx(0.0, abs=1e-9)
    assert np.isfinite(again["bound"])
