"""Pages for a wall, read back by another library."""

import io
from dataclasses import replace
from unicodedata import normalize

import pypdf
import pytest

from composer.picture.bands import Band
from composer.picture.cloth.pages import PAPERS, Line, Printing, print_pages
from composer.picture.cloth.print_plan import Named

LINES = [Line(f"{n + 1}:1", f"r.{n} is asked to fill in {n} ms; it needs a second.", f"Give it {n} s more.") for n in range(70)]


@pytest.fixture(scope="module")
def weave(make_weave):
    short = make_weave(until_s=2.1)
    return replace(short, tracks=replace(short.tracks, duration_s=150.0))


def read(pdf):
    pages = pypdf.PdfReader(io.BytesIO(pdf)).pages
    return [" ".join(normalize("NFKC", page.extract_text()).split()) for page in pages], pages


def test_every_page_has_title_number_bars_and_sections(weave, qapp):
    sections = (Named("doors", 0.0), Named("ebb", 70.0))
    texts, _ = read(print_pages(weave, "Bench in air", LINES[:2], sections))
    assert len(texts) == 4
    for number, text in enumerate(texts, 1):
        assert "Bench in air" in text
        assert f"page {number} of 4" in text
    assert "bars 1 to 15" in texts[0]
    assert "doors" in texts[0]
    assert "bars 16 to 30" in texts[1]
    assert "ebb" in texts[1]
    assert "bars 31 to 38" in texts[2]
    assert "doors" not in texts[2]


def test_the_list_says_every_snag_once_and_splits_none(weave, qapp):
    texts, _ = read(print_pages(weave, "Bench", LINES))
    lists = [text for text in texts if "what is wrong" in text]
    assert len(lists) >= 2
    whole = " ".join(lists)
    for line in LINES:
        assert whole.count(line.says) == 1
        page = next(text for text in lists if line.says in text)
        assert line.mends in page
    assert f"{len(weave.snags)} snags" in lists[0] and f"{len(weave.snags)} snags" in " ".join(texts[:3])
    assert "continued" in lists[1]


def test_a_score_without_snags_says_so(weave, qapp):
    texts, _ = read(print_pages(replace(weave, snags=()), "Bench", []))
    assert "no snags: the rig can do all of it" in texts[-1]


@pytest.mark.parametrize(("paper", "wide", "high"), [("A4", 297.0, 210.0), ("Letter", 279.4, 215.9), ("A3", 420.0, 297.0)])
def test_pages_lie_landscape_on_the_paper_asked_for(weave, qapp, paper, wide, high):
    _, pages = read(print_pages(weave, "Bench", [], paper=paper))
    box = pages[0].mediabox
    assert float(box.width) / 72 * 25.4 == pytest.approx(wide, abs=0.5)
    assert float(box.height) / 72 * 25.4 == pytest.approx(high, abs=0.5)


def test_a_rig_of_many_threads_takes_several_pages_a_stretch(make_weave, qapp):
    many = make_weave(count=200)
    many = replace(many, bands=(Band("a", 0, 90), Band("b", 90, 200)))
    texts, _ = read(print_pages(many, "Bench", []))
    assert [text.count("threads") for text in texts] == [1, 1, 1, 0]
    assert "threads 1 to 90 of 200" in texts[0]


def test_progress_rises_to_all_and_says_every_page(weave, qapp):
    told = []
    print_pages(weave, "Bench", LINES, progress=told.append)
    assert told == sorted(told)
    assert told[-1] == 1.0
    assert len(told) == 3 + sum(1 for share in told if share > 3 / len(told))


def test_cancelled_there_are_no_pages_and_no_more_are_drawn(weave, qapp):
    told = []
    assert print_pages(weave, "Bench", LINES, progress=told.append, cancelled=lambda: len(told) >= 2) is None
    assert len(told) == 2


def test_a_page_at_a_time_the_file_is_there_at_the_end(weave, qapp):
    printing = Printing(weave, "Bench", [])
    steps = printing.pages()
    next(steps)
    assert printing.pdf is None
    *_, last = steps
    assert last == 1.0
    assert printing.pdf.startswith(b"%PDF-")


def test_no_paper_but_those_there_are():
    with pytest.raises(ValueError, match=r"no paper 'B5'; there are A4, Letter, A3"):
        Printing(None, "Bench", [], paper="B5")
    assert set(PAPERS) == {"A4", "Letter", "A3"}
