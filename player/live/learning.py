"""Which bind is learned: from what the operator wrote for it to the lines of a map."""

from collections.abc import Collection

from composer.faults import fault, nearest
from composer.rig.select import Selector, UnknownName
from player.inputs.schema import DOES


def deed_of(written: str, selector: Selector, phrases: Collection[str]) -> str:
    """The lines of a bind beside its control: `reeds` moves fibers, `flick on reeds` plays a phrase, `vent` does something.

    Raises Faults where it is none of these.
    """
    phrase, on, fibers = written.partition(" on ")
    if on:
        if phrase.strip() not in phrases:
            raise fault("--learn", f"no phrase '{phrase.strip()}' in the score", hint=nearest(phrase.strip(), phrases))
        _known(fibers, selector)
        return f'phrase = "{phrase.strip()}"\non = "{fibers.strip()}"'
    if written.strip() in DOES and not _is_known(written.strip(), selector):
        return f'does = "{written.strip()}"'
    _known(written, selector)
    return f'fibers = "{written.strip()}"\npickup = true'


def _known(written: str, selector: Selector) -> None:
    for name in (part.strip() for part in written.split(",")):
        try:
            selector.resolve(name)
        except UnknownName as unknown:
            expected = f"fibers, 'PHRASE on FIBERS', or one of {', '.join(DOES)}"
            raise fault("--learn", f"no fiber or group '{name}' in the rig", expected, unknown.hint) from None


def _is_known(name: str, selector: Selector) -> bool:
    try:
        selector.resolve(name)
    except UnknownName:
        return False
    return True
