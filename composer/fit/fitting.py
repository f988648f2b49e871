"""The one way in: a bench, what is known of its fiber, and the fit of its kind."""

from collections.abc import Callable

from composer.fit.bench import Bench
from composer.fit.fitted import Fitted
from composer.fit.known import known_of
from composer.fit.modelled import fit_modelled
from composer.fit.rated import fit_rated
from composer.rig.model import Rig


def fit(
    bench: Bench,
    name: str,
    rig: Rig | None = None,
    load_N: float | None = None,
    progress: Callable[[float], None] = lambda _: None,
) -> Fitted:
    """The fiber type `name` fitted to a bench; `rig` gives its kind, dimensions and starts. Raises `Faults`.

    load_N: constant load on the bench, where the file does not say; progress: called with shares of the work, 0 to 1
    """
    known = known_of(bench, name, rig, load_N)
    return fit_rated(bench, known) if known.kind == "rated" else fit_modelled(bench, known, progress)
