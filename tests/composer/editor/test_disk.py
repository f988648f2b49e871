"""The score, its file of recovery and its claim, on a real disk."""

import os
import subprocess
import sys

import pytest

from composer.editor import disk, recovery
from composer.editor.deltas import Delta
from composer.faults import Faults


def kept(path, text="abc", of="a.score", saved="h"):
    keeping = disk.Keeping(str(path), of, saved, text)
    keeping.take_place()
    return keeping


def test_changes_are_there_for_others_as_soon_as_they_are_added(tmp_path):
    path = tmp_path / "r.unsaved"
    keeping = kept(path)
    keeping.add(Delta(3, 0, "d"))
    assert recovery.read(path.read_bytes()).text == "abcd"
    keeping.close()


def test_a_new_file_of_recovery_leaves_the_old_one_whole_until_it_takes_its_place(tmp_path):
    path = tmp_path / "r.unsaved"
    kept(path, "old").close()
    new = disk.Keeping(str(path), "a.score", "h", "new")
    new.add(Delta(0, 0, "x"))
    assert recovery.read(path.read_bytes()).text == "old"
    new.take_place()
    assert recovery.read(path.read_bytes()).text == "xnew"
    new.close()


def test_a_text_is_read_back_with_its_line_ends_as_they_were(tmp_path):
    path = tmp_path / "a.score"
    path.write_bytes(b"one\r\ntwo\r\n")
    read = disk.read_score(str(path))
    assert (read.text, read.line_end, read.mixed) == ("one\ntwo\n", "\r\n", False)
    disk.write_score(str(path), read.text, read.line_end)
    assert path.read_bytes() == b"one\r\ntwo\r\n"


def test_mixed_line_ends_are_told(tmp_path):
    path = tmp_path / "a.score"
    path.write_bytes(b"one\r\ntwo\nthree\n")
    read = disk.read_score(str(path))
    assert (read.text, read.line_end, read.mixed) == ("one\ntwo\nthree\n", "\n", True)


def test_a_file_that_is_too_large_is_refused_with_its_bound(tmp_path):
    path = tmp_path / "a.score"
    path.write_bytes(b"x" * (8 * 1024 * 1024 + 1))
    with pytest.raises(Faults, match="8 MiB"):
        disk.read_score(str(path))


def test_the_stamp_changes_when_somebody_else_writes(tmp_path):
    path = tmp_path / "a.score"
    stamp = disk.write_score(str(path), "one\n")
    assert disk.stamp_of(str(path)) == stamp
    path.write_text("one two\n")
    assert disk.stamp_of(str(path)) != stamp
    path.unlink()
    assert disk.stamp_of(str(path)) is None


def test_a_text_that_a_dead_process_left_is_found_and_one_in_use_is_not(tmp_path):
    path = disk.untitled_path()
    kept(path, "lost", "").close()
    code = (
        "import sys; from composer.editor.disk import Claim; claim = Claim(sys.argv[1]); print(claim.take(), flush=True);"
        "sys.stdin.read()"
    )
    other = subprocess.Popen([sys.executable, "-c", code, path], stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True)
    assert other.stdout.readline() == "True\n"
    assert disk.left_behind() == []
    assert not disk.Claim(path).take()
    other.kill()
    other.wait()
    assert [(where, read.text) for where, read in disk.left_behind()] == [(path, "lost")]
    assert disk.Claim(path).take()


def test_where_the_folder_cannot_be_written_changes_are_kept_with_the_program(tmp_path, monkeypatch, state):
    inside = tmp_path / "a.score"
    assert disk.recovery_path(str(inside)) == str(tmp_path / ".a.score.unsaved")
    monkeypatch.setattr(os, "access", lambda *_: False)
    assert disk.recovery_path(str(inside)).startswith(str(state))


def test_the_demo_comes_with_the_folder_of_its_rig():
    text, folder = disk.demo()
    assert 'title   "Estuary"' in text
    assert os.path.exists(os.path.join(folder, "estuary.rig.toml"))


def test_paths_are_those_of_the_folder_and_of_the_folders_below_until_a_folder_is_typed(tmp_path):
    for name in ("a.rig.toml", "b.score", ".hidden.rig.toml", "rigs/c.rig.toml", "rigs/deep/d.rig.toml"):
        (tmp_path / name).parent.mkdir(parents=True, exist_ok=True)
        (tmp_path / name).touch()
    at = str(tmp_path)
    assert disk.paths_in(at, "", ".rig.toml") == ["a.rig.toml", "rigs/c.rig.toml"]
    assert disk.paths_in(at, "rigs/c", ".rig.toml") == ["rigs/c.rig.toml", "rigs/deep/"]
    assert disk.paths_in(str(tmp_path / "rigs"), "../", ".score") == ["../b.score", "../rigs/"]
    assert disk.paths_in(at, "none/", ".score") == disk.paths_in(at, "nul\0/", ".score") == []
