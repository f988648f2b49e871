"""The folder of a user's runs: theirs alone, or none."""

import os
import shutil
import stat
import subprocess
import sys
import tempfile

import pytest

from player.engine.process.room import NoRoom, folder, listen, name_for, path_of, runs, sweep


@pytest.fixture
def here(tmp_path, monkeypatch):
    monkeypatch.setenv("XDG_RUNTIME_DIR", str(tmp_path))
    return tmp_path


def test_folder_and_socket_are_the_users_alone(own_runs):
    made = listen("mine-77")
    path = path_of("mine-77")
    assert stat.S_IMODE(os.stat(folder()).st_mode) == 0o700 and stat.S_IMODE(os.stat(path).st_mode) == 0o600
    made.close()
    os.unlink(path)


def test_a_folder_that_others_may_read_is_closed_to_them(here):
    (here / "drawcord").mkdir(mode=0o755)
    os.chmod(here / "drawcord", 0o755)
    assert stat.S_IMODE(os.stat(folder()).st_mode) == 0o700


def test_a_link_in_the_folders_place_is_refused(here, tmp_path):
    (tmp_path / "elsewhere").mkdir()
    (here / "drawcord").symlink_to(tmp_path / "elsewhere")
    with pytest.raises(NoRoom, match="not a folder of yours"):
        folder()


def test_a_folder_into_which_others_may_write_is_refused(here, monkeypatch):
    monkeypatch.setattr("platformdirs.user_runtime_path", lambda *_, **__: here / "drawcord")
    os.chmod(here, 0o777)
    with pytest.raises(NoRoom, match="others may write"):
        folder()


def test_a_path_that_is_too_long_for_a_socket_is_told(tmp_path, monkeypatch):
    long = tmp_path / ("x" * 100)
    long.mkdir(mode=0o700)
    monkeypatch.setenv("XDG_RUNTIME_DIR", str(long))
    with pytest.raises(NoRoom, match="too long"):
        listen("run-1")


def test_names_are_made_of_what_is_played_and_the_process(here):
    assert name_for("scores/Estuary, first night.score") == f"Estuary-first-night-{os.getpid()}"
    assert name_for("…") == f"run-{os.getpid()}"


def test_sockets_of_killed_runs_are_swept_away_and_others_stay(here):
    gone = subprocess.Popen([sys.executable, "-c", ""])
    gone.wait()
    at = folder()
    for name in (f"old-{gone.pid}.run", f"now-{os.getpid()}.run", "notes.txt"):
        with open(os.path.join(at, name), "w"):
            pass
    sweep()
    assert sorted(os.listdir(at)) == ["notes.txt", f"now-{os.getpid()}.run"]


def test_only_runs_that_listen_are_listed_though_their_process_may_not_be_reaped_yet(here, monkeypatch):
    # A folder that is short enough for a socket's path.
    short = tempfile.mkdtemp(prefix="runs-")
    monkeypatch.setenv("XDG_RUNTIME_DIR", short)
    gone, stays = listen(f"gone-{os.getpid()}"), listen(f"stays-{os.getpid()}")
    gone.close()
    assert runs() == (f"stays-{os.getpid()}",) and os.listdir(folder()) == [f"stays-{os.getpid()}.run"]
    stays.close()
    shutil.rmtree(short)
