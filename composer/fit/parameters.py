"""What can be fitted of a modelled make, declared once: scale, starts, and how well is well enough."""

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Parameter:
    """A key of a fiber type that bench data may tell.

    unit: for people, "" for none; low, high: what is looked through, within the range of the rig file's key
    scale: a typical size, which the solver steps by; starts: where it begins to look
    share, floor: told where its interval reaches no further than this share of the value, or than this, to either side
    """

    key: str
    unit: str
    low: float
    high: float
    scale: float
    starts: tuple[float, ...]
    share: float
    floor: float

    def told(self, value: float, half: float) -> bool:
        """Whether an interval of so much to either side tells this parameter."""
        return half <= max(self.share * abs(value), self.floor)


MODULUS = Parameter("shear_modulus_kPa", "kPa", 0.05, 1e5, 100.0, (40.0, 120.0, 300.0, 700.0, 2000.0), 0.25, 0.0)
ANGLE = Parameter("braid_angle_deg", "°", 5.0, 54.0, 10.0, (16.0, 22.0, 30.0), 0.0, 2.0)
ENDS = Parameter("end_factor", "", 1.0, 2.0, 0.5, (1.02, 1.25), 0.0, 0.1)
SLEEVE = Parameter("sleeve_limit", "", 1e-3, 10.0, 1.0, (1.0,), 0.05, 0.0)
FRICTION = Parameter("friction_fraction", "", 0.0, 0.5, 0.05, (0.03,), 0.25, 0.01)
SETTLE = Parameter("settle_ms", "ms", 0.0, 5000.0, 20.0, (20.0,), 0.25, 5.0)

OF_MAKE: dict[str, tuple[Parameter, ...]] = {
    "contractile": (MODULUS, ANGLE, ENDS, FRICTION, SETTLE),
    "extensile": (MODULUS, SLEEVE, FRICTION, SETTLE),
}
"""What is fitted of each make, in the order of its report."""
