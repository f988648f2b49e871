"""README and the manual: every command in them is run, every link leads somewhere."""

import os
import re
import shutil
import signal
import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).parent.parent
PAGES = [ROOT / "README.md", ROOT / "DEVELOPERS.md", *sorted(ROOT.glob("*/manual/*.md"))]
DRAWCORD = [sys.executable, "-m", "player.commands.main"]

ENDLESS = {"play", "device", "live", "rehearse"}
"""Commands that go on until they are told to stop."""

STOPPED_BEFORE_IT_BEGAN = 130
"""Exit code of a command that was told to stop while it still made ready; a busy machine wants more patience."""


def blocks_of(text):
    """The lines of fenced and indented blocks."""
    fenced = False
    for line in text.splitlines():
        if line.startswith("```"):
            fenced = not fenced
        elif fenced or line.startswith("    "):
            yield line.strip()


def commands():
    """Every command line of the documents that names no placeholder, once, with the page it stands in first."""
    seen = set()
    for page in PAGES:
        for line in blocks_of(page.read_text()):
            line = line.split("  #")[0].split(" && ")[-1].strip()
            line = re.sub(r"^(\$ )?(\.venv/bin/)?drawcord ", "drawcord ", line)
            if line.startswith("drawcord ") and line not in seen and not re.search(r"\b[A-Z]{3,}\b|\[|…", line):
                seen.add(line)
                yield pytest.param(line, id=f"{page.stem}: {line[9:]}")


@pytest.fixture(scope="module")
def made(tmp_path_factory):
    """A folder with the demos in it, as `drawcord demos .` leaves them, and with the play files made of them."""
    made = tmp_path_factory.mktemp("demos")
    shutil.copytree(ROOT / "scores_demo", made, dirs_exist_ok=True)
    for name in ("estuary", "gannet"):
        subprocess.run([*DRAWCORD, "retime", f"{name}.score", "-o", f"{name}.play"], cwd=made, check=True, capture_output=True)
    subprocess.run([*DRAWCORD, "tempo", "estuary.score", "-o", "song.mid"], cwd=made, check=True, capture_output=True)
    return made


@pytest.fixture
def folder(made, tmp_path):
    """The same with the demos in the folders too that the documents name; for each command its own."""
    for place in (tmp_path, tmp_path / "scores_demo", tmp_path / "pieces"):
        shutil.copytree(made, place, dirs_exist_ok=True)
    return tmp_path


def start(arguments, folder):
    return subprocess.Popen(
        [*DRAWCORD, *arguments],
        cwd=folder,
        text=True,
        stdin=subprocess.DEVNULL,
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        env={**os.environ, "PYTHONUNBUFFERED": "1", "DISPLAY": ""},
    )


def boards(line, folder):
    """Simulated boards for the serial lines that a command names, and the command with their ports in their place."""
    started, rig = [], "gannet.rig.toml" if "gannet" in line else "estuary.rig.toml"
    for target in re.findall(r"(\w+=)?serial:(/dev/\S+?)(@\d+)?(?=\s|$)", line):
        driver = ["--driver", target[0].rstrip("=")] if target[0] else []
        board = start(["device", rig, *driver], folder)
        started.append(board)
        line = line.replace(f"serial:{target[1]}", f"serial:{board.stdout.readline().strip()}", 1)
    return started, line


def ended(arguments, folder, boards_too):
    """A command's exit code and what it said; one without an end is told to stop once it has had time to begin."""
    for patience_s in (4, 12, 40) if arguments[0] in ENDLESS else (100,):
        run = start(arguments, folder)
        try:
            out, err = run.communicate(timeout=patience_s)
        except subprocess.TimeoutExpired:
            run.send_signal(signal.SIGINT)
            out, err = run.communicate(timeout=40)
        finally:
            run.kill()
        if run.returncode != STOPPED_BEFORE_IT_BEGAN:
            break
    for board in boards_too:
        board.kill()
        board.communicate()
    return run.returncode, out, err


@pytest.mark.parametrize("line", list(commands()))
def test_each_command_in_the_documents_does_what_it_says(line, folder):
    if line.startswith("drawcord demos "):
        shutil.rmtree(folder / line.split()[-1])  # it makes the folder itself
    started, line = boards(line, folder)
    arguments = line.split()[1:]
    if started and "--arm" not in arguments:
        arguments.append("--arm")  # at a terminal it asks
    code, out, err = ended(arguments, folder, started)
    if arguments[0] == "preview" and not any(word.startswith("--") for word in arguments):
        assert code == 2
        assert "no screen here for a window" in err
        return
    # The demos hold snags on purpose, so checking them ends with 1.
    assert code == (1 if arguments[0] == "check" else 0), f"{out}\n{err}"
    assert "Traceback" not in err
    assert "fault of its own" not in err


def test_the_test_command_of_the_readme_is_what_ci_runs():
    assert "\ntests/run\n" in (ROOT / "README.md").read_text()
    assert os.access(ROOT / "tests" / "run", os.X_OK)
    assert "tests/run" in (ROOT / ".ci" / "run").read_text()


@pytest.mark.parametrize("page", PAGES, ids=lambda page: page.name)
def test_every_link_and_picture_of_a_page_is_there(page):
    for target in re.findall(r"\]\(([^)#:]+)(?:#[^)]*)?\)", page.read_text()):
        assert (page.parent / target).exists(), f"{page.name} points to {target}"
