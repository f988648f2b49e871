"""The table of limits: a new limit is one file beside this one and one row here."""

from composer.limits import accel, air, duty, hold, rate, stroke, switching
from composer.limits.limit import Limit

LIMITS: tuple[Limit, ...] = (
    stroke.LIMIT,
    rate.LIMIT,
    accel.LIMIT,
    switching.LIMIT,
    duty.LIMIT,
    hold.LIMIT,
    air.LIMIT,
)
"""Every limit that checker, retimer and governor know."""
