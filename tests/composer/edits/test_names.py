"""Names of a text as it stands."""

from composer.edits.names import names_of

from .making import text_of


def test_names_are_found_in_a_text_that_cannot_be_read():
    names = names_of(
        ["phrase p 8 # soft", "phrase", "section s at 9:1 tim", 'cue "go" at 9:1', "group g =", "  phrase q", "pin 3:1 ev"]
    )
    assert [(one.name, one.line, one.rest) for one in names.phrases] == [("p", 1, "8")]
    assert [one.name for one in names.sections] == ["s"]
    assert [one.name for one in names.groups] == ["g"]
    assert [one.name for one in names.cues] == ["go"]
    assert dict(names.places) == {"9:1": 'cue "go"', "3:1": "pin"}


def test_in_estuary_they_are_all_there():
    names = names_of(text_of("estuary").split("\n"))
    assert len(names.phrases) == 9
    assert len(names.sections) == 8
    assert len(names.cues) == 6
