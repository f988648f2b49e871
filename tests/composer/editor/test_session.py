"""The file behind the text: saved, kept, recovered, and written by others meanwhile."""

import errno
import os
import subprocess
import sys
from pathlib import Path

import pytest

from composer.editor import disk, recovery
from composer.editor.background import Later
from composer.editor.notices import Notices
from composer.editor.pane import TextPane
from composer.editor.session import Session


class Desk:
    """A session with what it needs, and the means to wait for the disk."""

    def __init__(self, qtbot):
        self.qtbot = qtbot
        self.pane, self.notices, self.later = TextPane(), Notices(), Later()
        for widget in (self.pane, self.notices):
            qtbot.addWidget(widget)
        self.session = Session(self.pane, self.notices, self.later)
        self.session._timer.stop()

    def settle(self):
        self.qtbot.waitUntil(lambda: not self.later.busy, timeout=20_000)

    def type(self, text):
        cursor = self.pane.textCursor()
        cursor.movePosition(cursor.MoveOperation.End)
        cursor.insertText(text)

    def end(self):
        """As kill -9 ends it: nothing is tidied, and the system takes its locks back."""
        keeper = self.session.keeper
        for timer in (keeper._sync, keeper._rewrite):
            timer.stop()
        if keeper._keeping is not None:
            keeper._keeping.close()
        if keeper._claim is not None:
            os.close(keeper._claim._handle)
            keeper._claim._handle = -1
            keeper._claim = None


@pytest.fixture
def make(qtbot):
    made = []

    def one():
        made.append(Desk(qtbot))
        return made[-1]

    yield one
    for desk in made:
        desk.settle()
        desk.end()
        desk.later.end()


@pytest.fixture
def score(tmp_path):
    path = tmp_path / "a.score"
    path.write_text('title "One"\n')
    return path


def test_a_text_that_is_saved_is_in_the_file_and_no_longer_modified(make, score):
    desk = make()
    assert desk.session.open(str(score))
    desk.type("tempo 60\n")
    assert desk.session.modified
    desk.session.save()
    desk.settle()
    assert score.read_text() == 'title "One"\ntempo 60\n'
    assert not desk.session.modified


def test_what_is_typed_while_a_save_is_under_way_is_not_taken_for_saved(make, score):
    desk = make()
    desk.session.open(str(score))
    desk.type("tempo 60\n")
    desk.session.save()
    desk.type("pin 1:1\n")
    desk.settle()
    assert score.read_text() == 'title "One"\ntempo 60\n'
    assert desk.session.modified


def test_a_disk_that_fills_during_a_save_leaves_the_old_file_whole_and_the_text_here(make, score, monkeypatch):
    desk = make()
    desk.session.open(str(score))
    desk.type("tempo 60\n")

    def full(_):
        raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC))

    monkeypatch.setattr(os, "fsync", full)
    desk.session.save()
    desk.settle()
    monkeypatch.undo()
    assert score.read_text() == 'title "One"\n'
    assert desk.pane.text == 'title "One"\ntempo 60\n'
    assert "Not saved; the text is kept." in desk.notices.said["save"]
    assert "the disk is full" in desk.notices.said["save"]
    assert desk.session.modified
    desk.session.save()
    desk.settle()
    assert "save" not in desk.notices.said
    assert score.read_text() == desk.pane.text


def test_a_file_that_may_not_be_written_says_so_at_once(make, score, monkeypatch):
    monkeypatch.setattr(os, "access", lambda path, mode: False)
    desk = make()
    desk.session.open(str(score))
    assert "may not be written here" in desk.notices.said["write"]


def test_a_file_that_cannot_be_read_leaves_the_text_at_hand(make, score, tmp_path):
    desk = make()
    desk.session.open(str(score))
    assert not desk.session.open(str(tmp_path / "none.score"))
    assert "there is no such file" in desk.notices.said["file"]
    assert desk.pane.text == 'title "One"\n'
    assert desk.session.name == "a.score"


