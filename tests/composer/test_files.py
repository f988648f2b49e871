import os
import stat

import pytest

from composer.faults import Faults
from composer.files import check_writable, read_bytes, read_text, replacing, replacing_by_name


def test_text_comes_as_it_was_written(tmp_path):
    (tmp_path / "a.score").write_bytes("föhre\r\nreed\n".encode())
    assert read_text(tmp_path / "a.score", 100) == "föhre\r\nreed\n"


def test_a_byte_order_mark_is_no_part_of_the_text(tmp_path):
    (tmp_path / "a.score").write_bytes(b"\xef\xbb\xbfreed")
    assert read_text(tmp_path / "a.score", 100) == "reed"


def test_a_file_of_just_the_limit_is_read_and_one_byte_more_is_refused(tmp_path):
    (tmp_path / "a").write_bytes(b"x" * 10)
    assert read_bytes(tmp_path / "a", 10) == b"x" * 10
    with pytest.raises(Faults, match="a: the file has more than 9 bytes; expected at most 9 bytes"):
        read_bytes(tmp_path / "a", 9)


def test_a_file_without_end_is_refused_at_once():
    with pytest.raises(Faults, match="/dev/zero: cannot read: this is a device or a pipe; expected an ordinary file"):
        read_bytes("/dev/zero", 10)


def test_a_pipe_is_refused_without_waiting_for_a_writer(tmp_path):
    os.mkfifo(tmp_path / "pipe")
    with pytest.raises(Faults, match="this is a device or a pipe"):
        read_bytes(tmp_path / "pipe", 10)


@pytest.mark.parametrize(
    ("name", "said"),
    [
        ("none.score", "cannot read: there is no such file"),
        (".", "cannot read: this is a folder, not a file"),
        ("file/below", "cannot read: a part of its path is a file, not a folder"),
        ("x" * 300, "cannot read: the name is too long"),
        ("nul\0nul", "cannot read: this is no possible file name"),
        ("loop", "cannot read: its links run in a circle"),
    ],
)
def test_what_cannot_be_read_is_said_in_plain_words(tmp_path, name, said):
    (tmp_path / "file").write_text("x")
    (tmp_path / "loop").symlink_to(tmp_path / "loop")
    with pytest.raises(Faults) as caught:
        read_text(tmp_path / name, 100)
    assert [fault.found for fault in caught.value.faults] == [said]


def test_text_that_is_not_utf8_is_shown_at_its_line_column_and_byte(tmp_path):
    (tmp_path / "a.score").write_bytes(b"\xef\xbb\xbfone\n  f\xf6hre\r\nx")
    with pytest.raises(Faults) as caught:
        read_text(tmp_path / "a.score", 100)
    assert str(caught.value).split("a.score", 1)[1] == (
        ":2:4: byte 0xF6 at offset 10 is not UTF-8; expected UTF-8 text\n"
        "    2 |   f\N{REPLACEMENT CHARACTER}hre\n"
        "      |    ^\n"
        "   save the file again with the encoding UTF-8"
    )


def test_a_binary_file_is_called_one(tmp_path):
    (tmp_path / "a.score").write_bytes(b"\x7fELF\0\0")
    with pytest.raises(Faults, match="a zero byte at offset 4: this is a binary file, not text"):
        read_text(tmp_path / "a.score", 100)


@pytest.mark.parametrize(
    ("start", "command"),
    [(b"PK\x03\x04", "play"), (b"drawcrec", "play"), (b"drawctak", "take"), (b"drawclog", "report"), (b"MThd", "tempo")],
)
def test_a_file_of_the_projects_own_where_text_belongs_is_told_the_command_that_takes_it(tmp_path, start, command):
    (tmp_path / "a.score").write_bytes(start + b"\0\0")
    with pytest.raises(Faults, match=f"not text; expected UTF-8 text\n   'drawcord {command}' "):
        read_text(tmp_path / "a.score", 100)


def test_utf16_is_called_by_its_name(tmp_path):
    (tmp_path / "a.score").write_bytes("reed".encode("utf-16"))
    with pytest.raises(Faults, match="the file is UTF-16 text; expected UTF-8 text"):
        read_text(tmp_path / "a.score", 100)


def test_the_target_changes_only_when_the_block_ends(tmp_path):
    target = tmp_path / "out.csv"
    target.write_text("old")
    with replacing(target) as file:
        file.write("föhre\n")
        file.flush()
        assert target.read_text() == "old"
    assert target.read_bytes() == "föhre\n".encode()
    assert os.listdir(tmp_path) == ["out.csv"]


@pytest.mark.parametrize("error", [RuntimeError, KeyboardInterrupt, OSError])
def test_a_block_that_fails_leaves_the_target_and_nothing_else(tmp_path, error):
    target = tmp_path / "out.csv"
    target.write_text("old")
    with pytest.raises(error), replacing(target, "wb") as file:
        file.write(b"half")
        raise error
    assert target.read_text() == "old"
    assert os.listdir(tmp_path) == ["out.csv"]


def test_a_new_file_has_the_permissions_of_any_new_file_and_a_replaced_one_keeps_its_own(tmp_path):
    was = os.umask(0o027)
    try:
        with replacing(tmp_path / "new") as file:
            file.write("x")
    finally:
        os.umask(was)
    (tmp_path / "old").write_text("y")
    (tmp_path / "old").chmod(0o604)
    with replacing(tmp_path / "old") as file:
        file.write("x")
    assert stat.S_IMODE((tmp_path / "new").stat().st_mode) == 0o640
    assert stat.S_IMODE((tmp_path / "old").stat().st_mode) == 0o604


