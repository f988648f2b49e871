"""A small rig and a score for it, as texts."""

import pytest

RIG = """
[rig]
name = "Bench"
ambient_kPa = 101.325
temperature_C = 20
worn = false

[supply]
medium = "air"
pressure_kPa = 400
min_pressure_kPa = 450
receiver_L = 10
max_receiver_kPa = 800
compressor_L_min = 40
polytropic = 1.2

[fiber_type.drop]
kind = "rated"
direction = "contract"
rest_length_mm = 800
stroke = 0.3
fill_rate_per_s = 2.0
exhaust_rate_per_s = 2.0
air_mL = 3.0
max_pressure_kPa = 400

[valve_type.mini]
C_dm3_s_bar = 0.02
b = 0.3
switch_ms = 8
max_switch_Hz = 50
drive = "strain"
duty = 1.0
duty_burst_s = 30

[driver.main]
channels = 8

[[fibers]]
name = "r"
count = 4
first_channel = 0
type = "drop"
valve = "mini"
driver = "main"
tube_bore_mm = 2.0
tube_length_mm = 800
load_N = 1.5
at_m = [0.0, 0.0, 0.0]
step_m = [0.05, 0.0, 0.0]
toward = [0, 0, -1]
"""

SCORE = """title "Bench piece"
rig bench.rig.toml
tempo 120
cue "middle" at 1:2
phrase nod {length}
  0 rest
  {up} full
  {down} rest
section only at 1:1
  r.* nod times {times}
"""


@pytest.fixture(scope="session")
def rig_text() -> str:
    """Four fibers r.1 to r.4 on one board of 8 channels."""
    return RIG


@pytest.fixture(scope="session")
def score_text() -> str:
    """A phrase of `length` counts that is up at count `up` and down at `down`, `times` over."""
    return SCORE
