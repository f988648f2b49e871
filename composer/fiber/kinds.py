"""The table of fiber kinds: a new kind is one file beside this one and one row here."""

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Any

from composer.fiber import bending, coiling, contractile, extensile, modelled, rated
from composer.fiber.capability import Capability
from composer.fiber.make import Make
from composer.fiber.mounting import Mounting
from composer.fiber.problems import problems
from composer.keys import Key


@dataclass(frozen=True, slots=True)
class Kind:
    """A kind of fiber: the keys of its type in a rig file, the dataclass they fill, and what such a fiber can do.

    keys: a function of the table as written where a key decides what the others are
    units: the units that a target of such a fiber may have, beside a plain share of its stroke
    problems: what cannot be about a make as mounted, as (key to change, what was found, what was expected)
    """

    name: str
    keys: tuple[Key, ...] | Callable[[Mapping[str, Any]], tuple[Key, ...]]
    make: Callable[..., Any]
    capability: Callable[[Any, Mounting], Capability]
    units: frozenset[str]
    problems: Callable[[Any, Mounting], list[tuple[str, str, str]]] = lambda make, mounting: []

    def keys_of(self, table: Mapping[str, Any]) -> tuple[Key, ...]:
        """The keys that a type of this kind has, given its table as written."""
        return self.keys(table) if callable(self.keys) else self.keys


STRAIGHT: dict[str, tuple[tuple[Key, ...], type[Make]]] = {
    "contractile": (contractile.KEYS, contractile.Contractile),
    "extensile": (extensile.KEYS, extensile.Extensile),
}
"""The makes that a fiber may have, straight or held by a thread."""

BASE = Key("base", "choice", "the make of the fiber that the thread holds; its keys stand here too", choices=tuple(STRAIGHT))


def _held_keys(own: tuple[Key, ...]) -> Callable[[Mapping[str, Any]], tuple[Key, ...]]:
    """The keys of a fiber held by a thread: its base, the keys of that make, and its own."""

    def keys(table: Mapping[str, Any]) -> tuple[Key, ...]:
        base = table.get("base")
        make = STRAIGHT[base][0] if isinstance(base, str) and base in STRAIGHT else ()
        return (BASE, *make, *own)

    return keys


def _held(make: Callable[..., Any], own: tuple[Key, ...]) -> Callable[..., Any]:
    """A maker of fibers held by a thread from the values of all their keys."""
    names = {key.name for key in own}

    def build(base: str, **values: Any) -> Any:
        inner = {name: value for name, value in values.items() if name not in names}
        return make(base=STRAIGHT[base][1](**inner), **{name: values[name] for name in names})

    return build


def _row(name: str, keys: Any, make: Callable[..., Any], units: set[str]) -> Kind:
    """The row of a kind that is modelled from its make."""
    return Kind(name, keys, make, modelled.capability, frozenset(units), problems)


KINDS: dict[str, Kind] = {
    kind.name: kind
    for kind in (
        Kind("rated", rated.KEYS, rated.Rated, rated.capability, frozenset({"%", "mm"})),
        _row("contractile", *STRAIGHT["contractile"], {"%", "mm"}),
        _row("extensile", *STRAIGHT["extensile"], {"%", "mm"}),
        _row("bending", _held_keys(bending.KEYS), _held(bending.Bending, bending.KEYS), {"%", "deg"}),
        _row("coiling", _held_keys(coiling.KEYS), _held(coiling.Coiling, coiling.KEYS), {"%", "deg"}),
    )
}
