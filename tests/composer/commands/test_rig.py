import json

import pytest

from player.commands.main import run

from ..fiber.makes import CORD
from ..fiber.rigs import rig_of


@pytest.fixture
def rig(tmp_path):
    path = tmp_path / "bench.rig.toml"
    path.write_text(rig_of("contractile", CORD, count=4))
    return path


def test_the_table_comes_by_itself(rig, capsys):
    assert run(["rig", str(rig)]) == 0
    said = capsys.readouterr()
    assert "reed.1-4" in said.out
    assert said.err == ""


def test_json_is_one_object_and_nothing_else(rig, capsys):
    assert run(["rig", str(rig), "--json"]) == 0
    assert json.loads(capsys.readouterr().out)["rig"] == str(rig)


def test_the_picture_is_a_png_of_its_size(rig, tmp_path, capsys):
    picture = tmp_path / "rig.png"
    assert run(["rig", str(rig), "--png", str(picture)]) == 0
    data = picture.read_bytes()
    assert data[:8] == b"\x89PNG\r\n\x1a\n"
    assert int.from_bytes(data[16:20], "big") == 1600
    assert f"written: {picture}" in capsys.readouterr().out


def test_with_json_the_picture_is_written_in_silence(rig, tmp_path, capsys):
    picture = tmp_path / "rig.png"
    assert run(["rig", str(rig), "--json", "--png", str(picture)]) == 0
    json.loads(capsys.readouterr().out)
    assert picture.exists()


def test_a_picture_is_never_written_over_the_rig(rig, capsys):
    was = rig.read_bytes()
    assert run(["rig", str(rig), "--png", str(rig)]) == 2
    assert "ends in '.toml'; expected .png" in capsys.readouterr().err
    named_as_one = rig.with_name("rig.png")
    rig.rename(named_as_one)
    assert run(["rig", str(named_as_one), "--png", str(named_as_one)]) == 2
    assert "--png would write over the rig" in capsys.readouterr().err
    assert named_as_one.read_bytes() == was


def test_a_rig_with_faults_ends_in_2_and_writes_nothing(rig, tmp_path, capsys):
    rig.write_text(rig.read_text().replace("load_N = 1.5", "load_N = 150"))
    assert run(["rig", str(rig), "--png", str(tmp_path / "rig.png")]) == 2
    said = capsys.readouterr()
    assert said.out == ""
    assert "a load of 150 N needs" in said.err
    assert not (tmp_path / "rig.png").exists()


def test_a_rig_that_is_not_there_ends_in_2(tmp_path, capsys):
    assert run(["rig", str(tmp_path / "none.rig.toml")]) == 2
    assert "none.rig.toml" in capsys.readouterr().err
