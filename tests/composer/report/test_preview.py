"""What a preview tells."""

import numpy as np
import pytest

from composer.report.preview import csv_header, csv_rows
from composer.simulate.run import Block


@pytest.fixture
def block():
    return Block(
        time_s=np.array([0.0, 0.005, 0.01]),
        target=np.array([[0.0, 0.1, 0.2], [0.0, 0.0, 0.0]]),
        strain=np.array([[0.0, 0.05, 0.1], [0.0, 0.0, 0.0]]),
        pressure_kPa=np.array([[np.nan] * 3, [0.0, 1.5, 100.25]]),
        supply_kPa=np.array([800.0, 799.5, 799.0]),
        duty=np.zeros(3),
        drawn_L=0.0,
    )


def test_the_header_names_target_strain_and_pressure_of_each_fiber_and_the_supply():
    assert csv_header(["reed.1", "hem"]) == (
        "time_s,reed.1.target,reed.1.strain,reed.1.pressure_kPa,hem.target,hem.strain,hem.pressure_kPa,supply_kPa"
    )


def test_a_row_has_a_field_for_each_name_and_an_unknown_pressure_is_empty(block):
    rows = list(csv_rows(block, 1.0))
    assert rows[2] == "0.010000,0.2000000,0.1000000,,0.0000000,0.0000000,100.250,799.000"
    assert {row.count(",") for row in rows} == {csv_header(["a", "b"]).count(",")}


def test_rows_end_with_the_score(block):
    assert len(list(csv_rows(block, 0.005))) == 2
