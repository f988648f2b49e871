"""Shells complete the commands: asked by the variables that their scripts set, and once through a shell itself."""

import os
import subprocess
import sys

import pytest

from player.commands.completion import SHELLS
from player.commands.main import COMMANDS, run

DRAWCORD = [sys.executable, "-m", "player.commands.main"]


def completed(shell, *words):
    """What the words of a command line, the last of them unfinished, may become, as that shell is told."""
    given = {"COMP_WORDS": " ".join(words), "COMP_CWORD": str(len(words) - 1)}
    if shell == "fish":
        given["COMP_CWORD"] = words[-1]
    asked = {**os.environ, "_DRAWCORD_COMPLETE": f"{shell}_complete", **given}
    return subprocess.run(DRAWCORD, env=asked, capture_output=True, text=True, check=True).stdout


@pytest.mark.parametrize("shell", SHELLS)
def test_the_script_names_the_command_and_the_variable_that_it_asks_by(shell, capsys):
    assert run(["completion", shell]) == 0
    script = capsys.readouterr().out
    assert f"_DRAWCORD_COMPLETE={shell}_complete" in script and "%(" not in script


def test_a_shell_that_is_not_known_is_refused_with_those_that_are(capsys):
    assert run(["completion", "sh"]) == 2
    err = capsys.readouterr().err
    assert all(shell in err for shell in SHELLS)


@pytest.mark.parametrize("shell", SHELLS)
def test_the_beginning_of_a_command_becomes_all_that_begin_so(shell):
    said = completed(shell, "drawcord", "pre")
    assert "preview" in said and "preflight" in said and "play" not in said.split("Play")[0]


def test_names_of_commands_are_told_from_the_table_without_importing_any():
    script = (
        "import sys; from click.shell_completion import BashComplete; from player.commands.gathered import drawcord; "
        "found = BashComplete(drawcord, {}, 'drawcord', '').get_completions([], ''); "
        "print([one.value for one in found]); "
        "from player.commands.main import COMMANDS; "
        "print([m for m, _ in COMMANDS.values() if m in sys.modules], 'numpy' in sys.modules)"
    )
    out = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, check=True).stdout
    assert out.splitlines() == [str(list(COMMANDS)), "[] False"]


def test_options_files_and_pages_are_completed_behind_their_command():
    assert completed("bash", "drawcord", "play", "--ret") == "plain,--retime\n"
    assert completed("bash", "drawcord", "play", "estu") == "file,estu\n"
    assert completed("bash", "drawcord", "manual", "langu") == "plain,language\n"
    assert completed("bash", "drawcord", "completion", "z") == "plain,zsh\n"


def test_behind_a_word_that_is_no_command_there_are_the_options_of_all_and_no_complaint():
    assert sorted(completed("bash", "drawcord", "juggle", "--").split()) == ["plain,--help", "plain,--version"]


def test_bash_itself_completes_with_the_script(tmp_path):
    program = tmp_path / "drawcord"
    program.write_text(f'#!/bin/sh\nexec "{sys.executable}" -m player.commands.main "$@"\n')
    program.chmod(0o755)
    script = (
        'eval "$(drawcord completion bash)"; complete -p drawcord; '
        'COMP_WORDS=(drawcord pref); COMP_CWORD=1; _drawcord_completion drawcord pref; echo "${COMPREPLY[@]}"'
    )
    path = {**os.environ, "PATH": f"{tmp_path}{os.pathsep}{os.environ['PATH']}"}
    out = subprocess.run(["bash", "--norc", "-c", script], env=path, capture_output=True, text=True, check=True).stdout
    assert "_drawcord_completion" in out and out.endswith("preflight\n")
