"""What is known of a fiber beside its bench: from the head of the bench file, and from a type of a rig."""

import re
from collections.abc import Mapping
from dataclasses import dataclass, fields
from typing import Any

from composer.faults import Fault, Faults, Where, fault, nearest
from composer.fiber.kinds import KINDS, STRAIGHT
from composer.fit.bench import Bench
from composer.fit.parameters import OF_MAKE, Parameter
from composer.keys import Key
from composer.rig.model import Rig
from composer.rig.schema import LONGEST_NAME, NAME_RULE, TYPE_KEYS
from composer.rig.values import expected, say_number

NAME = re.compile(r"[A-Za-z][A-Za-z0-9_.-]*")

LOAD = Key("load_N", "number", "constant load on the bench, along the axis against the motion", "N", 0.0, 1e5, default=0.0)


@dataclass(frozen=True, slots=True)
class Known:
    """A fiber type as far as it is known.

    keys: all keys of its kind; values: those taken as given, `come` from where; starts: where to begin to look for others
    load_N: constant load on the bench; said_load: whether anybody said so
    """

    name: str
    kind: str
    base: str
    keys: tuple[Key, ...]
    values: Mapping[str, Any]
    come: Mapping[str, str]
    starts: Mapping[str, float]
    load_N: float
    said_load: bool

    @property
    def parameters(self) -> tuple[Parameter, ...]:
        """What is to be fitted: all parameters of the make that are not given."""
        return tuple(each for each in OF_MAKE.get(self.base, ()) if each.key not in self.values)


def known_of(bench: Bench, name: str, rig: Rig | None, load_N: float | None) -> Known:
    """What is known of the type `name`. Raises `Faults` where a value is wrong, or one that no bench can tell is missing."""
    kind, from_rig = _kind(bench, name, rig)
    said = {key: one.value for key, one in bench.said.items()}
    base = said.get("base", from_rig.get("base"))
    keys = KINDS[kind].keys_of({"base": base})
    held = next((key for key in keys if key.name == "base"), None)
    if held is not None and base not in list(held.choices):
        # Without a base nobody can say which of the other keys are right.
        where = bench.said["base"].where if "base" in bench.said else Where(bench.file)
        found = f"base is {base!r}"[:80] if base is not None else f"nothing says what base the {kind} fiber '{name}' has"
        raise Faults([Fault(where, found, expected(held), f'such as a line # base = "{held.choices[0]}" above the header')])
    make = base if held is not None else kind
    wanted = {each.key for each in OF_MAKE.get(str(make), ())} or RATED_FOUND
    by_name = {key.name: key for key in keys}
    wrong = [problem for key, one in bench.said.items() for problem in _wrong(key, one.value, one.where, by_name, kind)]
    if bench.force is not None and (load_N is not None or "load_N" in said):
        where = bench.said["load_N"].where if "load_N" in said else Where(bench.file)
        wrong.append(Fault(where, "a load is given, and the bench has a column force_N", "one of the two"))
    if wrong:
        raise Faults(wrong)
    values: dict[str, Any] = {}
    come: dict[str, str] = {}
    for key in keys:
        if key.name in said:
            values[key.name], come[key.name] = _typed(said[key.name], key), "as the bench file says"
        elif key.name not in wanted and from_rig.get(key.name) is not None:
            values[key.name], come[key.name] = from_rig[key.name], "as in the rig"
    _missing(bench, kind, keys, values, wanted, rig)
    starts = {key: float(from_rig[key]) for key in wanted if isinstance(from_rig.get(key), int | float)}
    load = load_N if load_N is not None else float(said.get("load_N", 0.0))
    known = Known(name, kind, str(make), keys, values, come, starts, load, load_N is not None or "load_N" in said)
    _check_make(bench, known)
    return known


RATED_FOUND = {"stroke", "fill_rate_per_s", "exhaust_rate_per_s"}
"""What a bench tells of a rated fiber."""

NOT_NEEDED = {"max_pressure_kPa"}
"""Needed by the rig file, but a bench has an answer where nobody gives one: the highest pressure tried."""


