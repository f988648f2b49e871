import io

import pytest
from mido import MetaMessage, MidiFile, MidiTrack

from player.commands.main import run


@pytest.fixture
def song(tmp_path):
    track = MidiTrack([MetaMessage("set_tempo", tempo=625_000), MetaMessage("marker", text="verse", time=1920)])
    path = tmp_path / "song.mid"
    MidiFile(type=1, tracks=[track]).save(path)
    return path


SAID = '# from song.mid\nmeter   4/4\ntempo   96\ncue     "verse" at 2:1\n'


def test_a_midi_file_is_told_as_statements_of_a_score(song, capsys):
    assert run(["tempo", str(song)]) == 0
    assert capsys.readouterr().out == SAID
    out = song.with_name("tempo.score")
    assert run(["tempo", str(song), "-o", str(out)]) == 0
    assert out.read_text() == SAID


def test_a_score_becomes_a_midi_file_and_comes_back(song, capsys, tmp_path):
    score, out = tmp_path / "song.score", tmp_path / "back.mid"
    score.write_text(
        "rig nowhere.rig.toml\nuse more.score\ntempo 96\ntempo 96 to 120 from 3:1 to 5:1\n" + 'cue "verse" at 2:1 wait\n'
    )
    (tmp_path / "more.score").write_text("phrase a\n  1 full\n")
    assert run(["tempo", str(score), "-o", str(out)]) == 0
    assert MidiFile(out).ticks_per_beat == 960
    assert run(["tempo", str(out)]) == 0
    assert capsys.readouterr().out == (
        '# from back.mid\nmeter   4/4\ntempo   96\ntempo   96 to 120 from 3:1 to 5:1\ncue     "verse" at 2:1 wait\n'
    )


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        (["none.mid"], "there is no such file"),
        (["bad.mid"], "bad.mid: this is no standard MIDI file"),
        (["bad.score"], "say where to: -o OUT.mid"),
        (["bad.score", "-o", "x.mid"], "bad.score:1:1: "),
        (["song.mid", "-o", "x.mid"], "the input is a MIDI file already"),
        (["bad.score", "-o", "x.score"], "the input is a score already"),
        (["song.mid", "-o", "song.mid"], "the output is the input"),
        (["song.mid", "-o", "no/x.score"], "there is no folder"),
    ],
)
def test_what_cannot_be_done_is_told_and_nothing_is_written(song, tmp_path, monkeypatch, capsys, arguments, said):
    monkeypatch.chdir(tmp_path)
    (tmp_path / "bad.mid").write_text("tempo 96\n")
    (tmp_path / "bad.score").write_text("tmpo 96\n")
    before = sorted(tmp_path.iterdir()), song.read_bytes()
    assert run(["tempo", *arguments]) == 2
    assert said in capsys.readouterr().err
    assert (sorted(tmp_path.iterdir()), song.read_bytes()) == before


def test_a_midi_file_under_another_name_is_known_by_its_bytes(song, tmp_path, capsys):
    other = tmp_path / "song.dat"
    other.write_bytes(song.read_bytes())
    assert run(["tempo", str(other)]) == 0
    assert "tempo   96" in capsys.readouterr().out


def test_a_wide_file_takes_bounded_time(tmp_path, capsys):
    track = MidiTrack(MetaMessage("set_tempo", tempo=400_000 + number * 7919 % 100_003, time=7) for number in range(20_000))
    out = io.BytesIO()
    MidiFile(type=0, tracks=[track]).save(file=out)
    (tmp_path / "wide.mid").write_bytes(out.getvalue())
    assert run(["tempo", str(tmp_path / "wide.mid")]) == 0
    assert capsys.readouterr().out.count("\n") > 100
