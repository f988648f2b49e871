"""The table of actions: its keys, and the page of the manual that is made from it."""

from importlib.resources import files

from composer.editor.actions import ACTIONS, by_menu, keys_in_words
from composer.editor.window import ComposeWindow


def test_every_row_has_a_deed_and_every_deed_a_row():
    deeds = {name.removeprefix("do_") for name in dir(ComposeWindow) if name.startswith("do_")}
    assert {one.name for one in ACTIONS} == deeds


def test_no_menu_has_two_words_with_the_same_letter_to_press():
    for menu, actions in by_menu().items():
        letters = [one.word[one.word.index("&") + 1].lower() for one in actions if "&" in one.word]
        assert len(set(letters)) == len(letters), menu


def test_keys_are_said_as_people_read_them():
    assert keys_in_words("Ctrl+Shift+S") == "Ctrl + Shift + S"
    assert keys_in_words("Ctrl++") == "Ctrl + +"
    assert keys_in_words("") == ""


def test_the_page_of_the_manual_has_every_key_with_what_it_does():
    page = files("composer").joinpath("manual/compose.md").read_text("utf-8")
    for one in ACTIONS:
        if one.keys:
            word = one.word.replace("&", "").removesuffix(" …")
            assert f"| {keys_in_words(one.keys)} | {word} | {one.says} |" in page, one.name