def test_a_link_stays_a_link_to_the_file_that_is_replaced(tmp_path):
    (tmp_path / "far").mkdir()
    (tmp_path / "far" / "real").write_text("old")
    (tmp_path / "link").symlink_to(tmp_path / "far" / "real")
    with replacing(tmp_path / "link") as file:
        file.write("new")
    assert (tmp_path / "link").is_symlink()
    assert (tmp_path / "far" / "real").read_text() == "new"


def test_a_device_is_written_to_and_stays_a_device():
    with replacing("/dev/null") as file:
        file.write("gone")
    assert stat.S_ISCHR(os.stat("/dev/null").st_mode)


def test_a_full_disk_is_said_in_plain_words():
    with pytest.raises(Faults, match="/dev/full: cannot write: the disk is full"), replacing("/dev/full") as file:
        file.write("x")


@pytest.mark.parametrize(
    ("name", "said"),
    [
        ("none/out.csv", "cannot write: there is no folder '{}/none'"),
        (".", "cannot write: this is a folder, not a file"),
        ("folder/", "cannot write: this is a folder, not a file"),
        ("file/out.csv", "cannot write: a part of its path is a file, not a folder"),
        ("x" * 300, "cannot write: the name is too long"),
        ("nul\0nul", "cannot write: this is no possible file name"),
    ],
)
def test_what_cannot_be_written_is_known_before_work_starts(tmp_path, name, said):
    (tmp_path / "file").write_text("x")
    for attempt in (check_writable, lambda path: replacing(path).__enter__()):
        with pytest.raises(Faults) as caught:
            attempt(f"{tmp_path}/{name}")
        assert [fault.found for fault in caught.value.faults] == [said.format(tmp_path)]


def test_looking_whether_a_file_can_be_written_leaves_nothing(tmp_path):
    check_writable(tmp_path / "out.csv")
    assert os.listdir(tmp_path) == []


def test_a_folder_that_takes_no_files_is_known_before_work_starts():
    with pytest.raises(Faults, match="cannot write: "):
        check_writable("/proc/out.csv")


@pytest.mark.parametrize("name", ["piece.score", "small.rig.toml", "Small.RIG.TOML", "hands.map.toml"])
def test_what_people_write_is_not_lost_to_an_output_of_that_name(tmp_path, name):
    path = tmp_path / name
    path.write_text("# Made by hand\n")
    for made in ("", "# from ", "# Made by hands"):
        with pytest.raises(Faults, match="of this name already, and it would be lost"):
            check_writable(path, made)
    check_writable(path, "# Made by hand")
    check_writable(path, None)
    assert path.read_text() == "# Made by hand\n"


def test_an_empty_score_and_files_of_other_endings_may_be_replaced(tmp_path):
    for name, text in (("piece.score", ""), ("piece.play", "x"), ("reed.toml", "x")):
        (tmp_path / name).write_text(text)
        check_writable(tmp_path / name)


@pytest.mark.parametrize(
    ("start", "said"),
    [(b"PK\x03\x04", "a play file"), (b"drawcrec", "a recording"), (b"drawclog", "the log of a run"), (b"MThd", "a MIDI file")],
)
def test_a_file_of_another_kind_of_ours_is_called_by_its_name(tmp_path, start, said):
    (tmp_path / "a.score").write_bytes(start + b"\0\0")
    with pytest.raises(Faults, match=f"this is {said}"):
        read_text(tmp_path / "a.score", 100)


def test_a_program_is_given_a_name_of_the_same_ending_and_what_it_writes_takes_the_targets_place(tmp_path):
    target = tmp_path / "film.mp4"
    target.write_bytes(b"old")
    target.chmod(0o640)
    with replacing_by_name(target) as name:
        assert name.endswith(".mp4") and target.read_bytes() == b"old"
        with open(name, "wb") as file:
            file.write(b"new")
    assert target.read_bytes() == b"new" and stat.S_IMODE(target.stat().st_mode) == 0o640
    assert list(tmp_path.iterdir()) == [target]


def test_a_program_that_starts_only_after_the_block_was_broken_off_can_leave_nothing(tmp_path):
    with pytest.raises(KeyboardInterrupt), replacing_by_name(tmp_path / "film.mp4") as name:
        with open(name, "wb") as file:
            file.write(b"begun")
        raise KeyboardInterrupt
    assert list(tmp_path.iterdir()) == []
    with pytest.raises(FileNotFoundError), open(name, "wb"):
        pass


def test_a_program_that_writes_nothing_is_a_fault_and_the_target_stays(tmp_path):
    target = tmp_path / "film.mp4"
    target.write_bytes(b"old")
    with pytest.raises(Faults, match=r"film\.mp4: cannot write"), replacing_by_name(target):
        pass
    assert target.read_bytes() == b"old" and list(tmp_path.iterdir()) == [target]


@pytest.mark.parametrize(
    ("made_by", "write"),
    [("open", replacing), ("open", check_writable), ("mkdir", replacing_by_name)],
    ids=["replacing", "check-writable", "replacing-by-name"],
)
def test_an_end_at_the_very_moment_when_the_file_beside_is_made_leaves_nothing(tmp_path, monkeypatch, made_by, write):
    makes = getattr(os, made_by)

    def broken_off(path, *more):
        made = makes(path, *more)
        if made is not None:
            os.close(made)
        assert len(list(tmp_path.iterdir())) == 1
        raise KeyboardInterrupt

    monkeypatch.setattr(os, made_by, broken_off)
    with pytest.raises(KeyboardInterrupt):
        written = write(tmp_path / "film.mp4")
        if written is not None:
            written.__enter__()
    monkeypatch.undo()
    assert list(tmp_path.iterdir()) == []
