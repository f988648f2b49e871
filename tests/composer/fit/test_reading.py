"""Bench files: what is read, and what is said of each fault, with its place."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from composer.faults import Faults
from composer.fit.reading import read_bench

HEADER = "time_s,pressure_kPa,strain"
ROWS = [f"{n / 10:.1f},{4 * n},{n / 500:.4f}" for n in range(80)]


def text(rows=ROWS, header=HEADER, head=()):
    return "\n".join([*head, header, *rows]) + "\n"


def changed(row, cell):
    return [*ROWS[:row], cell, *ROWS[row + 1 :]]


def refused(of):
    with pytest.raises(Faults) as wrong:
        read_bench(of, "b.csv")
    return wrong.value.faults


def test_columns_stand_in_any_order_with_others_between_and_any_of_three_marks():
    plain = read_bench(text(), "b.csv")
    for mark in ",;\t":
        rows = [mark.join((e, "x", p, t)) for t, p, e in (row.split(",") for row in ROWS)]
        bench = read_bench(text(rows, mark.join(("strain", "room", "pressure_kPa", "time_s"))), "b.csv")
        for name in ("time", "pressure", "strain"):
            np.testing.assert_array_equal(getattr(bench, name), getattr(plain, name))
        assert bench.ignored == ("room",)


def test_pressure_becomes_pascal_and_force_is_read_where_there_is_one():
    bench = read_bench(text([row + ",1.5" for row in ROWS], HEADER + ",force_N"), "b.csv")
    assert bench.pressure[10] == 40_000.0 and bench.force[10] == 1.5
    assert read_bench(text(), "b.csv").force is None


def test_comments_and_empty_lines_count_as_lines_and_not_as_rows():
    rows = [*ROWS[:5], "# a remark", "", *ROWS[5:]]
    bench = read_bench(text(rows), "b.csv")
    assert bench.rows == 80 and bench.line[4:6].tolist() == [6, 9]


def test_the_head_says_what_is_known():
    head = ["# measured = by hand", "# rest_length_mm = 400", '# kind = "extensile"', "# wall_mm = .5", "# just words"]
    said = read_bench(text(head=head), "b.csv").said
    assert {key: one.value for key, one in said.items()} == {"rest_length_mm": 400, "kind": "extensile", "wall_mm": 0.5}
    assert said["kind"].where.line == 3


@pytest.mark.parametrize(
    "rows, line, column, says",
    [
        (changed(40, "4.0,,0.08"), 42, 5, "pressure_kPa is missing"),
        (changed(40, "4.0,160,"), 42, 9, "strain is missing"),
        (changed(40, "4.0,nan,0.08"), 42, 5, "pressure_kPa is 'nan'"),
        (changed(40, "4.0,inf,0.08"), 42, 5, "pressure_kPa is 'inf'"),
        (changed(40, "4.0,1e999,0.08"), 42, 5, "pressure_kPa is '1e999'"),
        (changed(40, "4.0,1_60,0.08"), 42, 5, "pressure_kPa is '1_60'"),
        (changed(40, "4.0, abc,0.08"), 42, 6, "pressure_kPa is 'abc'"),
        (changed(40, "4.0,160"), 42, 0, "2 cells"),
        (changed(40, "4,0,160,0,08"), 42, 0, "5 cells"),
        (changed(40, "3.9,160,0.08"), 42, 1, "time repeats"),
        (changed(40, "0.5,160,0.08"), 42, 1, "time goes back"),
        (ROWS[:40] + [row.replace(".", "9.", 1) for row in ROWS[40:]], 42, 1, "a gap"),
        (changed(40, "4.0,160,30"), 42, 9, "3000 %"),
        (changed(40, "4.0,160,-0.3"), 42, 9, "a strain of -0.3"),
        (changed(40, "4.0,160000,0.08"), 42, 5, "a pressure of 160000 kPa"),
        (changed(40, "4.0,-160,0.08"), 42, 5, "a pressure of -160 kPa"),
        (changed(79, "1e9,160,0.08"), 81, 1, "a time of 1e+09 s"),
        (ROWS[:20], 0, 0, "20 rows"),
        ([f"{n / 10},{n / 100},{n / 500}" for n in range(80)], 0, 0, "pressure changes by 0.79 kPa"),
        ([f"{n / 10},{n},0.1" for n in range(80)], 0, 0, "strain changes by 0"),
    ],
)
def test_a_row_that_cannot_be_is_told_with_its_line_and_column(rows, line, column, says):
    fault = refused(text(rows))[0]
    assert (fault.where.line, fault.where.column) == (line, column)
    assert says in fault.found


@pytest.mark.parametrize(
    "header, says, hint",
    [
        ("time_s,presure_kPa,strain", "no column pressure_kPa", "presure_kPa"),
        ("time_ms,pressure_kPa,strain", "no column time_s", "time_ms"),
        ("time_s,pressure_bar,strain", "no column pressure_kPa", "pressure_bar"),
        ("t,pressure_kPa,strain", "no column time_s", "'t'"),
        ("time_s,pressure_kPa,strain,strain", "the column strain is there twice", ""),
        ("0,1,2", "is data", ""),
    ],
)
def test_a_header_that_lacks_a_column_is_told_with_the_nearest_name(header, says, hint):
    fault = refused(text(header=header))[0]
    assert fault.where.line == 1 and says in fault.found and hint in fault.hint


@pytest.mark.parametrize(
    "line, says",
    [
        ("# rest_lenght_mm = 400", "'rest_lenght_mm' is no key"),
        ("# rest_length_mm = 400 mm", "rest_length_mm is 400 mm"),
        ("# wall_mm = 1\n# wall_mm = 2", "wall_mm is there twice"),
    ],
)
def test_a_head_that_is_wrong_is_told(line, says):
    assert says in refused(text(head=[line]))[0].found


@pytest.mark.parametrize("of", ["", "\n\n", "# only\n# remarks\n"])
def test_a_file_of_nothing_is_told(of):
    assert "no header" in refused(of)[0].found


def test_many_faults_come_at_once_and_no_more_than_twenty():
    assert len(refused(text([",,"] * 100))) == 20


@settings(deadline=None, max_examples=200)
@given(st.text(alphabet="time_s,pressure_kPa,strain0123456789.eE+-#=\n;\t\"'nf ", max_size=400))
def test_any_text_is_read_or_refused(of):
    for whole in (of, text([*ROWS, *of.splitlines()]), text(head=of.splitlines())):
        try:
            assert read_bench(whole, "b.csv").rows >= 50
        except Faults as wrong:
            assert str(wrong)
