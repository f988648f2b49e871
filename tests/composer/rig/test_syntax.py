import pytest

from composer.faults import Faults
from composer.rig.document import open_document


def fault(text):
    with pytest.raises(Faults) as caught:
        open_document(text, "f")
    (only,) = caught.value.faults
    return only


@pytest.mark.parametrize(
    ("text", "line", "shown", "found"),
    [
        ("a = 1\n  a = 2 # again", 2, "a", "this key is given twice in its table"),
        ("x = {b = 1, b = 2}", 1, "b", "this key is given twice in its table"),
        ("[a]\n[b]\n[a] # again", 3, "[a]", "this table is here a second time"),
        ("[[a]]\n [a]", 2, "[a]", "this table is here a second time"),
        ("a = 1\n[[a]]", 2, "[[a]]", "this key is given twice in its table"),
        ("a\n", 1, "", "no '=' after the key"),
        ("a =\n", 1, "", "this is no value"),
        ("= 3", 1, "=", "this is no key, table or comment"),
        ("é = 1", 1, "é", "this is no key, table or comment"),
        ("[]", 1, "]", "no key begins like this"),
        ("[a", 1, "", "the table's header is not closed"),
        ("[[a]", 1, "]", "the table's header is not closed"),
        ("a = [1,\n 2\n\n", 2, "", "the list is not closed"),
        ("a = [1 2]", 1, "2", "the list is not closed"),
        ("a = {b = 1", 1, "", "the table in braces is not closed"),
        ("a = 'x\n", 1, "", "the text in quotes is not closed"),
        ("a = '''x\ny", 2, "", "the text in quotes is not closed"),
        ('a = "x\n', 1, "", "the text is not closed in its line"),
        ('a = "\\q"', 1, "\\q", "a '\\' that stands for nothing"),
    ],
)
def test_text_that_is_no_toml_is_blamed_where_a_person_would_point(text, line, shown, found):
    wrong = fault(text)
    assert (wrong.where.line, wrong.found) == (line, found)
    assert wrong.where.text == text.split("\n")[line - 1]
    assert wrong.where.text[wrong.where.column - 1 :][: wrong.where.width] == shown


@pytest.mark.parametrize(
    ("text", "hint"),
    [
        ("a = 5 mm", "a number stands without its unit; the key's name says the unit"),
        ("a = 5mm", "a number stands without its unit; the key's name says the unit"),
        ("a = 1,5", "a decimal has a point: 1.5"),
        ("a = 012", "a number has no zero in front"),
        ("a = TRUE", "write true or false, in small letters and without quotes"),
        ("a = yes", "write true or false, in small letters and without quotes"),
        ("a = reed.1", "a text stands in quotes"),
    ],
)
def test_common_slips_are_told_what_to_do(text, hint):
    assert fault(text).hint == hint
