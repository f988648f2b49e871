"""Bands of threads."""

from dataclasses import replace

from composer.picture.bands import bands_of


def named(rig, names, groups):
    fibers = tuple(replace(fiber, name=name) for fiber, name in zip(rig.fibers, names, strict=True))
    return replace(rig, fibers=fibers, groups=groups)


def said(rig):
    return [(band.name, band.first, band.last) for band in bands_of(rig)]


def test_a_new_stem_begins_a_new_band(make_rig):
    rig = named(make_rig(4), ["a.1", "a.2", "b.1", "b.2"], {})
    assert said(rig) == [("a", 0, 2), ("b", 2, 4)]


def test_a_group_that_is_one_run_cuts_the_row_and_names_its_band(make_rig):
    rig = named(make_rig(5), [f"a.{n}" for n in range(5)], {"left": (0, 1), "all": (0, 1, 2, 3, 4)})
    assert said(rig) == [("left", 0, 2), ("a", 2, 5)]


def test_a_group_picked_here_and_there_cuts_nothing(make_rig):
    rig = named(make_rig(5), [f"a.{n}" for n in range(5)], {"odd": (0, 2, 4)})
    assert said(rig) == [("a", 0, 5)]


def test_a_name_without_a_number_is_its_own_stem(make_rig):
    assert said(named(make_rig(2), ["hem", "tail"], {})) == [("hem", 0, 1), ("tail", 1, 2)]
