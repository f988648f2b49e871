"""Air and water as they are handled: constants and the state at the valve. SI throughout."""

import math

import numpy as np

R_AIR = 287.05
"""Specific gas constant of air in J/(kg K)."""

GAMMA = 1.4
"""Ratio of specific heats of air."""

T_ANR = 293.15
P_ANR = 100_000.0
RHO_ANR = 1.185
"""The reference atmosphere ANR of ISO 8778: 20 °C, 100 kPa, 65 % relative humidity; density in kg/m³."""

RHO_WATER = 998.2
MU_WATER = 1.0016e-3
SOUND_WATER = 1482.0
"""Water at 20 °C: density in kg/m³, viscosity in Pa s, speed of sound in m/s."""


def air_viscosity(T: float | np.ndarray) -> float | np.ndarray:
    """Viscosity of air in Pa s at T kelvin, by Sutherland's law (1893) from 18.206 µPa s at 20 °C."""
    return 18.206e-6 * (T / T_ANR) ** 1.5 * (T_ANR + 110.4) / (T + 110.4)


def speed_of_sound(T: float) -> float:
    """Speed of sound in air in m/s at T kelvin: sqrt(gamma R T)."""
    return math.sqrt(GAMMA * R_AIR * T)


def free_litres(mass: np.ndarray | float) -> np.ndarray | float:
    """Litres of free air (ANR) of a mass in kg."""
    return mass / RHO_ANR * 1e3
