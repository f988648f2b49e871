"""The shared receiver: air drawn by filling fibers, put back by the compressor up to its cut-out."""

from dataclasses import dataclass

import numpy as np

from composer.fiber.mounting import Supply

ANR_KPA = 100.0
"""Free air is counted at 100 kPa absolute (ISO 8778), so a litre of receiver holds one litre of it for every 100 kPa gauge."""


@dataclass(frozen=True, slots=True)
class Receiver:
    """Air in store: `supply_kPa` gauge, and the litres of free air drawn and delivered since the start.

    The store is taken as isothermal, as in the checker's air limit: what is in it is pressure times volume, so that
    stored = stored at the start + delivered - drawn at every instant.
    """

    supply_kPa: float
    drawn_L: float = 0.0
    delivered_L: float = 0.0


def full(supply: Supply) -> Receiver:
    """A receiver filled up to the cut-out."""
    return Receiver(supply.max_receiver_kPa)


def after(receiver: Receiver, supply: Supply, dt_s: float, drawn_L: float) -> Receiver:
    """The receiver after `dt_s` in which so many litres of free air were drawn; the compressor stops at the cut-out."""
    litres_per_kPa = supply.receiver_L / ANR_KPA
    room_L = (supply.max_receiver_kPa - receiver.supply_kPa) * litres_per_kPa + drawn_L
    delivered_L = min(supply.compressor_L_min / 60.0 * dt_s, max(room_L, 0.0))
    return Receiver(
        receiver.supply_kPa + (delivered_L - drawn_L) / litres_per_kPa,
        receiver.drawn_L + drawn_L,
        receiver.delivered_L + delivered_L,
    )


def needed_kPa(supply: Supply) -> float:
    """The receiver's pressure from which on the regulator gives all that was promised: fibers notice nothing above it."""
    return float(np.minimum(supply.pressure_kPa, supply.min_pressure_kPa))
