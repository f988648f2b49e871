"""The table of fiber kinds: a new kind is one file beside this one and one row here."""

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Any

from composer.fiber import rated
from composer.fiber.capability import Capability
from composer.fiber.mounting import Mounting
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


KINDS: dict[str, Kind] = {
    kind.name: kind for kind in (Kind("rated", rated.KEYS, rated.Rated, rated.capability, frozenset({"%", "mm"})),)
}
