"""What is known of a fiber beside its bench."""

import pytest

from composer.faults import Faults
from composer.fit.known import known_of
from composer.fit.reading import read_bench
from composer.rig.reading import read_rig

RIG = """
[rig]
name = "R"
[supply]
pressure_kPa = 400
receiver_L = 10
max_receiver_kPa = 800
compressor_L_min = 40
[fiber_type.fold]
kind = "bending"
base = "extensile"
rest_length_mm = 220
outer_diameter_mm = 6
wall_mm = 1
shear_modulus_kPa = 150
sleeve_limit = 0.9
max_pressure_kPa = 200
constraint_length_mm = 60
[valve_type.mini]
C_dm3_s_bar = 0.1
[[fiber]]
name = "f"
type = "fold"
channel = 0
"""
DIMENSIONS = "# rest_length_mm = 400\n# outer_diameter_mm = 3\n# wall_mm = 0.5\n"


def bench(head="", force=False):
    rows = "".join(f"{n / 10},{4 * n},{n / 500}" + (",1" if force else "") + "\n" for n in range(80))
    return read_bench(head + "time_s,pressure_kPa,strain" + (",force_N" if force else "") + "\n" + rows, "b.csv")


def refused(*args):
    with pytest.raises(Faults) as wrong:
        known_of(*args)
    return str(wrong.value)


def test_a_rig_gives_kind_dimensions_and_first_guesses():
    known = known_of(bench(), "fold", read_rig(RIG, "r"), 0.0)
    assert (known.kind, known.base) == ("bending", "extensile")
    assert known.values["constraint_length_mm"] == 60.0 and known.values["max_pressure_kPa"] == 200.0
    assert known.starts["shear_modulus_kPa"] == 150.0 and "shear_modulus_kPa" not in known.values


def test_the_head_counts_more_than_the_rig():
    known = known_of(bench("# wall_mm = 0.8\n# shear_modulus_kPa = 99\n"), "fold", read_rig(RIG, "r"), None)
    assert known.values["wall_mm"] == 0.8 and known.values["shear_modulus_kPa"] == 99.0
    assert "shear_modulus_kPa" not in [each.key for each in known.parameters]


def test_a_kind_for_a_name_will_do():
    assert known_of(bench(DIMENSIONS), "contractile", None, None).kind == "contractile"


def test_a_load_on_the_command_line_wins_over_the_head():
    assert known_of(bench(DIMENSIONS + "# load_N = 2\n"), "contractile", None, 3.0).load_N == 3.0
    assert known_of(bench(DIMENSIONS + "# load_N = 2\n"), "contractile", None, None).load_N == 2.0


@pytest.mark.parametrize(
    "head, name, says",
    [
        ("", "cord", "nothing says what kind of fiber 'cord' is"),
        ("", "contractle", "did you mean 'contractile'?"),
        ("", "a b", "cannot be the name"),
        ("", "contractile", "rest_length_mm, outer_diameter_mm, wall_mm"),
        ('# kind = "rated"\n', "drop", "direction, rest_length_mm, air_mL"),
        ('# kind = "bending"\n' + DIMENSIONS, "fold", "nothing says what base"),
        ('# kind = "bending"\n# base = "bend"\n' + DIMENSIONS, "fold", "base is 'bend'"),
        ('# kind = "bending"\n# base = "extensile"\n' + DIMENSIONS, "fold", "known and are not: constraint_length_mm"),
        ('# kind = "elastic"\n', "x", "no kind of fiber 'elastic'"),
        (DIMENSIONS + "# sleeve_limit = 1\n", "contractile", "has no sleeve_limit"),
        (DIMENSIONS.replace("0.5", "1.5"), "contractile", "leaves no bore"),
        (DIMENSIONS.replace("0.5", "-1"), "contractile", "wall_mm is -1"),
        (DIMENSIONS.replace("0.5", "true"), "contractile", "wall_mm is True"),
        (DIMENSIONS.replace("0.5", "[1]"), "contractile", "wall_mm is [1]"),
    ],
)
def test_what_is_wrong_or_missing_is_told(head, name, says):
    assert says in refused(bench(head), name, None, None)


def test_a_name_that_the_rig_does_not_have_is_told_with_the_nearest():
    assert "did you mean 'fold'?" in refused(bench(), "folt", read_rig(RIG, "r"), None)


def test_two_kinds_and_two_loads_are_refused():
    assert "one kind" in refused(bench('# kind = "rated"\n'), "fold", read_rig(RIG, "r"), None)
    assert "one of the two" in refused(bench(DIMENSIONS, force=True), "contractile", None, 1.0)
