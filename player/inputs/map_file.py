"""From the text of a map file to the map, or to everything that is wrong with it."""

import re
from collections.abc import Collection, Mapping
from fractions import Fraction
from typing import Any

from composer.faults import nearest
from composer.rig.document import Document, open_document, say_names, say_value
from composer.rig.lines import Path
from composer.rig.select import Selector, UnknownName
from composer.rig.values import read_table
from player.inputs.model import Bind, Control, Does, Map, Play, Stroke
from player.inputs.schema import BIND, FORMS, KINDS, MIDI, MOST_BINDS, SOURCE

TABLES = ("source", "bind")
MOST_COUNTS = 64
_COUNTS = re.compile(r"(?:(\d{1,3})\+)?(\d{1,4})/(\d{1,4})|(\d{1,3}(?:\.\d{1,6})?)")
_ADDRESS = re.compile(r"/[!-~]+")
_RESERVED = set("#*,?[]{}")


def read_map(text: str, file: str, selector: Selector, phrases: Collection[str]) -> Map:
    """The map that a text describes; raises `Faults` with all that is wrong, in the order of its lines.

    Args:
        text: the text of a `.map.toml` file
        file: its name, as messages give it
        selector: looks fibers and groups up, those of the rig and of the score
        phrases: names of the score's phrases; none where only a rig is played
    """
    document = open_document(text, file, "map file")
    for name in document.values:
        if name not in TABLES:
            hint = nearest(name, TABLES)
            what = "table" if isinstance(document.values[name], dict | list) else "key"
            document.at_key((name,), f"no {what} '{name}' in a map file", "" if hint else "[source] or [[bind]]", hint)
    source = read_table(document, ("source",), document.values.get("source", {}), SOURCE, "[source]")
    reader = _Binds(document, selector, phrases)
    binds = [reader.bind(("bind", index), table) for index, table in enumerate(_rows(document))]
    document.raise_faults()
    assert source is not None
    return Map(file, source["silence_s"], tuple(bind for bind in binds if bind is not None))


def _rows(document: Document) -> list[Any]:
    """The tables headed [[bind]]."""
    rows = document.values.get("bind", [])
    if not isinstance(rows, list):
        hint = "write [[bind]], with two brackets" if isinstance(rows, dict) else ""
        document.at_key(("bind",), f"'bind' is {say_value(rows)}", "tables headed [[bind]]", hint)
        return []
    if len(rows) > MOST_BINDS:
        document.at_key(("bind", MOST_BINDS), f"the map has {len(rows)} binds", f"at most {MOST_BINDS}")
        return []
    return rows


