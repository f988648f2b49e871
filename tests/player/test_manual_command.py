"""The manual: all pages there, told by name, and a folder for a browser in which every link leads somewhere."""

import re

import pytest

from player.commands.main import run
from player.commands.manual import pages, title_of


def test_without_a_page_every_page_is_listed_with_its_title(capsys):
    assert run(["manual"]) == 0
    out = capsys.readouterr().out
    for name, text in pages().items():
        assert re.search(rf"^  {re.escape(name)} +{re.escape(title_of(text))}$", out, re.MULTILINE)


@pytest.mark.parametrize("name", pages())
def test_a_page_in_a_pipe_is_as_it_is_written(name, capsys):
    assert run(["manual", name]) == 0
    assert capsys.readouterr().out == pages()[name] + "\n"


def test_a_page_that_is_not_there_is_told_with_the_nearest(capsys):
    assert run(["manual", "languge"]) == 2
    assert capsys.readouterr().err == "drawcord manual: there is no page 'languge'\n   did you mean 'language'?\n"


def test_in_the_folder_for_a_browser_every_link_and_picture_is_there(tmp_path, capsys):
    folder = tmp_path / "pages"
    assert run(["manual", "--html", str(folder)]) == 0
    there = {path.name for path in folder.iterdir()}
    assert {f"{name}.html" for name in pages()} < there
    for path in folder.glob("*.html"):
        for target in re.findall(r'(?:href|src)="([^"#:]+)"', path.read_text()):
            assert target in there, f"{path.name} points to {target}"


def test_a_folder_that_cannot_be_made_is_told(tmp_path, capsys):
    (tmp_path / "file").write_text("")
    assert run(["manual", "--html", str(tmp_path / "file" / "pages")]) == 2
    assert "cannot make the folder" in capsys.readouterr().err


def test_the_first_hour_is_the_first_page_and_what_is_new_the_last():
    assert next(iter(pages())) == "first-hour" and list(pages())[-1] == "changelog"


def test_the_titles_of_pages_stand_in_one_column(capsys):
    assert run(["manual"]) == 0
    lines = capsys.readouterr().out.splitlines()[2:]
    assert len({len(line) - len(line[2:].split(None, 1)[1]) for line in lines}) == 1
