import os

import click
import pytest

from composer.commands.outputs import MadeFile


def made(value, *endings):
    return MadeFile(*endings).convert(value, None, None)


@pytest.mark.parametrize("name", ["a.png", "A.PNG", "in/a/folder/a.b.png"])
def test_a_name_of_the_right_ending_is_taken_as_it_is(name):
    assert made(name, ".png") == name


@pytest.mark.parametrize(
    ("name", "found"),
    [
        ("a.pdf", "'a.pdf' ends in '.pdf'"),
        ("png", "'png' has no ending"),
        ("a.png/", "'a.png/' has no ending"),
        ("", "no ending"),
    ],
)
def test_any_other_is_refused_with_the_endings_that_would_do(name, found):
    with pytest.raises(click.BadParameter) as caught:
        made(name, ".mp4", ".gif")
    assert found in caught.value.message
    assert caught.value.message.endswith("expected .mp4 or .gif, which says what is made.")
    assert caught.value.exit_code == 2


def test_a_device_and_a_pipe_may_have_any_name(tmp_path):
    os.mkfifo(tmp_path / "pipe")
    assert made("/dev/stdout", ".csv") == "/dev/stdout"
    assert made(str(tmp_path / "pipe"), ".csv") == str(tmp_path / "pipe")
