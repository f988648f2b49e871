from composer.limits.table import LIMITS
from player.governor import CAUSES
from player.governor.causes import ACCEL, AIR, DUTY, HOLD, NONE, RATE, STROKE, SWITCHING


def test_every_limit_of_the_check_is_a_cause_and_there_is_no_other():
    assert {cause.kind for cause in CAUSES} == {"none", *(limit.kind for limit in LIMITS)}


def test_a_number_finds_its_cause():
    numbers = {"none": NONE, "stroke": STROKE, "rate": RATE, "accel": ACCEL, "switching": SWITCHING}
    numbers |= {"duty": DUTY, "hold": HOLD, "air": AIR}
    assert {cause.kind: number for number, cause in enumerate(CAUSES)} == numbers


def test_what_is_shown_fits_a_narrow_column():
    assert all(len(cause.shown) <= 6 for cause in CAUSES)