def test_a_score_that_is_not_there_yet_is_begun_and_saving_makes_it(make, tmp_path):
    desk, path = make(), tmp_path / "begun.score"
    desk.session.begin_at(str(path))
    assert desk.session.name == "begun.score" and desk.session.modified and not path.exists()
    desk.session.save()
    desk.settle()
    assert path.read_text() == desk.pane.text != "" and not desk.session.modified


def test_a_file_that_came_meanwhile_is_not_written_over(make, tmp_path):
    desk, path = make(), tmp_path / "begun.score"
    desk.session.begin_at(str(path))
    path.write_text('title "Theirs"\n')
    desk.session.save()
    desk.settle()
    assert path.read_text() == 'title "Theirs"\n' and desk.session.modified


def test_after_a_crash_the_text_is_offered_and_can_be_taken_up_and_undone(make, score):
    first = make()
    first.session.open(str(score))
    first.type("tempo 60\n")
    first.end()
    second = make()
    second.session.open(str(score))
    assert second.pane.text == 'title "One"\n'
    (name,) = [name for name in second.notices.said if name.startswith("recovered")]
    assert "a.score (One)" in second.notices.said[name]
    second.notices.choose(name, "Take it up")
    second.settle()
    assert second.pane.text == 'title "One"\ntempo 60\n'
    assert second.session.modified
    second.pane.undo()
    assert second.pane.text == 'title "One"\n'
    second.pane.redo()
    second.end()
    third = make()
    third.session.open(str(score))
    assert len([name for name in third.notices.said if name.startswith("recovered")]) == 1


def test_what_a_crash_left_and_nobody_has_decided_on_is_offered_again(make, score):
    first = make()
    first.session.open(str(score))
    first.type("tempo 60\n")
    first.end()
    second = make()
    second.session.open(str(score))
    second.end()
    third = make()
    third.session.open(str(score))
    (name,) = [name for name in third.notices.said if name.startswith("recovered")]
    third.notices.choose(name, "Save it beside")
    third.settle()
    assert (score.parent / "a.recovered.score").read_text() == 'title "One"\ntempo 60\n'
    third.end()
    fourth = make()
    fourth.session.open(str(score))
    assert not fourth.notices.said


def test_nothing_is_offered_of_what_was_saved(make, score):
    desk = make()
    desk.session.open(str(score))
    desk.type("tempo 60\n")
    desk.session.save()
    desk.settle()
    desk.end()
    again = make()
    again.session.open(str(score))
    assert not again.notices.said


def test_closed_in_order_nothing_is_left_behind(make, score):
    desk = make()
    desk.session.open(str(score))
    desk.type("tempo 60\n")
    desk.session.save()
    desk.settle()
    desk.session.close(keep=True)
    assert os.listdir(score.parent) == ["a.score"] or sorted(os.listdir(score.parent)) == ["a.score", "state"]


def test_another_programs_change_is_told_and_either_text_can_be_had(make, score):
    desk = make()
    desk.session.open(str(score))
    desk.type("mine\n")
    score.write_text('title "Theirs"\n')
    desk.session.look()
    desk.settle()
    assert "was written by another program" in desk.notices.said["theirs"]
    assert desk.pane.text.endswith("mine\n")
    desk.notices.choose("theirs", "Take theirs")
    assert desk.pane.text == 'title "Theirs"\n'
    desk.pane.undo()
    assert desk.pane.text == 'title "One"\nmine\n'


def test_whoever_keeps_theirs_finds_the_others_beside_it(make, score):
    desk = make()
    desk.session.open(str(score))
    desk.type("mine\n")
    score.write_text('title "Theirs"\n')
    desk.session.look()
    desk.settle()
    desk.notices.choose("theirs", "Keep mine")
    desk.settle()
    assert (score.parent / "a.theirs.score").read_text() == 'title "Theirs"\n'
    desk.session.save()
    desk.settle()
    assert score.read_text() == 'title "One"\nmine\n'


