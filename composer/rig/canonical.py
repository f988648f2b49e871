"""The fingerprint of a rig: CRC-32 of a form that depends on what the rig is, not on how its file is written."""

import json
from collections.abc import Mapping
from dataclasses import asdict, is_dataclass
from typing import Any
from zlib import crc32

from composer.rig.model import Rig


def canonical(rig: Rig) -> str:
    """The rig as JSON with sorted keys: every table, defaults filled in, one fiber after the other in rig order.

    Left out is what changes nothing: the file's path and its lines. Numbers are written as the shortest decimal of
    their float64, so 400, 400.0 and 4e2 are one; groups as the fibers they mean.
    """
    form = {
        "rig": {"name": rig.name, "worn": rig.worn},
        "supply": rig.supply,
        "fiber_type": {name: {"kind": kind.kind, "make": kind.make} for name, kind in rig.fiber_types.items()},
        "valve_type": rig.valve_types,
        "driver": {driver.name: driver.channels for driver in rig.drivers},
        "fiber": [
            {
                "name": fiber.name,
                "type": fiber.type.name,
                "valve": fiber.mounting.valve.name,
                "tube_bore_mm": fiber.mounting.tube_bore_mm,
                "tube_length_mm": fiber.mounting.tube_length_mm,
                "load_N": fiber.mounting.load_N,
                "bundle": fiber.mounting.bundle,
                "series": fiber.mounting.series,
                "driver": fiber.driver,
                "channel": fiber.channel,
                "at_m": fiber.at_m,
                "toward": fiber.toward,
                "mirror": fiber.mirror,
                "max_hold_s": fiber.max_hold_s,
            }
            for fiber in rig.fibers
        ],
        "group": rig.groups,
    }
    return json.dumps(_plain(form), sort_keys=True, separators=(",", ":"), ensure_ascii=True, allow_nan=False)


def fingerprint(rig: Rig) -> int:
    """CRC-32 (that of zlib, IEEE 802.3) of the canonical form, 32 bits without a sign."""
    return crc32(canonical(rig).encode("ascii"))


def _plain(value: Any) -> Any:
    """Nothing but dicts, lists, texts, floats, true, false and null; every number a float, and zero without a sign."""
    if is_dataclass(value) and not isinstance(value, type):
        value = asdict(value)
    if isinstance(value, Mapping):
        return {str(key): _plain(item) for key, item in value.items()}
    if isinstance(value, list | tuple):
        return [_plain(item) for item in value]
    if isinstance(value, bool) or not isinstance(value, int | float):
        return value
    return float(value) + 0.0
