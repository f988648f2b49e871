import numpy as np
import pytest

from composer.fiber.modelled import capability
from composer.limits.abilities import abilities_of
from composer.picture import palette
from composer.picture.plots.makes import FOOT, HEAD, MOST_ROWS, ROW, foot_note, loop, paint, sheet_of
from composer.picture.png import drawn
from composer.rig.reading import read_rig

from ...fiber.makes import CORD, EACH, mounted
from ...fiber.rigs import rig_of


def pixels_of(picture):
    picture = picture.convertToFormat(picture.Format.Format_RGB888)
    data = np.frombuffer(picture.constBits(), np.uint8).reshape(picture.height(), picture.bytesPerLine())
    # A copy, as the picture may be gone before its pixels are looked at.
    return data[:, : 3 * picture.width()].reshape(picture.height(), picture.width(), 3).copy()


def has(pixels, colour):
    return bool(np.any(np.all(pixels == np.array(colour, np.uint8), axis=-1)))


@pytest.mark.parametrize("kind", EACH)
def test_a_loop_rises_and_comes_back_above_its_rise(kind):
    able = capability(EACH[kind], mounted(load_N=0.5))
    pressure, way_in, way_out = loop(able.physics)
    assert pressure[-1] == able.physics.full
    assert way_in[-1] == way_out[-1] == pytest.approx(able.stroke, rel=1e-3)
    assert np.all(np.diff(way_in) >= 0.0)
    assert np.all(np.diff(way_out) >= 0.0)
    assert np.all(way_out >= way_in - 1e-9)
    assert np.any(way_out > 1.01 * way_in + 1e-6)


def test_every_make_has_a_row_with_both_ways_in_it():
    rig = read_rig(rig_of("contractile", CORD, count=3), "f")
    sheet = sheet_of(rig, abilities_of(rig))
    assert sheet.height == HEAD + ROW + FOOT
    assert sheet.rows[0].fibers == "3 fibers, reed.1 to reed.3"
    pixels = pixels_of(drawn(lambda painter: paint(painter, sheet), sheet.width, sheet.height))
    left, right = pixels[:, : sheet.width // 2], pixels[:, sheet.width // 2 :]
    for half in (left, right):
        assert has(half, palette.DUTY)
        assert has(half, palette.SUPPLY)


def test_a_rated_make_has_rates_and_no_pressure(make_rig):
    rig = make_rig(2)
    sheet = sheet_of(rig, abilities_of(rig))
    pixels = pixels_of(drawn(lambda painter: paint(painter, sheet), sheet.width, sheet.height))
    assert has(pixels[:, sheet.width // 2 :], palette.DUTY)
    assert not has(pixels[:, : sheet.width // 2], palette.DUTY)


def test_dashed_lines_are_explained_only_where_there_are_some(make_rig):
    rated, modelled = make_rig(2), read_rig(rig_of("contractile", CORD, count=3), "f")
    assert foot_note(sheet_of(rated, abilities_of(rated))) == ""
    assert foot_note(sheet_of(modelled, abilities_of(modelled))).startswith("Dashed: ")


def test_more_makes_than_there_is_room_for_are_counted():
    head, _, row = rig_of("contractile", CORD).partition("[[fibers]]")
    rows = [
        ("[[fibers]]" + row).replace('"reed"', f'"r{n}"').replace("load_N = 1.5", f"load_N = {1 + n}\nfirst_channel = {n}")
        for n in range(MOST_ROWS + 3)
    ]
    rig = read_rig(head + "\n".join(rows), "f")
    sheet = sheet_of(rig, abilities_of(rig))
    assert len(sheet.rows) == MOST_ROWS
    assert sheet.left_out == 3
