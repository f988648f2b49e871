import pytest

from composer.limits.abilities import abilities_of
from player.wire.simulated import Bench


def bench(make_rig, **rig):
    made = make_rig(**rig)
    return Bench(made, abilities_of(made), made.drivers[0].name)


def hold(bench, seconds, step_s=0.002):
    for _ in range(round(seconds / step_s)):
        bench.step(step_s)


def test_a_full_number_moves_its_fiber_to_full_stroke_no_faster_than_it_can(make_rig):
    one = bench(make_rig, count=3, stroke=0.3, fill=0.6)
    one.set_valves(1, [65535])
    hold(one, 0.258)
    # A stroke of 0.3 at 0.6 1/s takes 0.5 s, and the valve 8 ms to answer: half of it after half the time.
    assert one.strain(0, 3)[1] == pytest.approx(32768, abs=300)
    hold(one, 0.5)
    assert one.strain(0, 3) == [0, 65535, 0]


def test_a_board_moves_its_own_fibers_and_no_others(make_rig):
    rig = make_rig(count=4, boards=2)
    second = Bench(rig, abilities_of(rig), "board2")
    second.set_valves(0, [65535, 0])
    hold(second, 1.0)
    assert second.strain(0, 2) == [65535, 0]
    assert second._rig.strain.tolist() == pytest.approx([0.0, 0.0, 0.3, 0.0])


def test_vented_valves_of_every_drive_bring_fibers_back_to_rest(make_rig):
    for drive, full in (("strain", 65535), ("pressure", 65535), ("valve", 65535)):
        one = bench(make_rig, count=2, drive=drive)
        assert one.drives == (drive, drive)
        one.set_valves(0, [full, full])
        hold(one, 1.0)
        assert one.strain(0, 2) == [65535, 65535]
        one.set_valves(0, [0, 0])
        hold(one, 1.5)
        assert one.strain(0, 2) == [0, 0]


def test_a_valve_that_is_shut_holds_its_fiber(make_rig):
    one = bench(make_rig, count=1, drive="valve")
    one.set_valves(0, [65535])
    hold(one, 0.25)
    one.set_valves(0, [32768])
    hold(one, 0.1)
    held = one.strain(0, 1)
    hold(one, 1.0)
    assert one.strain(0, 1) == held
    assert 0 < held[0] < 65535


def test_the_supply_is_read_in_tenths_of_a_kilopascal(make_rig):
    assert bench(make_rig, max_receiver_kPa=800.0).supply() == 8000


def test_a_supply_that_runs_low_reads_below_the_rigs_least(make_rig):
    one = bench(make_rig, min_pressure_kPa=450.0)
    one.low_supply = True
    assert one.supply() == 3600


def test_a_stuck_valve_keeps_its_number_whatever_is_sent(make_rig):
    one = bench(make_rig, count=2)
    one.set_valves(0, [40000, 40000])
    hold(one, 1.0)
    one.stuck[0] = 40000
    one.set_valves(0, [0, 0])
    hold(one, 1.5)
    assert one.strain(0, 2)[0] == pytest.approx(40000, abs=2)
    assert one.strain(0, 2)[1] == 0


def test_a_railed_sensor_reads_full_and_a_leak_halves_in_a_second(make_rig):
    one = bench(make_rig, count=2)
    one.set_valves(0, [65535, 0])
    hold(one, 1.0)
    one.leaking[0] = 1.0
    one.railed.add(1)
    hold(one, 1.0)
    assert one.strain(0, 2) == [pytest.approx(32768, abs=50), 65535]
