"""What sections and entries say about keeping and firmness reaches every segment that they make."""

from pathlib import Path

import numpy as np

from composer.load import load_score
from composer.retime.choices import choices_of

DEMOS = Path(__file__).parents[3] / "scores_demo"

SCORE = """rig {rig}
keep clock
phrase up
  1  full
  2  rest
section one at 1:1 firm 2
  reed.1  up
  reed.2  up  firm 3
section two at 3:1 keep rhythm
  reed.1  up
"""


def test_factors_are_multiplied_and_a_sections_own_keep_holds_in_it(tmp_path):
    path = tmp_path / "a.score"
    path.write_text(SCORE.format(rig=f'"{DEMOS / "estuary.rig.toml"}"'))
    loaded = load_score(path)
    firm, rhythm = choices_of(loaded.score, loaded.tracks, "clock")
    line = loaded.tracks.line
    assert {(n, f, r) for n, f, r in zip(line.tolist(), firm.tolist(), rhythm.tolist(), strict=True) if n} == {
        (7, 2.0, False), (8, 6.0, False), (10, 1.0, True),
    }  # fmt: skip
    _, by_rhythm = choices_of(loaded.score, loaded.tracks, "rhythm")
    assert np.all(by_rhythm)
