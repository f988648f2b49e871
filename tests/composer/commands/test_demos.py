import os

from player.commands.main import run


def test_the_demos_are_copied_and_what_was_written_is_said(tmp_path, capsys):
    assert run(["demos", str(tmp_path / "new" / "demos")]) == 0
    said = capsys.readouterr().out
    for name in ("estuary.score", "estuary.rig.toml", "gannet.score", "gannet.rig.toml"):
        assert (tmp_path / "new" / "demos" / name).stat().st_size > 0
        assert str(tmp_path / "new" / "demos" / name) in said
    assert f"  drawcord check {tmp_path}/new/demos/estuary.score\n" in said


def test_files_that_are_there_stay_and_nothing_else_is_written(tmp_path, capsys):
    (tmp_path / "gannet.score").write_text("mine")
    assert run(["demos", str(tmp_path)]) == 2
    said = capsys.readouterr().err
    assert said.startswith(f"{tmp_path}/gannet.score: this file is there already\n   nothing was written")
    assert os.listdir(tmp_path) == ["gannet.score"]
    assert (tmp_path / "gannet.score").read_text() == "mine"


def test_a_file_in_the_folder_s_place_is_refused(tmp_path, capsys):
    (tmp_path / "file").write_text("mine")
    assert run(["demos", str(tmp_path / "file")]) == 2
    assert run(["demos", str(tmp_path / "file" / "below")]) == 2
    said = capsys.readouterr().err
    assert "file: this is a file; expected a folder" in said
    assert "below: cannot make the folder" in said
