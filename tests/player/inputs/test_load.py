from importlib.resources import files

import pytest

from composer.faults import Faults
from composer.load import load_rig, load_score
from player.inputs.load import learn_into, load_map
from player.inputs.model import Control

DEMOS = files("scores_demo")


@pytest.mark.parametrize("name", ["estuary", "gannet"])
def test_the_demo_maps_fit_their_scores(name):
    loaded = load_score(str(DEMOS / f"{name}.score"))
    assert len(load_map(str(DEMOS / f"{name}.map.toml"), loaded.rig, loaded.score).binds) >= 9


@pytest.fixture
def rig(tmp_path, rig_text):
    (tmp_path / "bench.rig.toml").write_text(rig_text)
    return load_rig(tmp_path / "bench.rig.toml")


def test_a_bind_is_learnt_into_a_file_that_may_be_new(tmp_path, rig):
    path = tmp_path / "hand.map.toml"
    assert len(learn_into(path, Control("cc", 21, 1), 'fibers = "r.*"', rig).binds) == 1
    assert len(learn_into(path, Control("cc", 22, 1), 'fibers = "r.1"', rig).binds) == 2
    assert [bind.control.number for bind in load_map(path, rig).binds] == [21, 22]


def test_nothing_is_written_where_the_bind_would_be_wrong(tmp_path, rig):
    path = tmp_path / "hand.map.toml"
    with pytest.raises(Faults, match=r"hand\.map\.toml:3:10: no fiber or group 'reeds'"):
        learn_into(path, Control("cc", 21, 1), 'fibers = "reeds"', rig)
    assert not path.exists()


def test_a_map_that_is_not_there_is_told(tmp_path, rig):
    with pytest.raises(Faults, match="there is no such file"):
        load_map(tmp_path / "none.map.toml", rig)