def _kind(bench: Bench, name: str, rig: Rig | None) -> tuple[str, dict[str, Any]]:
    """The kind of the type and what the rig says of it."""
    if not NAME.fullmatch(name) or len(name) > LONGEST_NAME:
        raise fault(
            bench.file, f"--type '{name[:80]}' cannot be the name of a fiber type", f"{NAME_RULE}, at most {LONGEST_NAME}"
        )
    said = bench.said.get("kind")
    if rig is not None:
        found = rig.fiber_types.get(name)
        if found is None:
            listed = ", ".join(rig.fiber_types)
            raise fault(rig.file, f"no fiber type '{name}' in the rig", f"one of {listed}", nearest(name, rig.fiber_types))
        if said is not None and said.value != found.kind:
            what = f"the bench file says kind {said.value!r}, and '{name}' in {rig.file} is {found.kind}"
            raise Faults([Fault(said.where, what, "one kind")])
        return found.kind, _flat(found.make)
    if said is not None:
        if said.value not in list(KINDS):
            hint = nearest(str(said.value), KINDS)
            raise Faults([Fault(said.where, f"no kind of fiber {said.value!r}", f"one of {', '.join(KINDS)}", hint)])
        return said.value, {}
    if name in KINDS:
        return name, {}
    raise fault(
        bench.file,
        f"nothing says what kind of fiber '{name}' is",
        f'a line # kind = "contractile" above the header (or {", ".join(kind for kind in KINDS if kind != "contractile")}),'
        " or --rig RIG with that type",
        nearest(name, KINDS),
    )


def _flat(make: Any) -> dict[str, Any]:
    """The keys of a make as its rig file has them, its base's among them."""
    values = {field.name: getattr(make, field.name) for field in fields(make)}
    base = values.pop("base", None)
    if base is not None:
        name = next(name for name, (_, make_type) in STRAIGHT.items() if isinstance(base, make_type))
        values = {"base": name, **_flat(base), **values}
    return values


def _wrong(name: str, value: Any, where: Where, keys: Mapping[str, Key], kind: str) -> list[Fault]:
    """What is wrong with a value of the head: the wrong type, out of range, or a key that this kind does not have."""
    if name == "kind":
        return []
    key = LOAD if name == LOAD.name else keys.get(name)
    if key is None:
        return [Fault(where, f"a fiber of kind {kind} has no {name}", "", "take the line out, or put words before it")]
    good = (
        value in list(key.choices)
        if key.type == "choice"
        else isinstance(value, int | float)
        and not isinstance(value, bool)
        and (key.low < value if key.above else key.low <= value)
        and value <= key.high
        and (key.type == "number" or float(value).is_integer())
    )
    if good:
        return []
    return [Fault(where, f"{name} is {value!r}"[:120], expected(key))]


def _typed(value: Any, key: Key) -> Any:
    return float(value) if key.type == "number" else int(value) if key.type == "integer" else value


def _missing(
    bench: Bench, kind: str, keys: tuple[Key, ...], values: Mapping[str, Any], wanted: set[str], rig: Rig | None
) -> None:
    """Raise `Faults` for what no bench can tell and nobody said."""
    left = [key for key in keys if key.required and key.name not in values and key.name not in wanted | NOT_NEEDED]
    if not left:
        return
    names = ", ".join(key.name for key in left)
    lines = "\n   ".join(f"# {key.name} = {_sample(key)}   # {key.says}" for key in left)
    raise fault(
        bench.file,
        f"for a fiber of kind {kind} these must be known and are not: {names}",
        "lines above the header, measured on the fiber" + (", or --rig RIG with a type that has them" if rig is None else ""),
        "such as\n   " + lines,
    )


def _sample(key: Key) -> str:
    if key.type == "choice":
        return f'"{key.choices[0]}"'
    return {"rest_length_mm": "400", "outer_diameter_mm": "3.0", "wall_mm": "0.5", "air_mL": "3.0"}.get(
        key.name, say_number(max(key.low, 100.0))
    )


def _check_make(bench: Bench, known: Known) -> None:
    """Raise `Faults` where known dimensions cannot go together, such as a wall that leaves no bore."""
    if not known.base or known.base == "rated":
        return
    filled = {each.key: known.starts.get(each.key, each.starts[0]) for each in known.parameters}
    filled.setdefault("max_pressure_kPa", 1.0)
    made = make_of(known, filled)
    for key, found, wanted in made.problems():
        where = bench.said[key].where if key in bench.said else Where(bench.file)
        raise Faults([Fault(where, found, wanted)])


def make_of(known: Known, found: Mapping[str, Any]) -> Any:
    """The make with what is known, what is found, and defaults for the remainder."""
    values = {}
    for key in known.keys:
        if key.name in known.values:
            values[key.name] = known.values[key.name]
        elif key.name in found:
            values[key.name] = found[key.name]
        elif not key.required:
            values[key.name] = key.default
    return KINDS[known.kind].make(**values)


HEAD_KEYS: tuple[str, ...] = tuple(
    dict.fromkeys(
        [key.name for key in TYPE_KEYS]
        + [key.name for kind in KINDS.values() for base in OF_MAKE for key in kind.keys_of({"base": base})]
        + [LOAD.name]
    )
)
"""Every key that the head of a bench file may give."""
