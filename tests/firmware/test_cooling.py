"""The cooling model: never a word about a healthy board, and an early one about a loose thermistor or a dead fan.

The sink that it is tried on is one of its own (sink.py), in floating point.
"""

from __future__ import annotations

from typing import Any

import pytest

from sinkwright.guard_image import HEATSINK_STEPS
from tests.firmware.running import on_32_bit_board, on_board
from tests.firmware.sink import SINK, shipped_image

TOO_WARM, TOO_COLD = 1, 2

#: Power over time that moves the bounds most: for ever, half a minute on and off, half an hour and then a little, and
#: the ways of a hot start.
POWERS = {
    "all the time": "40.0",
    "by turns": "40.0 if t % 60.0 < 30.0 else 0.0",
    "rarely": "40.0 if t % 900.0 < 90.0 else 1.0",
    "then little": "40.0 if t < 900.0 else 3.0",
    "a little": "8.0",
}


@pytest.mark.parametrize("name", POWERS)
def test_a_healthy_board_never_trips_over_its_whole_range(name: str) -> None:
    """Resistance and capacity at both ends, air, a warm start, and a fan that runs always or by the temperature."""
    found: list[Any] = on_board(f"""{SINK}
        entry = {shipped_image()}["cooling"]
        found = []
        for resistance in (K_per_W / 1.29, K_per_W, K_per_W * 1.29):
            for capacity in (J_per_K / 1.29, J_per_K * 1.29):
                for still in (1.0, 5.0):
                    for air, warm in ((11.0, 0.0), (11.0, 40.0), (24.0, 20.0), (40.0, 0.0)):
                        if 40.0 * resistance + air > 85.0:
                            continue
                        sink = Sink(resistance, capacity, still, air, warm)
                        seen = watch(Cooling(entry), sink, lambda t: {POWERS[name]}, 0, 1200)
                        if seen:
                            found.append([resistance, capacity, still, air, warm, seen])
    """)
    assert found == []


def test_air_that_warms_and_cools_with_the_weather_does_not_trip() -> None:
    """Eight kelvin in an hour, up and down, at the weakest healthy cooling and at the best."""
    found = on_board(f"""{SINK}
        entry = {shipped_image()}["cooling"]
        found = []
        for resistance, sign in ((1.29, 1), (1.29, -1), (0.78, 1), (0.78, -1)):
            sink = Sink(resistance * K_per_W, J_per_K, 1.0, 22.0)
            cooling = Cooling(entry)
            def power_at(t):
                sink.air = 22.0 + sign * 8.0 * min(t, 3600.0) / 3600.0
                return 30.0
            found.append(watch(cooling, sink, power_at, 0, 5400))
    """)
    assert found == [None] * 4


@pytest.mark.parametrize(("power_W", "within_s"), [(40, 12), (20, 20), (10, 20)])
def test_a_thermistor_that_falls_off_a_warm_sink_is_noticed_within_seconds(
    power_W: int, within_s: int
) -> None:
    found = on_board(f"""{SINK}
        sink = Sink()
        cooling = Cooling({shipped_image()}["cooling"])
        before = watch(cooling, sink, lambda t: {power_W}.0, 0, 1200)
        sink.loose = sink.air + sink.rise
        found = [before, watch(cooling, sink, lambda t: {power_W}.0, 1200, 1800)]
    """)
    before, (seen, at_s, heatsink_degC, bound_degC) = found
    assert before is None
    assert seen == TOO_COLD
    assert at_s < 1200 + within_s
    assert heatsink_degC < bound_degC


@pytest.mark.parametrize(("power_W", "idle_s", "within_s"), [(40, 5, 300), (30, 600, 380), (20, 3600, 170)])
def test_a_thermistor_loose_from_the_start_is_noticed_as_the_power_adds_up(
    power_W: int, idle_s: int, within_s: int
) -> None:
    """At power-up the sink might still be warm from before; the longer it idled, the less that can be."""
    found = on_board(f"""{SINK}
        sink = Sink()
        sink.loose = 24.0
        found = watch(Cooling({shipped_image()}["cooling"]), sink,
                      lambda t: {power_W}.0 if t > {idle_s} else 0.0, 0, {idle_s} + 1800)
    """)
    assert found[0] == TOO_COLD
    assert found[1] < idle_s + within_s


