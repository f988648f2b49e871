"""`drawcord fit` as it is called."""

import json
import tomllib
from importlib.resources import files

import pytest

from player.commands.main import run

DEMO = str(files("scores_demo") / "reed-bench.csv")
RIG = str(files("scores_demo") / "estuary.rig.toml")


@pytest.fixture
def short(tmp_path):
    """The slow part of the demo bench, every tenth row: quick to fit."""
    lines = (files("scores_demo") / "reed-bench.csv").read_text(encoding="utf-8").splitlines()
    header = next(number for number, line in enumerate(lines) if line.startswith("time_s"))
    path = tmp_path / "short.csv"
    path.write_text("\n".join([*lines[: header + 1], *lines[header + 1 : header + 3700 : 10]]) + "\n", encoding="utf-8")
    return path


def test_the_demo_bench_gives_the_table_of_its_reed(capsys):
    assert run(["fit", DEMO, "--type", "reed"]) == 0
    table = tomllib.loads(capsys.readouterr().out)["fiber_type"]["reed"]
    assert table["shear_modulus_kPa"] == pytest.approx(250.0, rel=0.01)
    assert table["friction_fraction"] == pytest.approx(0.04, rel=0.05)
    assert table["settle_ms"] == pytest.approx(15.0, rel=0.05)


def test_the_picture_and_the_table_are_written_and_named(short, tmp_path, capsys):
    png, table = tmp_path / "fit.png", tmp_path / "reed.toml"
    assert run(["fit", str(short), "--type", "reed", "--png", str(png), "-o", str(table)]) == 0
    assert png.read_bytes().startswith(b"\x89PNG\r\n\x1a\n") and len(png.read_bytes()) > 20_000
    assert tomllib.loads(table.read_text(encoding="utf-8"))["fiber_type"]["reed"]["kind"] == "contractile"
    out = capsys.readouterr().out
    assert f"written: {table}" in out and f"written: {png}" in out and "fitted from short.csv" in out


def test_a_rig_fills_in_what_no_bench_tells(short, capsys):
    assert run(["fit", str(short), "--type", "reed", "--rig", RIG]) == 0
    table = tomllib.loads(capsys.readouterr().out)["fiber_type"]["reed"]
    assert table["max_pressure_kPa"] == 450 and table["rated_cycles"] == 200_000


def test_json_is_one_object_and_nothing_else(short, capsys):
    assert run(["fit", str(short), "--type", "reed", "--json"]) == 0
    report = json.loads(capsys.readouterr().out)
    assert report["type"] == "reed" and len(report["parameters"]) == 5


@pytest.mark.parametrize(
    "change, says",
    [
        (lambda text: text.replace("pressure_kPa", "presure_kPa"), "is 'presure_kPa' meant?"),
        (lambda text: text.replace("\n0.050,", "\n0.000,"), "time"),
        (lambda text: text[:1200], "at least 50"),
        (lambda text: "\0" + text, "binary"),
    ],
)
def test_a_bad_bench_ends_with_2_and_nothing_written(short, tmp_path, capsys, change, says):
    short.write_text(change(short.read_text(encoding="utf-8")), encoding="utf-8")
    before = sorted(tmp_path.iterdir())
    assert run(["fit", str(short), "--type", "reed", "--png", str(tmp_path / "x.png"), "-o", str(tmp_path / "x.toml")]) == 2
    out, err = capsys.readouterr()
    assert out == "" and says in err and "Traceback" not in err
    assert sorted(tmp_path.iterdir()) == before


def test_an_output_over_the_bench_is_refused(short, capsys):
    was = short.read_bytes()
    assert run(["fit", str(short), "--type", "reed", "-o", str(short)]) == 2
    assert short.read_bytes() == was and "would write over" in capsys.readouterr().err


def test_an_output_that_cannot_be_written_is_told_before_the_work(short, tmp_path, capsys):
    assert run(["fit", str(short), "--type", "reed", "--png", str(tmp_path / "no" / "x.png")]) == 2
    assert "there is no folder" in capsys.readouterr().err


def test_a_load_out_of_range_is_refused(short, capsys):
    assert run(["fit", str(short), "--type", "reed", "--load", "-1"]) == 2
    assert "out of range" in capsys.readouterr().err
