"""Makes and mountings for tests of the physics: one of each kind, and hypothesis's own."""

from hypothesis import strategies as st

from composer.fiber.bending import Bending
from composer.fiber.coiling import Coiling
from composer.fiber.contractile import Contractile
from composer.fiber.extensile import Extensile
from composer.fiber.mounting import Mounting, Supply, Valve

CORD = Contractile(
    rest_length_mm=400.0,
    outer_diameter_mm=3.0,
    wall_mm=0.5,
    braid_angle_deg=22.0,
    shear_modulus_kPa=300.0,
    end_factor=1.15,
    friction_fraction=0.04,
    settle_ms=15.0,
    max_pressure_kPa=450.0,
)
PLEAT = Extensile(
    rest_length_mm=100.0,
    outer_diameter_mm=6.0,
    wall_mm=0.8,
    shear_modulus_kPa=100.0,
    sleeve_limit=2.6,
    friction_fraction=0.04,
    settle_ms=20.0,
    max_pressure_kPa=400.0,
)
FOLD = Bending(base=PLEAT, constraint_length_mm=80.0)
TENDRIL = Coiling(base=PLEAT, constraint_length_mm=80.0, constraint_pitch_mm=40.0)
EACH = {"contractile": CORD, "extensile": PLEAT, "bending": FOLD, "coiling": TENDRIL}


def supply(medium="air", pressure_kPa=400.0, min_pressure_kPa=450.0, polytropic=1.2, temperature_C=20.0) -> Supply:
    return Supply(medium, pressure_kPa, min_pressure_kPa, 10.0, 800.0, 40.0, polytropic, 101.325, temperature_C)


def valve(C=0.005, drive="pressure", switch_ms=8.0) -> Valve:
    return Valve("mini", C, 0.3, switch_ms, 50.0, drive, 1.0, 30.0, False)


def mounted(load_N=1.5, bundle=1, series=1, tube_length_mm=800.0, tube_bore_mm=2.0, C=0.005, **of_supply) -> Mounting:
    return Mounting(valve(C), supply(**of_supply), tube_bore_mm, tube_length_mm, load_N, bundle, series)


commons = {
    "rest_length_mm": st.floats(1.0, 1e5),
    "wall_mm": st.floats(0.01, 50.0),
    "friction_fraction": st.floats(0.0, 0.5),
    "settle_ms": st.floats(0.0, 5000.0),
    "max_pressure_kPa": st.floats(0.1, 2000.0),
    "shear_modulus_kPa": st.one_of(st.just(0.0), st.floats(0.0, 1e5), st.floats(10.0, 1000.0)),
    "outer_diameter_mm": st.floats(0.2, 200.0),
}
"""The ranges of the keys that all makes share."""

contractiles = st.builds(Contractile, **commons, braid_angle_deg=st.floats(1.0, 54.7), end_factor=st.floats(1.0, 2.0))
extensiles = st.builds(Extensile, **commons, sleeve_limit=st.floats(1e-3, 10.0))
straight = st.one_of(contractiles, extensiles)
lengths = st.floats(0.1, 1e5)
any_make = st.one_of(
    straight,
    st.builds(Bending, base=straight, constraint_length_mm=lengths),
    st.builds(Coiling, base=straight, constraint_length_mm=lengths, constraint_pitch_mm=lengths),
)
supplies = st.builds(
    Supply,
    medium=st.sampled_from(["air", "water"]),
    pressure_kPa=st.floats(0.1, 2000.0),
    min_pressure_kPa=st.floats(0.1, 2000.0),
    receiver_L=st.just(10.0),
    max_receiver_kPa=st.just(2000.0),
    compressor_L_min=st.just(40.0),
    polytropic=st.floats(1.0, 1.4),
    ambient_kPa=st.floats(50.0, 120.0),
    temperature_C=st.floats(-20.0, 60.0),
)
valves = st.builds(
    Valve,
    name=st.just("any"),
    C_dm3_s_bar=st.floats(1e-4, 1000.0),
    b=st.floats(0.0, 0.95),
    switch_ms=st.just(8.0),
    max_switch_Hz=st.just(50.0),
    drive=st.sampled_from(["pressure", "strain", "valve"]),
    duty=st.just(1.0),
    duty_burst_s=st.just(30.0),
    energised_while_holding=st.just(False),
)
any_mounting = st.builds(
    Mounting,
    valve=valves,
    supply=supplies,
    tube_bore_mm=st.floats(0.05, 100.0),
    tube_length_mm=st.floats(0.0, 1e6),
    load_N=st.one_of(st.just(0.0), st.floats(0.0, 1e5), st.floats(0.0, 10.0)),
    bundle=st.integers(1, 10_000),
    series=st.integers(1, 10_000),
)
