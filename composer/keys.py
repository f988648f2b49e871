"""How one key of a settings file is declared: reader, error messages and manual all read this."""

from dataclasses import dataclass
from typing import Any, Literal

REQUIRED: Any = object()


@dataclass(frozen=True, slots=True)
class Key:
    """A key with its type, unit, range and default.

    `low` and `high` bound numbers (each number of a vector); with `above` the lower bound itself is not allowed.
    `default` is REQUIRED where the key must be given.
    """

    name: str
    type: Literal["number", "integer", "text", "choice", "switch", "vector", "names"]
    says: str
    unit: str = ""
    low: float = float("-inf")
    high: float = float("inf")
    above: bool = False
    default: Any = REQUIRED
    choices: tuple[str, ...] = ()

    @property
    def required(self) -> bool:
        """Whether it must be given."""
        return self.default is REQUIRED
