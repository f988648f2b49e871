"""Rig files as text for tests of modelled fibers."""

from dataclasses import asdict

HEAD = """[rig]
name = "Bench"

[supply]
pressure_kPa = {pressure:g}
min_pressure_kPa = {min_pressure:g}
receiver_L = 10
max_receiver_kPa = 800
compressor_L_min = 40
medium = "{medium}"

[valve_type.mini]
C_dm3_s_bar = {C:g}
switch_ms = 8
drive = "{drive}"
"""


def table(name: str, kind: str, make) -> str:
    """The [fiber_type] table of a make."""
    values = asdict(make)
    base = getattr(make, "base", None)
    if base is not None:
        values = {"base": {"contract": "contractile", "extend": "extensile"}[base.direction], **values.pop("base"), **values}
    lines = [f"[fiber_type.{name}]", f'kind = "{kind}"']
    lines += [
        f'{key} = "{value}"' if isinstance(value, str) else f"{key} = {value}"
        for key, value in values.items()
        if value is not None
    ]
    return "\n".join(lines) + "\n"


def rig_of(
    kind: str,
    make,
    hung: str = "load_N = 1.5",
    count: int = 1,
    pressure: float = 400,
    min_pressure: float = 450,
    medium: str = "air",
    C: float = 0.005,
    drive: str = "pressure",
) -> str:
    """A rig of one row of fibers of this make, `hung` the further lines of the row."""
    head = HEAD.format(pressure=pressure, min_pressure=min_pressure, medium=medium, C=C, drive=drive)
    row = f'[[fibers]]\nname = "reed"\ncount = {count}\ntype = "one"\n{hung}\n'
    return "\n".join([head, table("one", kind, make), row])
