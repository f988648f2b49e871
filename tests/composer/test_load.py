from pathlib import Path

import numpy as np
import pytest

from composer.faults import Faults
from composer.load import Loaded, load_rig, load_score

SCORE = """\
title "Reeds"
rig rigs/reeds.rig.toml
use parts/water.score
tempo 120
group low = reed.1-2
pin 1:1 every 2bars until 6:1 within 1/2
pin 3:1
pin 1s within 0.1s
cue "late" at 4:1 wait
cue "early" at 2:1
section a at 1:1
  low gather
"""


@pytest.fixture
def folder(tmp_path: Path, small_rig) -> Path:
    (tmp_path / "rigs").mkdir()
    (tmp_path / "parts").mkdir()
    rig = small_rig(
        title="Reeds", rows=(("reed", "main"),), min_pressure_kPa=300, drive="pressure", tail='[group]\nreeds = ["reed.*"]\n'
    )
    (tmp_path / "rigs" / "reeds.rig.toml").write_text(rig)
    (tmp_path / "parts" / "water.score").write_text("phrase gather\n  2 full\n")
    (tmp_path / "reeds.score").write_text(SCORE)
    return tmp_path


def changed(folder: Path, old: str, new: str) -> Path:
    assert old in SCORE
    (folder / "reeds.score").write_text(SCORE.replace(old, new))
    return folder / "reeds.score"


def faults(path: Path) -> list[str]:
    with pytest.raises(Faults) as caught:
        load_score(path)
    return str(caught.value).split("\n")


def test_a_score_finds_its_rig_and_the_files_it_uses_beside_itself(folder, monkeypatch):
    monkeypatch.chdir(folder.parent)
    loaded = load_score(Path(folder.name) / "reeds.score")
    assert isinstance(loaded, Loaded)
    assert loaded.rig.name == "Reeds" and loaded.tracks.fibers == 4 and loaded.tracks.moves == 2
    assert loaded.tracks.duration_s == 1.0
    # Its phrase came from another file, which has no line of the score.
    assert loaded.tracks.line[1] == 12 and loaded.tracks.phrase_line[1] == 0


def test_pins_are_instants_in_order_and_the_firmer_of_two_counts(folder):
    loaded = load_score(folder / "reeds.score")
    np.testing.assert_allclose(loaded.pins_s, [0.0, 1.0, 4.0, 8.0])
    np.testing.assert_allclose(loaded.pins_give_s, [0.25, 0.1, 0.0, 0.25])


def test_pins_are_repeated_up_to_and_at_their_end(folder):
    loaded = load_score(changed(folder, "until 6:1", "until 7:1"))
    assert loaded.pins_s[-1] == pytest.approx(12.0)


def test_pins_repeated_in_seconds_keep_their_seconds_through_a_ramp(folder):
    path = changed(folder, "pin 3:1\n", "tempo 120 to 60 from 2:1 to 6:1\npin 0s every 0.75s until 12s\n")
    loaded = load_score(path)
    steps = np.arange(17) * 0.75
    assert all(np.abs(loaded.pins_s - step).min() < 1e-12 for step in steps)


def test_more_pins_than_anyone_needs_are_refused_before_they_are_made(folder):
    path = changed(folder, "pin 3:1\n", "pin 1:1 every 0.001s until 1000:1\n")
    assert "at most 100000 pins" in faults(path)[0]


def test_cues_come_in_order_of_time(folder):
    cues = load_score(folder / "reeds.score").cues
    assert [(cue.name, cue.seconds, cue.wait) for cue in cues] == [("early", 2.0, False), ("late", 6.0, True)]


def test_a_missing_rig_is_told_where_the_score_names_it(folder):
    path = changed(folder, "rigs/reeds", "rigs/reds")
    said = faults(path)
    assert said[0].startswith(f"{path}:2:") and "there is no such file" in said[0] and "reds.rig.toml" in said[0]


def test_a_score_without_a_rig_says_so(folder):
    assert "names no rig" in faults(changed(folder, "rig rigs/reeds.rig.toml\n", ""))[0]


def test_faults_of_rig_and_score_come_together(folder):
    rig = folder / "rigs" / "reeds.rig.toml"
    rig.write_text(rig.read_text().replace("stroke = 0.3", "stroke = -1"))
    said = "\n".join(faults(changed(folder, "tempo 120", "tempo 0")))
    assert "reeds.score:4:" in said and "reeds.rig.toml:18:10:" in said


def test_wrong_names_are_told_beside_wrong_numbers(folder):
    changed(folder, "tempo 120", "tempo 0")
    assert len([line for line in faults(folder / "reeds.score") if line.startswith(str(folder))]) == 1
    (folder / "reeds.score").write_text(SCORE.replace("tempo 120", "tempo 0").replace("reed.1-2", "red.1-2"))
    said = "\n".join(faults(folder / "reeds.score"))
    assert "reeds.score:4:" in said and "red.1-2" in said


def test_a_used_file_that_is_missing_is_told_at_its_use(folder):
    said = faults(changed(folder, "parts/water", "parts/watr"))
    assert ":3:" in said[0] and len([line for line in said if line.startswith(str(folder))]) == 1


@pytest.mark.parametrize(
    ("content", "says"), [(b"\xff\xfe\x00", "UTF-16"), (b"title \x00", "binary"), (b"a" * (9 << 20), "more than")]
)
def test_files_that_are_no_scores_are_told_as_what_they_are(folder, content, says):
    (folder / "reeds.score").write_bytes(content)
    assert says in faults(folder / "reeds.score")[0]


def test_a_folder_is_no_score_and_no_rig(folder):
    assert "folder" in faults(folder)[0]
    with pytest.raises(Faults, match="folder"):
        load_rig(folder)


def test_another_rig_can_stand_in(folder):
    rig = load_rig(folder / "rigs" / "reeds.rig.toml")
    path = changed(folder, "rig rigs/reeds.rig.toml", "rig nowhere.rig.toml")
    assert load_score(path, rig).rig is rig


def test_a_score_taken_for_a_rig_is_told_and_the_other_way_round(folder):
    with pytest.raises(Faults, match=r"reeds\.score: this is a score; expected a rig file"):
        load_rig(folder / "reeds.score")
    with pytest.raises(Faults, match=r"reeds\.rig\.toml: this is a rig file; expected a score"):
        load_score(folder / "rigs" / "reeds.rig.toml")
