"""What stands behind --to."""

import pytest

from composer.faults import Faults
from composer.limits.abilities import abilities_of
from player.engine.clock import VirtualClock
from player.outputs.board import Board
from player.outputs.file import File
from player.outputs.sim import Sim
from player.outputs.targets import Context, files_of, make_outputs


@pytest.fixture
def outputs(make_rig):
    def make(*texts, boards=1):
        rig = make_rig(4, boards=boards)
        return make_outputs(texts, Context(rig, abilities_of(rig), VirtualClock(), 200.0))

    return make


def said(call, *texts, **more):
    with pytest.raises(Faults) as wrong:
        call(*texts, **more)
    return str(wrong.value)


@pytest.mark.parametrize(
    ("text", "kind", "target"),
    [
        ("sim", Sim, "sim"),
        ("file:a.rec", File, "file:a.rec"),
        ("file:/a=b/c:d.rec", File, "file:/a=b/c:d.rec"),
        ("serial:/dev/ttyACM0", Board, "serial:/dev/ttyACM0@1000000"),
        ("serial:/dev/ttyACM0@115200", Board, "serial:/dev/ttyACM0@115200"),
        ("serial:/dev/by-id/usb@1@2000000", Board, "serial:/dev/by-id/usb@1@2000000"),
        ("main=sim", Sim, "sim"),
        ("main=file:a=b.rec", File, "file:a=b.rec"),
    ],
)
def test_every_scheme_makes_its_output(outputs, text, kind, target):
    (made,) = outputs(text)
    assert isinstance(made, kind) and made.target == target and made.drivers == ("main",)


def test_sim_without_a_driver_stands_for_all_that_are_left(outputs):
    one, other = outputs("sim", "board2=file:a.rec", boards=2)
    assert one.drivers == ("board1",) and other.drivers == ("board2",)
    assert outputs("sim", boards=2)[0].drivers == ("board1", "board2")


def test_a_serial_line_wants_a_driver_where_there_are_several(outputs):
    says = said(outputs, "serial:/dev/ttyACM0", boards=2)
    assert "does not say which driver" in says and "board1=serial:/dev/ttyACM0" in says


def test_a_driver_without_a_target_is_named(outputs):
    assert "no target for driver board2" in said(outputs, "board1=sim", boards=2)


def test_a_driver_that_the_rig_does_not_have_is_named_with_the_nearest(outputs):
    says = said(outputs, "bord1=sim", "board2=sim", boards=2)
    assert "no driver 'bord1'" in says and "did you mean 'board1'?" in says


def test_two_targets_for_one_driver_are_named(outputs):
    assert "has two targets" in said(outputs, "board1=sim", "board1=file:a", "board2=sim", boards=2)
    assert "no driver is left for this target" in said(outputs, "sim", "file:a")


@pytest.mark.parametrize(
    ("text", "says"),
    [
        ("smi", "did you mean 'sim'?"),
        ("", "'' is no target"),
        ("udp:host", "no kind of target 'udp'"),
        ("sim:fast", "'fast' after 'sim'"),
        ("file:", "no path after 'file:'"),
        ("serial:", "no port after 'serial:'"),
        ("serial:@115200", "no port after 'serial:'"),
        ("serial:/dev/x@fast", "a rate of 'fast' baud"),
        ("serial:/dev/x@9600", "expected a whole number from 115200 to 2000000"),
        ("serial:/dev/x@" + "9" * 5000, "baud"),
    ],
)
def test_a_target_written_wrong_is_told_in_words(outputs, text, says):
    assert says in said(outputs, text)


def test_all_wrong_targets_are_told_at_once(outputs):
    says = said(outputs, "smi", "fil:x")
    assert "'smi'" in says and "'fil:x'" in says


def test_the_files_that_targets_would_write_are_listed():
    assert files_of(["sim", "a=file:x.rec", "file:y.rec", "serial:/dev/z"]) == ["x.rec", "y.rec"]
