"""A check after an edit finds what a check from nothing finds."""

from dataclasses import replace
from pathlib import Path

import pytest

import scores_demo
from composer.editor.rechecking import recheck
from composer.limits.check import check
from composer.load import load_rig, made_from
from composer.score.reading import read_score

DEMOS = Path(scores_demo.__path__[0])


def run(steps):
    """What a generator returns, and how many steps it took."""
    count = 0
    while True:
        try:
            next(steps)
            count += 1
        except StopIteration as end:
            return end.value, count


@pytest.fixture(scope="module")
def rig():
    return load_rig(DEMOS / "estuary.rig.toml")


@pytest.fixture(scope="module")
def text():
    return (DEMOS / "estuary.score").read_text()


def made(text, rig):
    return made_from(read_score(text, "estuary.score"), rig)


EDITS = (
    ("a line put in above", "# ---- phrases", "\n# ---- phrases"),
    ("a faster gather", "reeds       gather  after 24 stretch 2/3", "reeds       gather  after 24 stretch 1/2"),
    ("a wider quiver", "quiver 2Hz by 0.02", "quiver 6Hz by 0.1"),
    ("a deeper phrase", "2      0.6     smooth", "2      0.9     smooth"),
    ("a section that starts later", "section slack at 41:1", "section slack at 42:1"),
)


@pytest.mark.parametrize(("was", "now"), [edit[1:] for edit in EDITS], ids=[edit[0] for edit in EDITS])
def test_after_an_edit_it_finds_what_a_check_from_nothing_finds(text, rig, was, now):
    before = made(text, rig)
    (first, known), _ = run(recheck(before.tracks, rig, before.abilities, None))
    assert first == check(before.tracks, rig, before.abilities)
    assert was in text
    after = made(text.replace(was, now), rig)
    (second, _), _ = run(recheck(after.tracks, rig, after.abilities, known))
    assert second == check(after.tracks, rig, after.abilities)


def test_fibers_that_did_not_change_are_not_checked_again(text, rig):
    before = made(text, rig)
    (_, known), steps = run(recheck(before.tracks, rig, before.abilities, None))
    assert steps > 2
    assert run(recheck(before.tracks, rig, before.abilities, known))[1] == 0
    after = made(text.replace("silt.*      swash   after 6 stretch 1.5", "silt.1      swash   after 6 stretch 1.5"), rig)
    assert 0 < run(recheck(after.tracks, rig, after.abilities, known))[1] < steps


def test_what_is_known_of_another_rig_is_of_no_use(text, rig):
    before = made(text, rig)
    (first, known), steps = run(recheck(before.tracks, rig, before.abilities, None))
    again = run(recheck(before.tracks, replace(rig), before.abilities, known))
    assert again[1] == steps
    assert again[0][0] == first