@pytest.mark.parametrize(("power_W", "hottest_degC"), [(40, 82.0), (20, 66.0), (10, 55.0)])
def test_a_fan_that_never_runs_is_noticed_before_the_sink_is_hot(power_W: int, hottest_degC: float) -> None:
    """The limit is 85 degC; five times the resistance is what still air does to a sink that needs a fan."""
    found = on_board(f"""{SINK}
        sink = Sink()
        sink.fan_dead = True
        found = watch(Cooling({shipped_image()}["cooling"]), sink, lambda t: {power_W}.0, 0, 3600)
    """)
    assert found[0] == TOO_WARM
    assert found[2] < hottest_degC
    assert found[3] < found[2]


def test_a_fan_that_stops_in_a_long_run_is_noticed() -> None:
    """The load derates as the sink gets hot, so that less power than before keeps it hot: that is what is told."""
    found = on_board(f"""{SINK}
        sink = Sink()
        cooling = Cooling({shipped_image()}["cooling"])
        derated = lambda t: min(40.0, max(0.0, 4.0 * (85.0 - sink.air - sink.rise)))
        before = watch(cooling, sink, derated, 0, 3600)
        sink.fan_dead = True
        found = [before, watch(cooling, sink, derated, 3600, 7200), sink.air + sink.rise]
    """)
    before, (seen, at_s, _, _), heatsink_degC = found
    assert before is None
    assert seen == TOO_WARM
    assert at_s < 3600 + 600
    assert heatsink_degC < 85


def test_what_was_put_right_is_accepted_and_then_judged_anew() -> None:
    found = on_board(f"""{SINK}
        sink = Sink()
        cooling = Cooling({shipped_image()}["cooling"])
        full = lambda t: 40.0
        watch(cooling, sink, full, 0, 1200)
        sink.loose = sink.air + sink.rise
        loose = watch(cooling, sink, full, 1200, 1800)
        sink.loose = None
        cooling.accept(sink.step(0.0))
        found = [loose[0], watch(cooling, sink, full, 1800, 5400)]
    """)
    assert found == [TOO_COLD, None]


def test_one_odd_reading_is_not_believed() -> None:
    found = on_board(f"""{SINK}
        cooling = Cooling({shipped_image()}["cooling"])
        for _ in range(100):
            cooling.step(40_000, 0, 0)
        cooling.step(20_000, 0, 0)
        seen = [cooling.seen, cooling.confirmed()]
        cooling.step(40_000, 0, 0)
        found = [seen, cooling.seen]
    """)
    assert found == [[TOO_COLD, 0], 0]


def test_the_schedule_reads_the_heatsink_as_often_as_the_image_was_made_for() -> None:
    found = on_board("""
        import control
        schedule = Session().firmware.control._input_at
        found = [len(schedule), list(schedule).count(IMAGE["adc"]["inputs"]["heatsink"])]
    """)
    assert found == [HEATSINK_STEPS, 1]


def test_the_model_stays_within_31_bits_at_the_ends_of_its_range() -> None:
    """150 degC and -40 degC by turns, with the largest power that a pair can show."""
    found = on_32_bit_board(f"""
        from cooling import Cooling
        entries = [{shipped_image()}["cooling"]]
        large = {{"r_mK_per_W": 500_000, "warm": [8191, 0], "cool": [8191, 0]}}
        small = {{"r_mK_per_W": 1, "warm": [4096, 22], "cool": [4096, 22]}}
        for most, still, least in ((large, large, large), (large, large, small), (small, small, small)):
            entries.append({{"most": most, "still": still, "least": least,
                            "drift_uK": 60_000, "allowance_mK": 6_000, "coldest_mC": -20_000}})
        found = []
        def run(cooling):
            for _ in range(300):
                cooling.step(150_000, 960_000, 960_000)
                cooling.step(-40_000, 0, 0)
            for _ in range(300):
                cooling.step(-40_000, 960_000, 0)
            cooling.accept(150_000)
            for _ in range(300):
                cooling.step(150_000, 0, 0)
            cooling.confirmed()
        for entry in entries:
            cooling = Cooling(entry)
            run(cooling)
            micropython.heap_lock()
            try:
                run(cooling)
                found.append(True)
            except MemoryError:
                found.append(False)
            micropython.heap_unlock()
    """)
    assert found == [True] * 4
