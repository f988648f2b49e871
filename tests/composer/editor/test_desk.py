"""What a worker does with a text, without any process: messages in, messages out."""

from fractions import Fraction
from pathlib import Path

import numpy as np
import pytest

import scores_demo
from composer.editor.deltas import between
from composer.editor.desk import READER, SOLVER, Desk
from composer.editor.messages import (
    Again,
    Answer,
    Ask,
    Changed,
    Checked,
    Dragged,
    Failed,
    Lanes,
    Mode,
    Picture,
    Retimed,
    RigRead,
    Simulated,
    Told,
    Whole,
)
from composer.edits.edit import Refusal, apply
from composer.limits.check import check
from composer.load import load_score

DEMOS = Path(scores_demo.__path__[0])

SCORE = """title "Bench"
rig bench.rig.toml
tempo 60

phrase lift 4
  1      full    linear
  4      rest

section one at 1:1
  r.1         lift
  r.2-4       lift   after 2
"""


class Bench:
    """A desk whose messages are kept, with a file of its own."""

    def __init__(self, folder, role, text):
        self.said = []
        self.waiting = 0
        self.file = str(folder / "bench.score")
        self.desk = Desk(role, self.said.append, lambda: self.waiting > 0, lambda: 0.0)
        self.version, self.text = 0, text
        self.desk.hear(Whole(0, self.file, text))

    def work(self, steps=100_000):
        """Work until nothing is left to do; what was said meanwhile, by kind."""
        before = len(self.said)
        while steps and self.desk.work():
            steps -= 1
        return {type(message): message for message in self.said[before:]}

    def change(self, was, now):
        """Change the text; nothing is worked on yet."""
        assert was in self.text
        text = self.text.replace(was, now)
        self.version += 1
        self.desk.hear(Changed(self.version, between(self.text, text)))
        self.text = text

    def ask(self, what, *about):
        """An answer."""
        self.desk.hear(Ask(7, self.version, what, about))
        return self.work()[Answer].value


@pytest.fixture
def bench(tmp_path, small_rig):
    (tmp_path / "bench.rig.toml").write_text(small_rig())

    def make(role=READER, text=SCORE):
        return Bench(tmp_path, role, text)

    return make


def test_a_text_becomes_a_picture_and_then_its_snags(bench):
    one = bench()
    kinds = [type(message) for message in one.said]
    said = one.work()
    kinds = [type(message) for message in one.said if type(message) in (Told, RigRead, Picture, Checked, Lanes)]
    assert kinds == [Told, RigRead, Picture, Checked, Lanes]
    assert said[Told].faults == ()
    assert said[Picture].tracks.fibers == 4
    # The fiber fills at 0.6 of its length a second, so that 0.3 in a second is no snag, and empties at 0.3.
    assert said[Checked].check == check(said[Picture].tracks, said[RigRead].rig, said[RigRead].abilities)


def test_a_half_typed_line_is_told_and_the_last_picture_stays(bench):
    one = bench()
    one.work()
    one.change("r.1         lift", "r.1         li")
    said = one.work()
    assert Picture not in said
    fault = said[Told].faults[0]
    assert (fault.where.line, fault.where.column) == (10, 15)
    assert "'li'" in fault.found
    one.change("r.1         li", "r.1         lift")
    assert Picture in one.work()


def test_names_are_looked_up_although_another_line_is_wrong(bench):
    one = bench()
    one.work()
    one.change("r.2-4       lift   after 2", "nobody      lift\n  r.2 lift aft")
    lines = sorted(fault.where.line for fault in one.work()[Told].faults)
    assert lines == [11, 12]


def test_an_older_text_is_let_go_of_for_a_newer(bench):
    one = bench()
    one.change("tempo 60", "tempo 61")
    one.change("tempo 61", "tempo 62")
    one.work()
    assert [message.version for message in one.said if isinstance(message, Picture)] == [2]


def test_a_rig_is_sent_once_and_again_when_its_file_has_changed(bench, tmp_path, small_rig):
    one = bench()
    one.work()
    one.change("tempo 60", "tempo 80")
    assert RigRead not in one.work()
    (tmp_path / "bench.rig.toml").write_text(small_rig(count=4, channels=8, stroke=0.25))
    one.desk.hear(Again(one.version))
    said = one.work()
    assert said[RigRead].abilities.stroke[0] == pytest.approx(0.25)
    assert said[Picture].rig == said[RigRead].number


def test_an_unreadable_rig_is_told_and_the_last_good_one_is_used(bench, tmp_path):
    one = bench()
    rig = one.work()[RigRead].rig
    (tmp_path / "bench.rig.toml").write_text("[rig]\nname = 3\n")
    one.desk.hear(Again(one.version))
    said = one.work()
    # What is wrong with a line of the rig is told there, what is wrong with all of it where the score names it.
    places = {(Path(fault.where.file).name, fault.where.line) for fault in said[Told].faults}
    assert ("bench.rig.toml", 2) in places
    assert all(name == "bench.rig.toml" or line == 2 for name, line in places)
    assert said[Picture].tracks.fibers == len(rig.fibers)
    (tmp_path / "bench.rig.toml").unlink()
    one.desk.hear(Again(one.version))
    said = one.work()
    assert said[Told].faults[0].where.line == 2
    assert Picture in said


