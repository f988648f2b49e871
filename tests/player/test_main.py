"""The command line as a whole."""

import subprocess
import sys

import pytest

from player.commands.main import COMMANDS, HELP, run


def test_every_command_of_the_table_can_be_imported_and_has_help(capsys):
    for name in COMMANDS:
        assert run([name, "--help"]) == 0
        assert f"drawcord {name}" in capsys.readouterr().out


@pytest.mark.parametrize("arguments", [[], *([word] for word in HELP)])
def test_help_lists_every_command_and_ends_with_zero(capsys, arguments):
    assert run(arguments) == 0
    out = capsys.readouterr().out
    assert all(name in out for name in COMMANDS)


def test_the_version_is_that_of_the_package_in_a_line_of_its_own(capsys):
    from importlib.metadata import version

    assert run(["--version"]) == 0
    assert capsys.readouterr().out.splitlines()[0] == f"drawcord {version('drawcord')}"


def test_with_the_version_comes_what_a_report_of_a_fault_should_tell(capsys):
    import platform
    from importlib.metadata import version

    assert run(["--version"]) == 0
    said = capsys.readouterr().out
    assert f"CPython {platform.python_version()}, " in said and platform.machine() in said
    packages = (("numpy", "numpy"), ("scipy", "scipy"), ("HiGHS", "highspy"), ("Qt", "PySide6-Essentials"))
    assert all(f"{name} {version(package)}" in said for name, package in packages)
    assert len(said.splitlines()) <= 5 and max(map(len, said.splitlines())) <= 120


@pytest.mark.parametrize("option", ["--help", "--version"])
def test_help_and_version_need_neither_click_nor_numpy_nor_qt(option):
    script = (
        f"import sys; from player.commands.main import run; run(['{option}']); "
        "print(sorted({'click', 'numpy', 'scipy', 'highspy', 'PySide6'} & set(sys.modules)))"
    )
    out = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, check=True).stdout
    assert out.endswith("[]\n")


@pytest.mark.parametrize(
    ("arguments", "says"),
    [
        (["plya"], "did you mean 'play'?"),
        (["juggle"], "the commands are: check"),
        (["--loud"], "--loud"),
        (["play"], "Missing argument"),
        (["play", "--loud"], "--loud"),
    ],
)
def test_a_wrong_call_ends_with_two_and_says_what_is_wrong(capsys, arguments, says):
    assert run(arguments) == 2
    found = capsys.readouterr()
    assert says in found.err and "Traceback" not in found.err and found.out == ""


def test_a_fault_of_its_own_is_one_sentence_with_its_place(capsys, monkeypatch):
    monkeypatch.delenv("DRAWCORD_TRACEBACK", raising=False)
    monkeypatch.setitem(COMMANDS, "ports", ("player.commands.nowhere", ""))
    assert run(["ports", "x"]) == 2
    err = capsys.readouterr().err
    assert err.startswith("drawcord met a fault of its own: ModuleNotFoundError") and "Traceback" not in err


def test_where_nobody_reads_what_it_prints_it_ends_in_silence():
    script = f"{sys.executable} -c 'from player.commands.main import main; main()' --help | true"
    found = subprocess.run(script, shell=True, capture_output=True, text=True, check=False)
    assert found.stderr == ""
