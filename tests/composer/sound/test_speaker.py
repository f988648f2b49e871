"""The way to the machine's audio, with programs that stand in for it."""

import os
import stat

import pytest

from composer.sound import speaker
from composer.sound.speaker import Speaker, tool


@pytest.fixture
def path(tmp_path, monkeypatch):
    """A PATH that holds nothing but what the test puts there."""
    monkeypatch.setenv("PATH", str(tmp_path))
    return tmp_path


def put(folder, name, text):
    script = folder / name
    script.write_text(text)
    script.chmod(script.stat().st_mode | stat.S_IXUSR)


def test_without_a_program_for_sound_nothing_happens_and_nothing_is_raised(path):
    assert tool() is None
    silent = Speaker()
    assert not silent.start()
    assert not silent.write(b"\0\0")
    silent.stop()


def test_what_is_written_reaches_the_program(path):
    put(path, "aplay", f'#!/bin/sh\nexec /bin/cat > "{path}/heard"\n')
    sound = Speaker()
    assert sound.start()
    assert sound.write(b"abcd" * 100)
    sound._playing.stdin.close()
    sound._playing.wait(timeout=20)
    assert (path / "heard").read_bytes() == b"abcd" * 100
    sound.stop()


def test_the_first_program_of_the_table_that_is_there_is_taken(path):
    put(path, "aplay", "#!/bin/sh\n")
    assert tool()[0] == "aplay"
    put(path, "paplay", "#!/bin/sh\n")
    assert tool()[0] == "paplay"


def test_a_program_that_ends_at_once_silences_without_complaint(path):
    put(path, "paplay", "#!/bin/sh\nexit 1\n")
    sound = Speaker()
    assert sound.start()
    sound._playing.wait(timeout=20)
    assert not sound.open
    assert not sound.write(b"\0" * 1000)
    assert not sound.open


def test_a_program_that_takes_nothing_never_keeps_the_window_waiting(path):
    put(path, "paplay", "#!/bin/sh\nexec /bin/sleep 60\n")
    sound = Speaker()
    assert sound.start()
    wrote = [sound.write(b"\0" * 65536) for _ in range(4)]
    assert wrote[0]
    assert not wrote[-1]


def test_silence_ends_the_program(path):
    put(path, "paplay", "#!/bin/sh\nexec /bin/sleep 60\n")
    sound = Speaker()
    sound.start()
    number = sound._playing.pid
    sound.stop()
    with pytest.raises(ProcessLookupError):
        os.kill(number, 0)


def test_every_program_is_told_the_same_rate():
    assert all(any("44100" in word for word in row) for row in speaker.TOOLS)
