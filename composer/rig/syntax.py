"""What the TOML reader says about text that is no TOML, in the form and the words of every other fault."""

import re

from composer.faults import Fault, Where

_POSITION = re.compile(r"^(.*?) \(at (?:line (\d+), column (\d+)|end of document)\)$", re.DOTALL)

_TWICE = "write all its keys under one header; every name may be used once"

_SAID: tuple[tuple[str, str, str, str], ...] = (
    ("Cannot overwrite a value", "this key is given twice in its table", "", "take one of them out"),
    ("Duplicate inline table key", "this key is given twice in its table", "", "take one of them out"),
    ("Cannot declare", "this table is here a second time", "", _TWICE),
    ("Cannot redefine namespace", "this table is here a second time", "", _TWICE),
    ("Cannot mutate immutable namespace", "a key for a table that is closed already", "", "write all its keys in one place"),
    ("Expected '=' after a key", "no '=' after the key", "KEY = VALUE", ""),
    ("Invalid statement", "this is no key, table or comment", "KEY = VALUE, [TABLE], [[TABLE]] or # comment", ""),
    ("Invalid initial character for a key", "no key begins like this", "a name of letters, digits, '_' and '-'", ""),
    ("Invalid value", "this is no value", 'a number, true, false, a "text" in quotes, or a [list]', ""),
    ("Expected newline or end of document", "there is more after the value", "one KEY = VALUE a line", ""),
    ("Unclosed array", "the list is not closed", "',' or ']'", ""),
    ("Unclosed inline table", "the table in braces is not closed", "',' or '}'", ""),
    ("Expected ']' at the end of a table", "the table's header is not closed", "[TABLE]", ""),
    ("Expected ']]' at the end of an array", "the table's header is not closed", "[[TABLE]]", ""),
    ("Illegal character '\\n'", "the text is not closed in its line", "a closing quote", ""),
    ("Illegal character", "a control character, which does not show", "", "take it out"),
    ("Unescaped '\\'", "a '\\' that stands for nothing", "'\\\\' for the character itself", ""),
    ("Unterminated string", "the text in quotes is not closed", "a closing quote", ""),
    ("Expected ", "the text in quotes is not closed", "a closing quote", ""),
)
"""What the reader says, by its first words: what was found, what was expected, what to do."""

_ADVICE: tuple[tuple[str, re.Pattern[str], str], ...] = (
    ("Expected newline", re.compile(r"[0-9], ?[0-9]"), "a decimal has a point: 1.5"),
    ("Expected newline", re.compile(r"[0-9] *[A-Za-z%°µ/²]"), "a number stands without its unit; the key's name says the unit"),
    ("Expected newline", re.compile(r"[-+]?0[0-9]"), "a number has no zero in front"),
    (
        "Invalid value",
        re.compile(r"(?i:true|false|yes|no|on|off)\b"),
        "write true or false, in small letters and without quotes",
    ),
    ("Invalid value", re.compile(r"[^\W\d]"), "a text stands in quotes"),
)
"""What to do, by the words of the reader and by the value that it stumbled over."""


def syntax_fault(said: str, file: str, lines: list[str]) -> Fault:
    """The fault that the reader's message tells of, at its line and column."""
    parts = _POSITION.match(said)
    message = parts[1] if parts else said
    if parts and parts[2]:
        line, column = min(int(parts[2]), len(lines)), int(parts[3])
    else:
        # At the end of the document: behind the last text that there is.
        line = next((n for n in range(len(lines), 0, -1) if lines[n - 1].strip()), 1)
        column = len(lines[line - 1].rstrip()) + 1
    text = lines[line - 1]
    column, width = _span(message, text, min(column, len(text) + 1))
    where = Where(file, line, column, width, text)
    value = text.partition("=")[2].strip()
    hint = next((advice for start, form, advice in _ADVICE if message.startswith(start) and form.match(value)), "")
    for start, found, expected, usual in _SAID:
        if message.startswith(start):
            return Fault(where, found, expected, hint or usual)
    return Fault(where, message[:1].lower() + message[1:])


def _span(message: str, text: str, column: int) -> tuple[int, int]:
    """Column and width of what a person would point at: the reader itself stands behind what it has read."""
    indent = len(text) - len(text.lstrip())
    if message.startswith("Duplicate inline table key"):
        name = message.partition("'")[2].rstrip("'")
        at = text.rfind(name, 0, column - 1)
        return (at + 1, len(name)) if name and at >= 0 else (column, 1)
    if message.startswith(("Cannot overwrite", "Cannot declare", "Cannot redefine")):
        whole = re.match(r"\[\[?.*?\]\]?|[^=]*", text[indent:])
        return indent + 1, max(1, len(whole[0].rstrip()) if whole else 1)
    if message.startswith("Unescaped"):
        return max(1, column - 2), 2
    return column, 1