def test_the_files_that_a_score_leans_on_are_named(bench, tmp_path):
    (tmp_path / "water.score").write_text("phrase drop 2\n  1 full\n  2 rest\n")
    one = bench(text=SCORE + "use water.score\n")
    leans = one.work()[Told].leans_on
    assert sorted(Path(file.path).name for file in leans) == ["bench.rig.toml", "water.score"]
    assert all(file.size > 0 for file in leans)


def test_a_drag_answers_with_its_edit_and_what_would_come_of_it(bench):
    one = bench()
    tracks = one.work()[Picture].tracks
    # The first fiber's first move lands at 1 s; it is dragged to 2 s: the line's offset becomes 2.
    answer = one.ask("drag", 0, 2.0, None, Fraction(1, 4), False)
    assert isinstance(answer, Dragged)
    text = apply(one.text, answer.edit)
    assert text == one.text.replace("  1      full", "  2      full")
    assert answer.after.tracks.time_s[1] == pytest.approx(2.0)
    # All four play the phrase, so all four move.
    assert np.sum(np.abs(answer.after.tracks.time_s - tracks.time_s) > 0.5) == 4


def test_a_question_about_a_text_that_cannot_be_read_is_refused_and_one_about_its_words_is_not(bench):
    one = bench()
    one.work()
    one.change("tempo 60", "tempo sixty")
    assert isinstance(one.ask("moved", 10), Refusal)
    assert any(offer.text == "lift" for offer in one.ask("complete", 10, 15))


def test_a_question_of_an_older_text_has_no_answer(bench):
    one = bench()
    one.work()
    one.desk.hear(Ask(1, 0, "moved", (10,)))
    one.change("tempo 60", "tempo 61")
    assert Answer not in one.work()


def test_a_question_that_goes_wrong_takes_nothing_else_with_it(bench):
    one = bench()
    one.desk.hear(Ask(1, 0, "source", ("no fiber", 1.0)))
    said = one.work()
    assert isinstance(said[Answer].value, Refusal)
    assert "fault of its own" in said[Failed].says
    assert Checked in said


def test_the_solver_retimes_what_is_too_fast_and_then_simulates(bench):
    one = bench(SOLVER, SCORE.replace("1      full", "1/4    full"))
    said = one.work()
    retimed = said[Retimed]
    assert retimed.ok
    assert len(retimed.hits) >= 1
    rig = load_score_rig(one)
    assert check(retimed.tracks, rig.rig, rig.abilities).ok
    assert said[Simulated].share == pytest.approx(1.0)


def load_score_rig(one):
    """The score of a bench, from its file."""
    Path(one.file).write_text(one.text)
    return load_score(one.file)


def test_what_is_simulated_follows_what_is_shown(bench):
    one = bench(SOLVER, SCORE.replace("1      full", "1/4    full"))
    assert not one.work()[Simulated].retimed
    one.desk.hear(Mode(True))
    assert one.work()[Simulated].retimed


def test_a_comment_is_no_reason_to_simulate_again(bench):
    one = bench(SOLVER)
    assert Simulated in one.work()
    one.change("tempo 60", "tempo 60  # steady")
    said = one.work()
    assert Retimed in said
    assert Simulated not in said


def test_a_retiming_is_given_up_when_a_newer_text_has_come(bench):
    one = bench(SOLVER, SCORE.replace("1      full", "1/4    full"))
    for _ in range(3):
        one.desk.work()
    one.waiting = 1
    said = one.work()
    assert Retimed not in said
    one.waiting = 0
    one.change("1/4    full", "1/3    full")
    assert one.work()[Retimed].version == 1


def test_estuary_is_read_and_checked_as_the_command_does():
    file = str(DEMOS / "estuary.score")
    said = []
    desk = Desk(READER, said.append, lambda: False, lambda: 0.0)
    desk.hear(Whole(0, file, Path(file).read_text()))
    while desk.work():
        pass
    checked = next(message for message in said if isinstance(message, Checked))
    loaded = load_score(file)
    assert checked.check == check(loaded.tracks, loaded.rig, loaded.abilities)
    told = {fiber for row in checked.rows for fiber in row.fibers}
    assert told == {snag.fiber for snag in checked.check.snags if snag.fiber is not None}
    assert [row.from_s for row in checked.rows] == sorted(row.from_s for row in checked.rows)


def test_pages_are_of_the_text_as_it_is_and_of_the_one_before_only_where_that_cannot_be_read(tmp_path, small_rig, monkeypatch):
    (tmp_path / "bench.rig.toml").write_text(small_rig())
    bench = Bench(tmp_path, SOLVER, SCORE)
    bench.work()
    printed = []
    monkeypatch.setattr(bench.desk.solver, "printed", lambda lines, paper: printed.append(bench.desk.made_text) or b"%PDF")
    bench.change('"Bench"', '"Later"')
    assert bench.ask("print", (), "A4") == b"%PDF"
    bench.change("rig bench", "rig")
    assert bench.ask("print", (), "A4") == b"%PDF"
    assert ['"Later"' in text for text in printed] == [True, True]
