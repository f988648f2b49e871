"""`drawcord preview` as it is called."""

import csv
import io
import json

import numpy as np
import pytest

from player.commands.main import run

SCORE = """title "Bench"
rig bench.rig.toml
tempo 60
phrase rise 4
  {counts} full linear
section one at 1:1
  reed.1 rise after 1
"""


@pytest.fixture
def score(tmp_path, small_rig):
    """A maker of scores in which reed.1 rises, from 1 s on, in so many counts of a second."""
    (tmp_path / "bench.rig.toml").write_text(small_rig(rows=(("reed", "main"),), count=2))

    def make(counts="1"):
        path = tmp_path / "bench.score"
        path.write_text(SCORE.format(counts=counts))
        return str(path)

    return make


def test_a_score_that_the_rig_can_do_is_followed_all_the_way(score, capsys):
    assert run(["preview", score(), "--json"]) == 0
    told = json.loads(capsys.readouterr().out)
    assert told["largest"]["error_of_stroke"] < 1e-6
    assert [(hit["place"], hit["fiber"], hit["line"], hit["late_s"]) for hit in told["hits"]] == [("1:3", "reed.1", 7, 0.0)]


def test_an_unretimed_score_visibly_misses_and_the_report_says_where(score, capsys):
    assert run(["preview", score("1/4"), "--json"]) == 0
    told = json.loads(capsys.readouterr().out)
    # In 0.25 s a fiber that fills at 0.6 a second does half of a stroke of 0.3; 95 % come after 0.475 s.
    hit = told["hits"][0]
    assert hit["error"] == pytest.approx(-0.15, abs=1e-6)
    assert hit["late_s"] == pytest.approx(0.225, abs=1e-3)
    assert (told["largest"]["fiber"], told["largest"]["place"], told["largest"]["line"]) == ("reed.1", "1:2.25", 7)


def test_the_table_has_a_row_a_tick_and_the_contracts_header(score, tmp_path):
    table = tmp_path / "out.csv"
    assert run(["preview", score(), "--csv", str(table), "--rate", "100"]) == 0
    rows = list(csv.DictReader(io.StringIO(table.read_text())))
    assert list(rows[0])[:4] == ["time_s", "reed.1.target", "reed.1.strain", "reed.1.pressure_kPa"]
    assert list(rows[0])[-1] == "supply_kPa"
    assert [float(row["time_s"]) for row in rows] == pytest.approx(np.arange(len(rows)) * 0.01)
    assert {row["reed.1.pressure_kPa"] for row in rows} == {""}
    assert float(rows[150]["reed.1.strain"]) == pytest.approx(0.15, abs=1e-6)


def test_the_picture_has_the_size_asked_for(score, tmp_path):
    picture = tmp_path / "out.png"
    assert run(["preview", score(), "--png", str(picture), "--size", "800x500"]) == 0
    data = picture.read_bytes()
    assert (int.from_bytes(data[16:20]), int.from_bytes(data[20:24])) == (800, 500)


def test_without_a_screen_and_without_an_option_it_says_which_options_write_files(score, capsys, monkeypatch):
    for name in ("DISPLAY", "WAYLAND_DISPLAY"):
        monkeypatch.delenv(name, raising=False)
    monkeypatch.setenv("QT_QPA_PLATFORM", "offscreen")
    assert run(["preview", score()]) == 2
    said = capsys.readouterr().err
    assert all(option in said for option in ("--png", "--csv", "--json"))


@pytest.mark.parametrize(
    ("options", "word"),
    [
        (["--png", "{folder}/no/such/out.png"], "no folder"),
        (["--png", "{folder}/bench.score"], "write over"),
        (["--csv", "{folder}/bench.rig.toml"], "write over"),
        (["--png", "{folder}/a", "--csv", "{folder}/a"], "write over"),
        (["--png", "{folder}/a.png", "--size", "9x9"], "out of range"),
        (["--png", "{folder}/a.png", "--size", "huge"], "no size"),
        (["--json", "--rate", "nan"], "out of range"),
        (["--json", "--rate", "1e9"], "out of range"),
        (["--json", "--rig", "{folder}/none.toml"], "no such file"),
    ],
)
def test_a_wrong_call_is_answered_with_a_sentence_and_nothing_is_written(score, tmp_path, capsys, options, word):
    path = score()
    before = {file.name: file.read_bytes() for file in tmp_path.iterdir()}
    assert run(["preview", path, *(option.format(folder=tmp_path) for option in options)]) == 2
    said = capsys.readouterr()
    assert word in said.err
    assert not said.out
    assert {file.name: file.read_bytes() for file in tmp_path.iterdir()} == before
