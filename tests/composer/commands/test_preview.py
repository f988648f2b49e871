"""`drawcord preview` as it is called."""

import contextlib
import csv
import io
import json
import signal
import subprocess
import sys

import av
import numpy as np
import pytest

from composer.picture.film import movie_file
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
    assert all(option in said for option in ("--png", "--movie", "--csv", "--json"))


@pytest.mark.parametrize(
    ("options", "word"),
    [
        (["--png", "{folder}/no/such/out.png"], "no folder"),
        (["--png", "{folder}/bench.score"], "bench.score' ends in '.score'; expected .png, which says what is made"),
        (["--png", "{folder}/page.pdf"], "ends in '.pdf'; expected .png, which says what is made"),
        (["--png", "{folder}/page"], "has no ending; expected .png"),
        (["--csv", "{folder}/bench.rig.toml"], "ends in '.toml'; expected .csv"),
        (["--movie", "{folder}/film.webm"], "ends in '.webm'; expected .mp4 or .gif"),
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


def test_a_movie_is_written_of_a_passage_named_by_a_cue_and_a_place(score, tmp_path, capsys):
    path = score()
    with open(path, "a") as file:
        file.write('\ncue "here" at 1:2\n')
    movie = tmp_path / "out.mp4"
    call = ["preview", path, "--movie", str(movie), "--from", "here", "--to", "1:3", "--size", "320x240", "--fps", "10"]
    assert run(call) == 0
    said = capsys.readouterr()
    assert f"written: {movie}, 11 frames" in said.out
    assert not said.err
    with av.open(str(movie)) as container:
        frames = [frame.to_ndarray(format="rgb24") for frame in container.decode(video=0)]
    assert len(frames) == 11
    assert frames[0].shape == (240, 320, 3)


def test_a_movie_and_the_report_come_from_one_run(score, tmp_path, capsys):
    movie = tmp_path / "out.gif"
    call = ["preview", score(), "--movie", str(movie), "--json", "--to", "1:2", "--size", "321x241", "--fps", "5"]
    assert run(call) == 0
    assert json.loads(capsys.readouterr().out)["fibers"] == 2
    assert movie.read_bytes().startswith(b"GIF89a")


def test_json_tells_what_fibers_will_do_tonight(score, capsys):
    assert run(["preview", score(), "--json"]) == 0
    told = json.loads(capsys.readouterr().out)
    assert told["tonight"]["lowest_kPa"] == pytest.approx(told["air"]["lowest_kPa"], abs=1e-3)
    assert told["tonight"]["landings"] == len(told["hits"])
    assert {group["group"] for group in told["tonight"]["groups"]}


@pytest.mark.parametrize(
    ("options", "word"),
    [
        (["--movie", "{folder}/a.avi"], "expected .mp4 or .gif, which says what is made"),
        (["--movie", "{folder}/bench.score"], "expected .mp4 or .gif, which says what is made"),
        (["--movie", "{folder}/a.mp4", "--size", "641x360"], "odd side"),
        (["--movie", "{folder}/a.mp4", "--size", "16x16"], "out of range"),
        (["--movie", "{folder}/a.mp4", "--size", "9000x9000"], "out of range"),
        (["--movie", "{folder}/a.mp4", "--fps", "nan"], "out of range"),
        (["--movie", "{folder}/a.gif", "--fps", "60"], "out of range"),
        (["--movie", "{folder}/a.mp4", "--from", "nowhere"], "no cue of that name"),
        (["--movie", "{folder}/a.mp4", "--from", "1:9"], "no count 9"),
        (["--movie", "{folder}/a.mp4", "--from", "1:x"], "no cue of that name"),
        (["--movie", "{folder}/a.mp4", "--from", "900:1"], "ends before"),
        (["--movie", "{folder}/a.mp4", "--from", "1:3", "--to", "1:2"], "an end after the start"),
        (["--movie", "{folder}/a.mp4", "--view", "below"], "three-quarter"),
        (["--movie", "{folder}/no/such/a.mp4"], "no folder"),
        (["--movie", "{folder}/a.mp4", "--png", "{folder}/a.mp4"], "ends in '.mp4'; expected .png"),
        (["--json", "--from", "1:2"], "--movie"),
    ],
)
def test_a_movie_that_cannot_be_is_refused_before_any_work(score, tmp_path, capsys, options, word):
    path = score()
    before = {file.name: file.read_bytes() for file in tmp_path.iterdir()}
    assert run(["preview", path, *(option.format(folder=tmp_path) for option in options)]) == 2
    said = capsys.readouterr()
    assert word in said.err
    assert not said.out
    assert {file.name: file.read_bytes() for file in tmp_path.iterdir()} == before


def test_without_an_encoder_it_says_what_to_install_before_any_work(score, tmp_path, capsys, monkeypatch):
    def none():
        raise movie_file.EncoderFailedError("No ffmpeg exe could be found")

    monkeypatch.setattr(movie_file, "encoder", none)
    assert run(["preview", score(), "--movie", str(tmp_path / "out.mp4")]) == 2
    assert "imageio-ffmpeg" in capsys.readouterr().err
    assert not (tmp_path / "out.mp4").exists()


def test_ctrl_c_while_filming_leaves_no_file(score, tmp_path):
    path, movie = score(), tmp_path / "out.mp4"
    call = [sys.executable, "-m", "player.commands.main", "preview", path, "--movie", str(movie), "--fps", "60"]
    running = subprocess.Popen([*call, "--size", "1920x1080"], stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True)
    deadline = 600
    while not any(part.stat().st_size for part in tmp_path.glob(".drawcord-*.part/*")) and running.poll() is None and deadline:
        deadline -= 1
        with contextlib.suppress(subprocess.TimeoutExpired):
            running.wait(timeout=0.1)
    running.send_signal(signal.SIGINT)
    err = running.communicate(timeout=60)[1]
    assert running.returncode not in (0, 2)
    assert "Traceback" not in err
    assert sorted(file.name for file in tmp_path.iterdir()) == ["bench.rig.toml", "bench.score"]
