from composer.rig.fibers import good_name
from composer.rig.reading import read_rig
from composer.rig.schema import LONGEST_NAME, MOST_FIBERS


def test_names_are_those_that_a_score_can_write():
    for name in ("a", "reed.1", "föhre-2_b", "R.", "a" * LONGEST_NAME):
        assert good_name(name), name
    for name in ("", "1a", ".a", "-a", "_a", "a b", "a*", "a,b", "a\n", "a#", "a" * (LONGEST_NAME + 1)):
        assert not good_name(name), name


def test_the_middle_fiber_of_an_odd_row_is_its_own_mirror(small):
    rig = read_rig(small.replace("count = 4", "count = 3"), "f")
    assert [fiber.mirror for fiber in rig.fibers] == [2, 1, 0, None]


def test_a_mirror_said_of_one_holds_for_both(small):
    text = small.replace("mirrored = true\n", "").replace("channel = 4", 'channel = 4\nmirror = "reed.2"')
    assert [fiber.mirror for fiber in read_rig(text, "f").fibers] == [None, 4, None, None, 1]


def test_places_along_a_row_are_as_if_written_singly(small):
    rig = read_rig(small.replace("step_m = [0.1, 0, 0]", "step_m = [0.05, -0.1, 1e-3]\nat_m = [0.1, 0.2, 0]"), "f")
    assert rig.fibers[3].at_m == (0.25, -0.1, 0.003)


def test_the_way_a_fiber_runs_has_length_one_whatever_is_written(small):
    rig = read_rig(small.replace("channel = 4", "channel = 4\ntoward = [3, 0, -4]"), "f")
    assert rig.fibers[4].toward == (0.6, 0.0, -0.8)


def test_two_boards_may_use_the_same_channels(small):
    text = small.replace("[driver.left]", "[driver.right]\nchannels = 4\n\n[driver.left]")
    text = text.replace("count = 4", 'count = 4\ndriver = "right"').replace("channel = 4", 'channel = 0\ndriver = "left"')
    assert [(fiber.driver, fiber.channel) for fiber in read_rig(text, "f").fibers][-2:] == [("right", 3), ("left", 0)]


def test_a_row_beyond_its_board_is_blamed_once(spoil):
    said = spoil(("channels = 8", "channels = 6"), ("count = 4", "count = 8"), ("channel = 4", "channel = 0\nmax_hold_s = 1"))
    assert said.count("but driver 'left' has 6 channels") == 1
    assert said.count("are both on channel 0") == 1


def test_a_row_on_the_channels_of_another_is_told_the_key_to_write_and_where_there_is_room_for_all_of_it(spoil):
    hem = ("[[fibers]]", '[[fibers]]\nname = "hem"\ncount = 3\ntype = "drop"\nmirrored = true\n\n[[fibers]]')
    # The other row has 0 to 2, the single fiber 4: four in a row have room behind both, where the board has so many.
    said = spoil(("channels = 8", "channels = 9"), hem)
    assert "reed.1 and hem.1 (line 26) are both on channel 0" in said
    assert said.endswith("the first room for 4 is from 5 on: write first_channel = 5; without it a row begins at 0")
    assert "write first_channel" not in spoil(hem)


def test_as_many_fibers_as_a_rig_may_have_are_read_and_one_more_is_refused(small, spoil):
    text = small.replace("channels = 8", "channels = 4096").replace("count = 4", f"count = {MOST_FIBERS - 1}")
    assert len(read_rig(text.replace("channel = 4", "channel = 4095"), "f").fibers) == MOST_FIBERS
    assert "more than 4096 fibers; expected at most 4096 in a rig" in spoil(
        ("channels = 8", "channels = 4096"), ("count = 4", f"count = {MOST_FIBERS}")
    )


def test_a_worn_rig_with_its_holds_and_pressures_is_read(small):
    text = small.replace('name = "Bench"', 'name = "Bench"\nworn = true').replace(
        "air_mL = 3", "air_mL = 3\nmax_pressure_kPa = 250"
    )
    text = text.replace("count = 4", "count = 4\nmax_hold_s = 5").replace("channel = 4", "channel = 4\nmax_hold_s = 6")
    rig = read_rig(text, "f")
    assert rig.worn
    assert [fiber.max_hold_s for fiber in rig.fibers] == [5.0, 5.0, 5.0, 5.0, 6.0]


def test_a_hold_without_limit_will_not_do_on_a_body(spoil):
    said = spoil(
        ('name = "Bench"', 'name = "Bench"\nworn = true'),
        ("air_mL = 3", "air_mL = 3\nmax_pressure_kPa = 250"),
        ("count = 4", "count = 4\nmax_hold_s = 0"),
        ("channel = 4", "channel = 4\nmax_hold_s = 6"),
    )
    assert said.startswith("bench.rig.toml:31:14: the row 'reed' is worn and its max_hold_s is 0, which is no limit; expected")
    assert said.count("bench.rig.toml:") == 1
