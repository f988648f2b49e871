import pytest
from CoolProp.CoolProp import HAPropsSI, PropsSI

from composer.fiber import gas


def test_the_reference_atmosphere_is_air_at_20_degrees_and_65_percent_humidity(outside):
    air = outside["air_20C"]
    assert air["density_anr"] == gas.RHO_ANR
    assert pytest.approx(air["density_humid_65"], rel=3e-3) == gas.RHO_ANR
    assert 1.0 / HAPropsSI("Vha", "T", gas.T_ANR, "P", gas.P_ANR, "R", 0.65) == pytest.approx(air["density_humid_65"], rel=1e-5)


def test_dry_air_has_its_density_by_the_gas_constant(outside):
    dense = gas.P_ANR / (gas.R_AIR * gas.T_ANR)
    assert dense == pytest.approx(outside["air_20C"]["density_dry"], rel=1e-3)
    assert dense == pytest.approx(PropsSI("D", "T", gas.T_ANR, "P", gas.P_ANR, "Air"), rel=1e-3)


def test_sound_and_viscosity_are_those_of_air_at_20_degrees(outside):
    air = outside["air_20C"]
    assert gas.speed_of_sound(gas.T_ANR) == pytest.approx(air["speed_of_sound"], rel=1e-3)
    assert gas.air_viscosity(gas.T_ANR) == pytest.approx(air["viscosity"], rel=1e-6)


@pytest.mark.parametrize("celsius", [-20.0, 0.0, 20.0, 40.0, 60.0])
def test_sound_and_viscosity_follow_temperature_over_the_range_that_a_rig_may_have(celsius):
    T = celsius + 273.15
    assert gas.speed_of_sound(T) == pytest.approx(PropsSI("A", "T", T, "P", 1e5, "Air"), rel=2e-3)
    assert gas.air_viscosity(T) == pytest.approx(PropsSI("V", "T", T, "P", 1e5, "Air"), rel=5e-3)


def test_water_is_water_at_20_degrees(outside):
    water = outside["water_20C"]
    assert pytest.approx(water["density"], rel=1e-4) == gas.RHO_WATER
    assert pytest.approx(water["viscosity"], rel=1e-3) == gas.MU_WATER
    assert pytest.approx(water["speed_of_sound"], rel=1e-3) == gas.SOUND_WATER


def test_a_litre_of_free_air_is_a_litre_at_the_reference_density():
    assert gas.free_litres(gas.RHO_ANR * 1e-3) == pytest.approx(1.0)
