import os
import time

import pytest

from player.outputs.serial_bench import BenchProcess


@pytest.fixture
def bench(make_rig):
    one = BenchProcess(make_rig(count=2, air_mL=100.0, compressor_L_min=0.01), "main", "railed")
    one.start()
    yield one
    one.close()
    one.close()


def until(reads, seconds=20.0):
    end = time.monotonic() + seconds
    while not reads() and time.monotonic() < end:
        time.sleep(0.01)
    return reads()


def test_fibers_move_in_a_process_of_their_own(bench):
    assert (bench.channels, bench.drives, bench.strain(0, 2)) == (2, ("strain", "strain"), [0, 0])
    assert bench.supply() == 8000
    bench.set_valves(1, [65535])
    assert until(lambda: bench.strain(0, 2) == [0, 65535])
    assert bench.supply() < 8000
    bench.set_valves(0, [0, 0])
    assert until(lambda: bench.strain(0, 2) == [0, 0])


def test_a_mishap_of_the_rig_happens_when_it_strikes(bench):
    assert bench.strain(0, 1) == [0]
    bench.strike()
    assert until(lambda: bench.strain(0, 1) == [65535])


def test_the_process_ends_with_its_board(bench):
    process = bench._process.pid
    bench.close()
    assert until(lambda: not os.path.exists(f"/proc/{process}")) or bench._process.exitcode is not None
