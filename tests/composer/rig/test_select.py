import pytest
from hypothesis import given
from hypothesis import strategies as st

from composer.rig.select import Circle, Selector, UnknownName

NAMES = [*(f"reed.{n}" for n in range(1, 13)), "tip", "bell.01", "bell.02", "bell-1", "bell-2", "bell.1-2"]


def select(name, groups=None):
    return [NAMES[index] for index in Selector(NAMES, groups or {}).resolve(name)]


def hint(name, groups=None):
    with pytest.raises(UnknownName) as caught:
        Selector(NAMES, groups or {}).resolve(name)
    return caught.value.name, caught.value.hint


def test_a_fiber_s_name_means_that_fiber():
    assert select("tip") == ["tip"]


def test_a_rig_s_groups_are_known(make_rig):
    assert Selector(make_rig(3), {}).resolve("all") == (0, 1, 2)


def test_a_range_has_both_its_ends_and_counts_numbers_not_letters():
    assert select("reed.9-11") == ["reed.9", "reed.10", "reed.11"]
    assert select("reed.2-2") == ["reed.2"]


def test_a_range_with_leading_zeros_keeps_their_digits():
    assert select("bell.01-02") == ["bell.01", "bell.02"]


def test_a_fiber_or_group_of_that_very_name_comes_before_a_range():
    assert select("bell.1-2") == ["bell.1-2"]
    assert select("reed.1-2", {"reed.1-2": ("tip",)}) == ["tip"]


def test_a_hyphen_in_a_name_is_no_range_by_itself():
    assert select("bell-1-2") == ["bell-1", "bell-2"]
    assert select("bell-2") == ["bell-2"]


def test_a_star_stands_for_any_characters_or_none():
    assert select("bell*") == ["bell.01", "bell.02", "bell-1", "bell-2", "bell.1-2"]
    assert select("*.1") == ["reed.1"]
    assert select("*e*.1*2*") == ["reed.12", "bell.1-2"]
    assert select("tip*") == ["tip"]
    assert select("*") == NAMES


@given(st.text("ab.*", max_size=8), st.lists(st.text("ab.", min_size=1, max_size=6), unique=True, min_size=1))
def test_a_wildcard_finds_what_the_shell_s_matching_finds(pattern, names):
    from fnmatch import fnmatchcase

    wanted = tuple(index for index, name in enumerate(names) if fnmatchcase(name, pattern))
    if "*" not in pattern:
        return
    if wanted:
        assert Selector(names, {}).resolve(pattern) == wanted
    else:
        with pytest.raises(UnknownName):
            Selector(names, {}).resolve(pattern)


def test_a_group_of_groups_comes_in_rig_order_and_each_fiber_once():
    groups = {"high": ("reed.12", "reed.10-11"), "some": ("tip", "high", "reed.*", "high")}
    assert select("some", groups) == [*NAMES[:12], "tip"]


def test_a_name_is_worked_out_the_same_the_second_time():
    selector = Selector(NAMES, {"a": ("b", "tip"), "b": ("reed.1-3",)})
    assert selector.resolve("a") == selector.resolve("a") == (0, 1, 2, 12)
    assert selector.resolve("b") == (0, 1, 2)


@pytest.mark.parametrize(
    ("name", "said"),
    [
        ("red.3", "did you mean 'reed.3'?"),
        ("zzz", ""),
        ("reed", "did you mean 'reed.*'?"),
        ("reeds", "did you mean 'reed.*'?"),
        ("tpi", "did you mean 'tip'?"),
        ("reed.9-14", "no fiber is called 'reed.13'; there are reed.1 to reed.12"),
        ("reed.0-1", "no fiber is called 'reed.0'; there are reed.1 to reed.12"),
        ("reed.5-2", "a range runs upward: reed.2-5"),
        ("red.1-3", "no fiber is called 'red.1'; did you mean 'reed.'?"),
        ("mop.*", "no fiber's name fits; the fibers are reed.1, reed.2, reed.3, reed.4, reed.5, reed.6, …"),
    ],
)
def test_a_name_that_means_nothing_comes_with_what_to_do(name, said):
    assert hint(name) == (name, said)


def test_a_range_of_a_thousand_million_ends_at_the_first_that_is_not_there():
    assert hint("reed.1-999999999")[1].startswith("no fiber is called 'reed.13'")


def test_a_group_blames_the_member_that_means_nothing():
    assert hint("a", {"a": ("tip", "b"), "b": ("rud.1",)}) == ("rud.1", "did you mean 'reed.1'?")


def test_a_group_s_name_is_offered_too():
    assert hint("hgih", {"high": ("tip",)}) == ("hgih", "did you mean 'high'?")


def test_groups_that_lead_into_one_another_are_told_as_a_circle():
    with pytest.raises(Circle) as caught:
        Selector(NAMES, {"a": ("b",), "b": ("c", "tip"), "c": ("b",)}).resolve("a")
    assert (caught.value.hint, set(caught.value.members)) == ("the group is a member of itself: b -> c -> b", {"b", "c"})


def test_groups_too_deep_within_one_another_are_refused():
    groups = {f"g{n}": (f"g{n + 1}",) for n in range(5000)} | {"g5000": ("tip",)}
    assert hint("g0", groups)[1] == "groups within groups, more than 64 deep"


def test_a_hopeless_wildcard_takes_no_time():
    with pytest.raises(UnknownName):
        Selector(["a" * 64], {}).resolve("*a" * 2000 + "b")


@given(st.text(max_size=12), st.dictionaries(st.text("ab*-1.", max_size=3), st.lists(st.text("ab*-1.", max_size=3)).map(tuple)))
def test_any_name_gets_rising_indices_or_is_unknown(name, groups):
    for asked in (name, *groups):
        try:
            found = Selector(NAMES, groups).resolve(asked)
        except UnknownName:
            continue
        assert list(found) == sorted(set(found))
        assert all(0 <= index < len(NAMES) for index in found)
