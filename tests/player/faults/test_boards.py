"""Rows of the table of faults in which a board or its line goes wrong, done for real."""

import json
import os
import signal

import pytest

from player.engine.fault_table import ROWS

LASTS = {"stuck-valve": 8, "leak": 8, "railed": 4}
"""Counts of half a second that the score lasts, where that is not what it is for most."""
AFTER_S = {"stuck-valve": 0.15, "railed": 0.1}
REFUSED = [name for name, row in ROWS.items() if row.mishap and row.exit == 2]
ARMED = [name for name, row in ROWS.items() if row.mishap and row.exit != 2]
LATER = {name for name in ARMED if ROWS[name].exit} - {"queue-full", *LASTS}


def begun(make_stage, name):
    """A stage on which a mishap is on its way, and the player that is to meet it."""
    stage = make_stage(name)
    stage.score(LASTS.get(name, 6 if name in LATER else 3))
    stage.board(ROWS[name].mishap, AFTER_S.get(name, 0.6))
    return stage, stage.play()


@pytest.mark.parametrize("names", [ARMED[n : n + 2] for n in range(0, len(ARMED), 2)], ids="+".join)
def test_a_board_that_goes_wrong_ends_the_run_as_the_table_says(make_stage, whole, ended_as, names):
    # Two at once: a run is mostly waiting.
    for name, (stage, playing) in [(name, begun(make_stage, name)) for name in names]:
        told = ended_as(stage, ROWS[name], playing)
        kept = whole(stage.folder / "run.log")
        assert {"head", "set", "sense", "state", "end"} <= {record.kind for record in kept}
        assert kept[-1].kind == "end"
        # Whatever was sent is in the log.
        assert sum(record.kind == "set" for record in kept) >= told["outputs"][0]["sets"] > 0


def test_a_board_that_is_not_as_it_should_be_is_not_armed_and_nothing_moves(make_stage, ended_as):
    for name, (stage, playing) in [(name, begun(make_stage, name)) for name in REFUSED]:
        assert ended_as(stage, ROWS[name], playing) is None
        assert not any(" to armed" in status for status in stage.statuses())
        assert not any(row["event"] == "set" for row in stage.rows())


def test_a_board_that_is_unplugged_ends_the_run_at_rest(stage, moving, whole):
    row = ROWS["unplugged"]
    stage.score(6)
    stage.board()
    playing = stage.play()
    moving()
    os.kill(stage.device._process.pid, signal.SIGKILL)
    out, err = playing.communicate(timeout=60)
    assert playing.returncode == row.exit, (out, err)
    told = json.loads(out)
    assert (told["state"], told["ended"]) == (row.state, row.ended)
    assert any(row.told in fault["say"] and row.then in fault["say"] for fault in told["faults"])
    assert told["outputs"][0]["sets"] > 0 and whole()[-1].kind == "end"
