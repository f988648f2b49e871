"""README and the manual: every command in them is run, every link leads somewhere."""

import os
import re
import shutil
import signal
import subprocess
import sys
import tomllib
from itertools import pairwise
from pathlib import Path

import numpy as np
import pytest

from composer.limits.check import check
from composer.load import load_rig, load_score
from player.takes.file import TakeFile

ROOT = Path(__file__).parent.parent
PAGES = [ROOT / "README.md", ROOT / "DEVELOPERS.md", *sorted(ROOT.glob("*/manual/*.md"))]
DRAWCORD = [sys.executable, "-m", "player.commands.main"]

ENDLESS = {"play", "device", "live"}
"""Commands that go on until they are told to stop."""

ARMS = {"play", "live"}

RIGS = {"gannet": "gannet.rig.toml", "first": "veil.rig.toml", "veil": "veil.rig.toml"}
"""The rigs of the boards that a command talks to, by a word in it; that of Estuary for all others."""

MADE = (
    "retime estuary.score -o estuary.play",
    "retime gannet.score --flat solo.score",
    "retime gannet.score -o gannet.play",
    "retime first.score -o first.play",
    "play first.play --to file:first.rec --log first.log --from 8:1",
    "tempo estuary.score -o song.mid",
    "tempo first.score -o first.mid",
)
"""What makes the files that further commands begin with."""

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


def fenced(page):
    """The fenced blocks of a page: what stands behind the fence, as words, and the block's text."""
    found = re.findall(r"^```([^\n]*)\n(.*?)^```$", page.read_text(), re.MULTILINE | re.DOTALL)
    return [(words.split(), text) for words, text in found]


def files():
    """Blocks of the documents that are files, such as ```score first.score: name and text."""
    return [(words[1], text) for page in PAGES for words, text in fenced(page) if len(words) == 2]


def outputs():
    """Blocks of what a command says, behind the block of that command alone: the command and the block's text."""
    for page in PAGES:
        for (_, before), (words, text) in pairwise(fenced(page)):
            if words == ["output"]:
                yield pytest.param(before.strip(), text, id=f"{page.stem}: {before.strip()[9:]}")


def commands():
    """Every command line of the documents that names no placeholder, once, with the page it stands in first."""
    seen = set()
    for page in PAGES:
        for line in blocks_of(page.read_text()):
            line = line.split("  #")[0].split(" && ")[-1].split(" > ")[0].strip()
            line = re.sub(r"^(\$ )?(\.venv/bin/)?drawcord ", "drawcord ", line)
            if line.startswith("drawcord ") and line not in seen and not re.search(r"\b[A-Z]{3,}\b|\[|…", line):
                seen.add(line)
                yield pytest.param(line, id=f"{page.stem}: {line[9:]}")


@pytest.fixture(scope="module")
def made(tmp_path_factory):
    """A folder with the demos, as `drawcord demos .` leaves them, the files of the documents, and what is made of both."""
    made = tmp_path_factory.mktemp("demos")
    shutil.copytree(ROOT / "scores_demo", made, dirs_exist_ok=True)
    for name, text in files():
        (made / name).write_text(text)
    for command in MADE:
        subprocess.run([*DRAWCORD, *command.split()], cwd=made, check=True, capture_output=True)
    played(made / "tonight.take", load_rig(str(made / "estuary.rig.toml")), 0.0)
    solo = load_score(str(made / "solo.score"))
    played(made / "dive.take", solo.rig, next(cue.seconds for cue in solo.cues if cue.name == "dive"))
    return made


def played(path, rig, from_s):
    """A take as somebody leaves it who lifts the first fibers once, slowly, and lets them down again."""
    take = TakeFile(str(path), rig)
    lifts = np.where(np.arange(len(rig.fibers)) < 3, 0.1, 0.0)
    for tick in range(1201):
        strain = lifts * (1.0 - np.cos(np.pi * tick / 600.0)) / 2.0
        take.sample(from_s + tick / 200.0, strain, strain)
    take.close()


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
    started = []
    rig = next((rig for word, rig in RIGS.items() if word in line), "estuary.rig.toml")
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
    if started and arguments[0] in ARMS and "--arm" not in arguments:
        arguments.append("--arm")  # at a terminal it asks
    code, out, err = ended(arguments, folder, started)
    previews = arguments[0] == "preview" and not any(word.startswith("--") for word in arguments)
    if arguments[0] in ("compose", "rehearse") or previews:
        assert code == 2
        assert "no screen here for a window" in err
        return
    # The demos hold snags on purpose, so checking them ends with 1.
    assert code == (1 if arguments[0] == "check" else 0), f"{out}\n{err}"
    assert "Traceback" not in err
    assert "fault of its own" not in err


@pytest.mark.parametrize(("line", "text"), list(outputs()))
def test_what_the_documents_have_a_command_say_it_says(line, text, folder):
    run = start(line.split()[1:], folder)
    out, err = run.communicate(timeout=100)
    assert text in out, f"{out}\n{err}"


@pytest.mark.parametrize(("name", "text"), files())
def test_each_file_in_the_documents_is_read_without_a_fault(name, text, tmp_path):
    for other, its in files():
        (tmp_path / other).write_text(its)
    if name.endswith(".rig.toml"):
        assert load_rig(tmp_path / name).fibers
    else:
        assert load_score(tmp_path / name).tracks.moves


def test_the_first_hour_mends_its_score_by_hand_as_it_says(tmp_path):
    for name, text in files():
        (tmp_path / name).write_text(text)
    score = tmp_path / "first.score"
    mended = score.read_text().replace("  2   rest\n", "  4   rest\n")
    assert mended != score.read_text()
    score.write_text(mended)
    loaded = load_score(score)
    assert check(loaded.tracks, loaded.rig, loaded.abilities).ok


@pytest.mark.parametrize("page", PAGES, ids=lambda page: page.name)
def test_tables_in_a_page_are_toml(page):
    for words, text in fenced(page):
        if words[:1] == ["toml"]:
            assert tomllib.loads(text)


def test_the_score_in_the_readme_is_the_demos_own():
    demo = [line.split("#")[0].split() for line in (ROOT / "scores_demo" / "estuary.score").read_text().splitlines()]
    shown = "".join(text for words, text in fenced(ROOT / "README.md") if words == ["score"])
    assert shown
    for line in shown.splitlines():
        assert line.split("#")[0].split() in demo, line


def test_the_test_command_of_the_readme_is_what_ci_runs():
    assert "\ntests/run\n" in (ROOT / "README.md").read_text()
    assert os.access(ROOT / "tests" / "run", os.X_OK)
    assert "tests/run" in (ROOT / ".ci" / "run").read_text()


@pytest.mark.parametrize("page", PAGES, ids=lambda page: page.name)
def test_every_link_and_picture_of_a_page_is_there(page):
    for target in re.findall(r"\]\(([^)#:]+)(?:#[^)]*)?\)", page.read_text()):
        assert (page.parent / target).exists(), f"{page.name} points to {target}"
