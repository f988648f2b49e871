"""Scores held against their rig."""

from dataclasses import replace

import pytest

from composer.rig.select import Selector
from composer.score.names import check_names, groups_of
from composer.score.reading import read_score

PHRASE = "rig bench.rig.toml\nphrase p\n  0 rest\n  2 full\n"


@pytest.fixture
def said(make_rig):
    def told(text: str, rig=None) -> list[str]:
        rig = rig or make_rig(4)
        score = read_score(text, "s.score")
        faults = check_names(score, rig, Selector(rig, groups_of(score)))
        return [f"{f.where.line}:{f.where.column} {f.found}" + (f"; {f.hint}" if f.hint else "") for f in faults]

    return told


@pytest.mark.parametrize("fibers", ["r.1", "r.1, r.4", "all", "r.1-3", "r.*", "*", "mine", "mine, all"])
def test_fibers_by_name_group_range_and_wildcard_are_found(said, fibers):
    assert said(PHRASE + f"group mine = r.2, r.3\nsection s at 1:1\n  {fibers} p\n") == []


def test_an_unknown_name_is_told_with_the_nearest(said):
    assert said(PHRASE + "group reeds.low = r.1\nsection s at 1:1\n  reds.low p\n") == [
        "7:3 no fiber or group 'reds.low' in bench.rig.toml; did you mean 'reeds.low'?"
    ]


def test_each_unknown_name_of_an_entry_is_told(said):
    found = said(PHRASE + "section s at 1:1\n  r.1, zzz, r.7, r.1-9 p\n")
    assert [one.split(";")[0] for one in found] == [
        "6:8 no fiber or group 'zzz' in bench.rig.toml",
        "6:13 no fiber or group 'r.7' in bench.rig.toml",
        "6:18 no fiber or group 'r.1-9' in bench.rig.toml",
    ]


def test_an_unknown_member_is_told_at_the_group_alone(said):
    found = said(PHRASE + "group low = r.1, r.9\nsection s at 1:1\n  low p\n")
    assert [one.split(";")[0] for one in found] == ["5:18 no fiber or group 'r.9' in bench.rig.toml"]


def test_a_group_cannot_take_a_name_of_the_rig(said):
    assert said(PHRASE + "group all = r.1\ngroup r.2 = r.1\n") == [
        "5:7 'all' is a group of the rig already",
        "6:7 'r.2' is a fiber of the rig",
    ]


def test_a_unit_that_the_kind_lacks_is_told_once_at_the_target(said):
    text = "phrase p\n  2 90deg\n  4 5mm quiver 2Hz by 4deg\n  5 12%\nsection s at 1:1\n  r.2 p\n  all p after 8\n"
    assert said(text) == [
        "2:5 r.2, a fiber of kind rated, has no target in deg; it plays 'p' in line 6",
        "3:23 r.2, a fiber of kind rated, has no target in deg; it plays 'p' in line 6",
    ]


def test_a_phrase_that_nobody_plays_may_have_any_unit(said):
    assert said("phrase p\n  2 90deg\n") == []


def test_a_mirror_wants_a_partner(said, make_rig):
    rig = make_rig(4)
    lone = replace(rig, fibers=(*rig.fibers[:2], replace(rig.fibers[2], mirror=None), rig.fibers[3]))
    text = PHRASE + "section s at 1:1\n  all p mirror\n"
    assert said(text) == []
    assert said(text, lone)[0].startswith("6:9 r.3 has no mirror partner in the rig")


def test_moves_are_bounded_over_all_fibers(said):
    text = PHRASE + "section s at 1:1 times 5000 every 8\n  all p times {} every 8\n"
    assert said(text.format(100)) == []
    assert said(text.format(101))[0].startswith("6:3 with this entry the score has more than 4000000 moves")


def test_a_unit_that_the_kind_lacks_is_told_with_those_that_it_has(make_rig):
    rig = make_rig(2)
    score = read_score("phrase p\n  2 90deg\nsection s at 1:1\n  all p\n", "s.score")
    (only,) = check_names(score, rig, Selector(rig, groups_of(score)))
    assert only.expected == "a share of its stroke such as 0.6, or an amount in % or mm"
