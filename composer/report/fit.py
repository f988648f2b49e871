"""What a fit tells: the `[fiber_type]` table ready to paste, a few sentences, JSON."""

import math
import re
from collections.abc import Iterator
from typing import Any

from composer.fit.fitted import CONFIDENCE, Fitted, Found
from composer.rig.values import say_number

PER_CENT = f"{100 * CONFIDENCE:g} %"


def as_table(fitted: Fitted, bench: str) -> str:
    """The table of the fiber type as a rig file has it, each value with where it comes from; comments above it."""
    lines = [f"# {line}" for line in sentences(fitted, bench)]
    name = fitted.name if re.fullmatch(r"[A-Za-z0-9_-]+", fitted.name) else f'"{fitted.name}"'
    lines += [f"[fiber_type.{name}]", f'kind = "{fitted.kind}"']
    found = {one.key: one for one in fitted.found}
    rows = [(f"{key} = {_value(value, found.get(key))}", _remark(key, found, fitted)) for key, value in fitted.values.items()]
    wide = max(len(left) for left, _ in rows)
    lines += [f"{left:<{wide}}  # {right}" if right else left for left, right in rows]
    return "\n".join(lines) + "\n"


def sentences(fitted: Fitted, bench: str) -> Iterator[str]:
    """What whoever pastes the table should know: what was fitted, how well, what the data cannot tell."""
    span = fitted.time[-1] - fitted.time[0]
    load = "with the force that was measured" if fitted.load_N is None else f"at a load of {fitted.load_N:g} N"
    thinned = "" if fitted.used == fitted.rows else f", taken as {fitted.used} means"
    file = _plain(bench.replace("\\", "/").rsplit("/", 1)[-1])
    yield f"fitted from {file}: {fitted.rows} rows{thinned}, {span:.4g} s, {load}"
    if fitted.kind == "rated":
        yield f"the stroke measured is {fitted.stroke:.4g}, and its noise {fitted.noise:.2g} (standard deviation)"
    else:
        share = 100.0 * fitted.noise / fitted.stroke
        yield f"the fit misses the strain by {fitted.noise:.2g} (standard deviation), {share:.2g} % of the stroke measured"
    if fitted.found:
        yield f"intervals hold all at once with {PER_CENT} confidence, as long as what is given is exact"
    for one in fitted.found:
        if not one.told:
            yield f"the data cannot tell {one.key}" + (f": {one.why}" if one.why else "")
    for a, b, together in fitted.beside:
        yield f"{a} and {b} are hardly told apart (correlation {together:.3f}): use them together, or measure one"
    yield from fitted.notes


def as_json(fitted: Fitted, bench: str) -> dict[str, Any]:
    """The fit as JSON has it."""
    return {
        "bench": bench,
        "type": fitted.name,
        "kind": fitted.kind,
        "rows": fitted.rows,
        "used_rows": fitted.used,
        "duration_s": _tidy(fitted.time[-1] - fitted.time[0]),
        "load_N": fitted.load_N,
        "confidence": CONFIDENCE,
        "parameters": [
            {
                "key": one.key,
                "unit": one.unit or "1",
                "value": _tidy(one.value),
                "low": _tidy(one.low),
                "high": _tidy(one.high),
                "told": one.told,
                "held": one.held,
                "why": one.why,
            }
            for one in fitted.found
        ],
        "given": {key: fitted.values.get(key) for key in fitted.known},
        "hardly_apart": [{"keys": [a, b], "correlation": _tidy(together)} for a, b, together in fitted.beside],
        "noise_strain": _tidy(fitted.noise),
        "stroke_strain": _tidy(fitted.stroke),
        "notes": list(fitted.notes),
        "table": as_table(fitted, bench),
    }


def value_text(one: Found) -> str:
    """A value with as many digits as its interval is worth."""
    if one.held:
        return _rounded(one.value, 1e-3 * abs(one.value))
    return _rounded(one.value, max(one.high - one.value, one.value - one.low))


def interval_text(one: Found) -> str:
    """ "298 to 301 kPa"."""
    half = max(one.high - one.value, one.value - one.low)
    unit = f" {one.unit}" if one.unit else ""
    return f"{_rounded(one.low, half)} to {_rounded(one.high, half)}{unit}"


def _value(value: Any, one: Found | None) -> str:
    if isinstance(value, str):
        return f'"{value}"'
    if isinstance(value, bool):
        return "true" if value else "false"
    if one is not None:
        return value_text(one)
    return say_number(value)


def _remark(key: str, found: dict[str, Found], fitted: Fitted) -> str:
    if key in found:
        one = found[key]
        if one.told:
            return interval_text(one)
        return "THE DATA CANNOT TELL: " + ("not found but taken" if one.held else interval_text(one))
    return fitted.known.get(key, "")


def _rounded(value: float, half: float) -> str:
    """A number with two digits of its uncertainty and no fewer than three of its own, six at most; never an exponent."""
    if not value:
        return "0"
    size = math.floor(math.log10(abs(value)))
    digits = 1 - math.floor(math.log10(half)) if half > 0.0 else 5 - size
    if half < abs(value):
        digits = min(max(digits, 2 - size), 5 - size)
    digits = min(digits, 12)
    shown = round(value, digits)
    return say_number(shown) if digits <= 0 else f"{shown:.{digits}f}".rstrip("0").rstrip(".")


def _plain(text: str) -> str:
    """A file's name without what would end a comment."""
    return "".join(c if c.isprintable() else "\N{REPLACEMENT CHARACTER}" for c in text)


def _tidy(value: float) -> float:
    """Nine digits: what lies beyond is rounding."""
    return float(f"{float(value):.9g}") + 0.0