class _Binds:
    """Reads one bind after the other."""

    def __init__(self, document: Document, selector: Selector, phrases: Collection[str]):
        self.document = document
        self.selector = selector
        self.phrases = phrases

    def bind(self, path: Path, table: Any) -> Bind | None:
        """A bind, None with the faults noted where anything is wrong with it."""
        before = len(self.document.faults)
        if not isinstance(table, Mapping):
            self.document.at_value(path, f"a bind is {say_value(table)}", "a table headed [[bind]]")
            return None
        control, table = self._control(path, table)
        form = self._form(path, table)
        values = read_table(self.document, path, table, BIND, "a bind")
        if form and values is not None:
            self._no_other_keys(path, table, form)
        deed = self._deed(path, values, form) if values is not None and form else None
        osc = self._address(path, values, deed) if values is not None else ""
        if deed is None or len(self.document.faults) > before:
            return None
        return Bind(control, osc, deed, self.document.line(path))

    def _control(self, path: Path, table: Mapping[str, Any]) -> tuple[Control | None, dict[str, Any]]:
        """The MIDI control of a bind, and the bind's other keys."""
        rest = dict(table)
        midi = rest.pop("midi", None)
        misspelt = [name for name in rest if name not in {key.name for key in BIND} and nearest(name, ("midi",))]
        for name in misspelt:
            del rest[name]
            self.document.at_key((*path, name), f"no key '{name}' in a bind", "", "did you mean 'midi'?")
        if midi is None:
            if "osc" not in rest and not misspelt:
                hint = 'add: midi = { cc = 21, channel = 1 }   # or osc = "/reeds"'
                self.document.at_key(path, "a bind has neither midi nor osc", "the control that it is for", hint)
            return None, rest
        if "osc" in rest:
            hint = "write a bind for each"
            self.document.at_key((*path, "osc"), "a bind has both midi and osc", "one of them", hint)
        return self._midi((*path, "midi"), midi), rest

    def _midi(self, path: Path, midi: Any) -> Control | None:
        if not isinstance(midi, Mapping):
            self.document.at_value(path, f"midi is {say_value(midi)}", "a table such as { cc = 21, channel = 1 }")
            return None
        values = read_table(self.document, path, midi, MIDI, "midi")
        if values is None:
            return None
        kinds = [name for name in midi if name in KINDS]
        if len(kinds) != 1:
            found = f"midi has {say_names(kinds)} at once" if kinds else "midi names no control"
            self.document.at_value(path, found, f"one of {say_names(KINDS)}")
            return None
        kind, value = kinds[0], values[kinds[0]]
        if value is False:
            self.document.at_value((*path, kind), f"{kind} is false", "true")
            return None
        return Control(kind, 0 if value is True else int(value), values["channel"] or 0, values["port"])

    def _form(self, path: Path, table: Mapping[str, Any]) -> str:
        """Which of the three things the bind is."""
        forms = [name for name in FORMS if name in table]
        if len(forms) == 1:
            return forms[0]
        if forms:
            self.document.at_key((*path, forms[1]), f"a bind has {say_names(forms)} at once", "one of them")
        elif not any(nearest(name, FORMS) for name in table if name not in {key.name for key in BIND}):
            self.document.at_key(path, "a bind does nothing", "fibers, phrase or does", 'add: fibers = "…", for example')
        return ""

    def _no_other_keys(self, path: Path, table: Mapping[str, Any], form: str) -> None:
        allowed = {"osc", *(key.name for key in FORMS[form])}
        for name in table:
            if name not in allowed:
                self.document.at_key(
                    (*path, name),
                    f"'{name}' means nothing in a bind with '{form}'",
                    f"only {say_names(sorted(allowed - {'osc'}))}",
                )

    def _deed(self, path: Path, values: Mapping[str, Any], form: str) -> Stroke | Play | Does | None:
        if form == "does":
            return Does(values["does"])
        if form == "fibers":
            fibers = self._fibers((*path, "fibers"), values["fibers"])
            return fibers and Stroke(fibers, values["low"], values["high"], values["curve"], values["pickup"], values["how"])
        phrase, good = values["phrase"], True
        if phrase not in self.phrases:
            hint = nearest(phrase, self.phrases)
            told = f"one of {say_names(self.phrases)}" if self.phrases and not hint else ""
            none = "" if self.phrases else "phrases stand in a score: play the score instead of the rig alone"
            self.document.at_value((*path, "phrase"), f"no phrase '{phrase}' in the score", told, hint or none)
            good = False
        if values["on"] is None:
            self.document.at_key(path, f"no 'on' beside the phrase '{phrase}'", "the fibers that play it", 'add: on = "…"')
            return None
        fibers = self._fibers((*path, "on"), values["on"])
        quantise = None if values["quantise"] is None else self._counts((*path, "quantise"), values["quantise"])
        if fibers is None or not good or quantise == 0:
            return None
        return Play(phrase, fibers, values["release"] == "rest", quantise, values["how"])

    def _fibers(self, path: Path, written: str) -> tuple[int, ...] | None:
        found: set[int] = set()
        good = True
        for name in (part.strip() for part in written.split(",")):
            try:
                found.update(self.selector.resolve(name))
            except UnknownName as unknown:
                good = False
                what = f"no fiber or group '{name}' in the rig" if name else "a name is missing beside a comma"
                self.document.at_value(path, what, "", unknown.hint if name else "")
        return tuple(sorted(found)) if good else None

    def _counts(self, path: Path, written: str) -> Fraction:
        """A part of the tempo in counts; 0, with the fault noted, where it is none."""
        match = _COUNTS.fullmatch(written.strip())
        value = Fraction(0)
        if match and match[4]:
            value = Fraction(match[4])
        elif match and int(match[3]):
            value = Fraction(int(match[2]), int(match[3])) + int(match[1] or 0)
        if not 0 < value <= MOST_COUNTS:
            wanted = f'counts above 0, up to {MOST_COUNTS}, such as "1/2" or "4"'
            self.document.at_value(path, f"quantise is {say_value(written)}", wanted)
            return Fraction(0)
        return value

    def _address(self, path: Path, values: Mapping[str, Any], deed: Stroke | Play | Does | None) -> str:
        written = values["osc"]
        if written is None:
            return ""
        if not _ADDRESS.fullmatch(written) or _RESERVED & set(written):
            wanted = "an address that begins with '/', without spaces and without any of # * , ? [ ] { }"
            self.document.at_value((*path, "osc"), f"osc is {say_value(written)}", wanted)
        elif written.startswith("/drawcord/"):
            wanted = "an address outside '/drawcord/', where the fixed ones are"
            self.document.at_value((*path, "osc"), f"osc is {say_value(written)}", wanted)
        elif deed is not None and isinstance(deed, Does) and deed.what == "hold_to_run":
            # A packet that is lost would leave the rig running with nobody's hand on it.
            hint = "bind it to a key or a pedal"
            self.document.at_value((*path, "osc"), "hold_to_run over OSC", "a MIDI control", hint)
        return written