def test_a_save_never_goes_over_what_another_program_has_just_written(make, score):
    desk = make()
    desk.session.open(str(score))
    desk.type("mine\n")
    score.write_text('title "Theirs, and longer"\n')
    desk.session.save()
    desk.settle()
    desk.settle()
    assert score.read_text() == 'title "Theirs, and longer"\n'
    desk.qtbot.waitUntil(lambda: "theirs" in desk.notices.said, timeout=20_000)


def test_a_file_that_has_gone_is_told_and_saving_writes_it_again(make, score):
    desk = make()
    desk.session.open(str(score))
    score.unlink()
    desk.session.look()
    desk.settle()
    assert "is no longer there" in desk.notices.said["gone"]
    desk.session.save()
    desk.settle()
    assert score.read_text() == 'title "One"\n'
    assert "gone" not in desk.notices.said


def test_a_second_window_is_told_of_the_first_and_keeps_its_changes_elsewhere(make, score):
    one, other = make(), make()
    one.session.open(str(score))
    # Within one process the lock is the same one; another process holds it for the test.
    one.end()

    code = (
        "import sys; from composer.editor.disk import Claim; Claim(sys.argv[1]).take(); print(1, flush=True); sys.stdin.read()"
    )
    path = disk.recovery_path(str(score))
    holder = subprocess.Popen([sys.executable, "-c", code, path], stdin=subprocess.PIPE, stdout=subprocess.PIPE)
    holder.stdout.readline()
    other.session.open(str(score))
    assert "open in another window too" in other.notices.said["twice"]
    assert other.session.keeper.path != path
    other.type("mine\n")
    assert recovery.read(Path(other.session.keeper.path).read_bytes()).text.endswith("mine\n")
    holder.kill()
    holder.wait()


def test_the_demo_opens_as_an_unsaved_copy_and_its_rig_goes_along_when_it_is_saved(make, tmp_path):
    desk = make()
    desk.session.open_demo()
    assert desk.session.path is None
    assert os.path.exists(os.path.join(os.path.dirname(desk.session.base), "estuary.rig.toml"))
    desk.type("# mine\n")
    folder = tmp_path / "pieces"
    folder.mkdir()
    desk.session.save_as(str(folder / "tide"))
    desk.settle()
    desk.qtbot.waitUntil(lambda: (folder / "estuary.rig.toml").exists(), timeout=20_000)
    desk.settle()
    assert (folder / "tide.score").read_text() == desk.pane.text
    assert desk.session.name == "tide.score"


def test_a_text_without_a_name_is_offered_at_the_next_start(make):
    first = make()
    first.session.new()
    first.type("# mine\n")
    first.end()
    second = make()
    second.session.open_demo()
    (name,) = [name for name in second.notices.said if name.startswith("recovered")]
    second.notices.choose(name, "Throw it away")
    assert disk.left_behind() == []


def test_a_text_taken_up_twice_still_starts_its_paths_where_it_did(make, tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    first = make()
    first.session.new()
    first.type("# mine\n")
    base = first.session.base
    first.end()
    for _ in range(2):
        desk = make()
        desk.session.open_demo()
        (name,) = [name for name in desk.notices.said if name.startswith("recovered")]
        desk.notices.choose(name, "Take it up")
        desk.settle()
        assert desk.session.base == base == str(tmp_path / "untitled.score")
        desk.end()


def test_line_ends_of_another_system_are_kept(make, tmp_path):
    path = tmp_path / "a.score"
    path.write_bytes(b'title "One"\r\ntempo 60\r\n')
    desk = make()
    desk.session.open(str(path))
    desk.type("pin 1:1\n")
    desk.session.save()
    desk.settle()
    assert path.read_bytes() == b'title "One"\r\ntempo 60\r\npin 1:1\r\n'
