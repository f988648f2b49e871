"""How one fiber is fed and loaded: everything beside its make that decides what it can do."""

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Supply:
    """The shared supply: pressures in kPa gauge (ambient absolute), volumes in litres, flow in L/min of free air (ANR)."""

    medium: str
    pressure_kPa: float
    min_pressure_kPa: float
    receiver_L: float
    max_receiver_kPa: float
    compressor_L_min: float
    polytropic: float
    ambient_kPa: float
    temperature_C: float


@dataclass(frozen=True, slots=True)
class Valve:
    """A type of valve: ISO 6358 conductance in dm³/(s·bar), critical ratio, response in ms, switching in Hz, coil duty."""

    name: str
    C_dm3_s_bar: float
    b: float
    switch_ms: float
    max_switch_Hz: float
    drive: str
    duty: float
    duty_burst_s: float
    energised_while_holding: bool


@dataclass(frozen=True, slots=True)
class Mounting:
    """A fiber's valve, tube (mm), load (N), and how many lie side by side (`bundle`) and end to end (`series`)."""

    valve: Valve
    supply: Supply
    tube_bore_mm: float
    tube_length_mm: float
    load_N: float
    bundle: int
    series: int
