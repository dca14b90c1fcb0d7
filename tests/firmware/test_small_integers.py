"""The control step on an interpreter with 31-bit small integers: no intermediate may pass 2**30.

A larger integer is right, but it comes from the heap: the step would allocate. Every value is tried under
heap_lock, where such an allocation raises MemoryError. The values are the largest that a board file, a converter's
code or a month of waiting can bring about.
"""

from __future__ import annotations

from pathlib import Path
from textwrap import dedent
from typing import Any

import pytest

from tests.firmware.heap_check import ARRANGEMENTS, MEM_ALLOC, heap_check
from tests.firmware.running import on_32_bit_board
from tests.support import micropython32

SMALL = 2**30
LARGEST_VOLTAGE_uV = 80_000_000
LARGEST_CURRENT_uA = 12_000_000
CODES = (-32768, -32767, -1, 0, 1, 800, 32766, 32767)

# The firmware is called with its arguments one by one: a call with * would itself allocate.
WATCH = """
    def stays_small(call, times):
        micropython.heap_lock()
        try:
            for _ in range(times):
                call()
            small = True
        except MemoryError:
            small = False
        micropython.heap_unlock()
        return small
    def one_step():
        firmware.time.wait()
        firmware.control.step()
    def passing(call, tries):
        beyond = []
        for first, second in tries:
            micropython.heap_lock()
            try:
                call(first, second)
                small = True
            except MemoryError:
                small = False
            micropython.heap_unlock()
            if not small:
                beyond.append([first, second])
        return beyond
"""


def watched(lines: str) -> Any:
    """Carry out `lines`, which may use the functions above, and return what they found."""
    return on_32_bit_board(dedent(WATCH) + dedent(lines))


def beyond_small(call: str, tries: list[tuple[int, int]]) -> Any:
    """Those of `tries` at which `call`, lines that define call(first, second), needed more than a small integer."""
    return watched(f"{dedent(call)}\nfound = passing(call, {tries!r})\n")


def scale_entry(zero_counts: int, largest: int) -> dict[str, int]:
    """The steepest scale that main allows: its reading at code -32768 is just below `largest`."""
    whole, part = divmod((largest - 1) * 2**14 // (32768 + zero_counts), 2**14)
    return {"zero_counts": zero_counts, "whole": whole, "part": part}


def largest_image() -> dict[str, Any]:
    """A board at the end of every range that the host's board file and the firmware's own check allow."""
    return {
        "period_us": 20_000,
        "dac": {
            "part": "MCP4725", "address": 0x60, "zero_code": 124, "uA_per_code_x64": 2**30 // 4096, "full_code": 4095,
        },
        "scales": {
            "current": scale_entry(800, LARGEST_CURRENT_uA),
            "voltage": scale_entry(800, LARGEST_VOLTAGE_uV),
            "force": scale_entry(800, LARGEST_VOLTAGE_uV),
        },
        "thermal": {"stages": [{"r_mK_per_W": 20_000, "every_steps": 2, "share_x32768": 32768}] * 7},
        "limits": {
            "current_uA": 16_000_000,
            "voltage_uV": 60_000_000,
            "power_uW": 400_000_000,
            "heatsink_mC": 120_000,
            "junction_mC": 175_000,
            "slew_uA_per_ms": 1_000_000,
            "silence_ms": 60_000,
        },
        "zero_budget_uA": 5_000_000,
        "off_current_uA": 5_000_000,
        "demand_margin_uA": 5_000_000,
        "hard_counts": {"current": 32_767, "voltage": 32_767, "force": 32_767, "heatsink": 0},
        "sense": {"fixed_uV": 40_000_000, "share_x1024": 400, "lead_mohm": 10_000, "short_mohm": 12_000},
    }  # fmt: skip


# -- the interpreter -------------------------------------------------------------------------------------------------


def test_this_interpreter_has_31_bit_small_integers() -> None:
    """2**30 - 1 and -2**30 are small and cost nothing; one further comes from the heap."""
    call = """
    def call(value, change):
        return value + change
    """
    tries = [(SMALL - 2, 1), (SMALL - 1, 1), (1 - SMALL, -1), (-SMALL // 2 * 2 + 1, -2)]
    assert beyond_small(call, tries) == [[SMALL - 1, 1], [1 - SMALL, -2]]


def test_one_integer_beyond_31_bits_shows_in_the_memory_figure() -> None:
    found = on_32_bit_board("""
        def growth(change):
            value = 0x3FFFFFFF
            before = gc.mem_alloc()
            value = value + change
            return gc.mem_alloc() - before
        found = [growth(0), growth(1)]
    """)
    assert found[0] == 0
    assert found[1] > 0


def test_an_interpreter_that_cannot_be_had_fails_the_test_in_words(
    monkeypatch: pytest.MonkeyPatch, tmp_path: Path
) -> None:
    """Port 9 is the discard service, which nobody runs; never skipped means that this is what one sees."""
    monkeypatch.setenv("XDG_CACHE_HOME", str(tmp_path))
    monkeypatch.setenv("npm_config_cache", str(tmp_path / "npm"))
    monkeypatch.setenv("npm_config_registry", "http://127.0.0.1:9/")
    monkeypatch.setenv("npm_config_fetch_retries", "0")
    with pytest.raises(micropython32.InterpreterMissing, match="could not be fetched"):
        micropython32.interpreter.__wrapped__()


# -- the whole step --------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("name", ARRANGEMENTS)
def test_the_control_step_allocates_nothing_with_31_bit_integers(name: str) -> None:
    allocated, _, _ = on_32_bit_board(heap_check(ARRANGEMENTS[name], figure=MEM_ALLOC))
    assert allocated == 0


def test_the_check_would_notice_an_integer_beyond_31_bits() -> None:
    """The check itself is checked: a product that a 64-bit small integer would hold is found out."""
    found = watched("""
        session = Session()
        session.sink(1_000_000)
        drive = session.firmware.control._drive
        def drive_and_multiply():
            drive()
            return session.firmware.control.demand_uA * 30_000
        session.firmware.control._drive = drive_and_multiply
        firmware = session.firmware
        found = stays_small(one_step, 1)
    """)
    assert found is False


@pytest.mark.parametrize("sinking", [True, False], ids=["sinking", "off"])
@pytest.mark.parametrize("stall_us", [0, 45_000], ids=["in time", "late"])
def test_a_board_at_the_end_of_every_range_keeps_the_step_small(sinking: bool, stall_us: int) -> None:
    """Every pair of extreme codes, from a fresh start, with the set-point at the end of the range."""
    found = watched(f"""
        session = Session(**{largest_image()!r})
        firmware = session.firmware
        counts = session.board.bus.counts
        found = []
        for current in {CODES!r}:
            for voltage in {CODES!r}:
                counts[:] = [800, 800, 800, 13200]
                firmware.guard.fault = 0
                firmware.machine.state = wire.STATE_OFF
                for _ in range(12):
                    one_step()
                if {sinking}:
                    firmware.control.ask(firmware.guard.limits.current_uA)
                    firmware.meter.restart()
                    firmware.control.start()
                    firmware.guard.quiet_steps = 0
                    firmware.machine.fire(0)
                counts[:] = [current, voltage, voltage, 13200]
                session.board.clock.stall_us = {stall_us}
                if not stays_small(one_step, 140):
                    found.append([current, voltage])
    """)
    assert found == []


def test_a_month_without_a_reset_of_any_counter_keeps_the_step_small() -> None:
    """2**30 steps pass in 29 days: what counts steps must stop somewhere."""
    found = watched("""
        found = []
        for name in ("guard.quiet_steps", "guard.not_ready", "guard._off_readings",
                     "control._short_pairs", "meter.telemetry.pairs", "meter.log.pairs"):
            session = Session()
            session.sink(1_000_000)
            firmware = session.firmware
            if name == "guard.not_ready":
                session.board.bus.ready = False
            if name == "guard._off_readings":
                session.ask(wire.DISABLE)
                session.turns(12)
                session.board.show(2_000_000, 12_000_000)
            if name == "control._short_pairs":
                session.board.show(100_000, 50_000)
            if name != "guard.quiet_steps":
                firmware.guard.quiet_steps = -10_000
            part = firmware
            for step in name.split(".")[:-1]:
                part = getattr(part, step)
            setattr(part, name.split(".")[-1], 0x3FFFFFFF)
            if not stays_small(one_step, 12):
                found.append(name)
    """)
    assert found == []


def test_steps_without_a_pair_are_counted_no_further_than_a_pair_can_stand_for() -> None:
    steps = on_32_bit_board("""
        session = Session()
        session.board.bus.ready = False
        session.turns(100)
        found = session.firmware.meter.steps
    """)
    assert steps == 8


# -- its parts -------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("zero_counts", [0, 800, 16_000, 32_767])
@pytest.mark.parametrize("largest", [LARGEST_CURRENT_uA, LARGEST_VOLTAGE_uV])
def test_the_steepest_scale_reads_every_code_small(zero_counts: int, largest: int) -> None:
    entry = scale_entry(zero_counts, largest)
    reading = f"""
    from scaling import Scale
    scale = Scale({entry!r})
    assert scale.largest() <= {largest}
    def call(counts, _):
        scale.reading(counts)
    """
    assert beyond_small(reading, [(counts, 0) for counts in (*CODES, zero_counts)]) == []
    # A flat scale with the largest part: its product has the most bits.
    flat = reading.replace(repr(entry), repr({"zero_counts": zero_counts, "whole": 1, "part": 2**14 - 1}))
    assert beyond_small(flat, [(counts, 0) for counts in CODES]) == []


def test_the_widest_converter_takes_every_demand_small() -> None:
    code = f"""
    from scaling import Demand
    demand = Demand({largest_image()["dac"]!r})
    def call(current_uA, _):
        demand.code(current_uA)
    """
    assert beyond_small(code, [(a, 0) for a in (1 - SMALL, -16_777_216, -1, 0, 16_777_216, SMALL - 1)]) == []


def test_the_longest_segment_of_a_thermistor_is_read_small() -> None:
    """The host's table has segments shorter than 2**12 counts and 2**17 mC."""
    table = {"counts": [1000, 5095], "mC": [131_071, 0], "open_counts": 26_000, "short_counts": 500}
    reading = f"""
    from scaling import Thermistor
    thermistor = Thermistor({table!r})
    def call(counts, _):
        thermistor.reading(counts)
    """
    assert beyond_small(reading, [(counts, 0) for counts in (*CODES, 1000, 3000, 5094, 5095)]) == []


STAGES = {
    "one that jumps at once": [(20_000, 2, 32768)],
    "seven of the same size": [(20_000, 2, 32768)] * 7,
    "the smallest": [(1, 2, 32768)],
    "slow ones": [(300, 2, 32470), (700, 4, 9000), (500, 8, 700), (20_000, 512, 128)],
}


@pytest.mark.parametrize("name", STAGES)
def test_the_junction_jumps_by_400_kelvin_and_back_small(name: str) -> None:
    keys = ("r_mK_per_W", "every_steps", "share_x32768")
    stages = [dict(zip(keys, stage, strict=True)) for stage in STAGES[name]]
    step = f"""
    from thermal import Junction
    junction = Junction({stages!r})
    def call(power_mW, steps):
        for _ in range(steps):
            junction.step(power_mW)
    """
    powers_mW = (0, 960_000, -960_000, SMALL - 1, 0, SMALL - 1, 1 - SMALL, 1)
    assert beyond_small(step, [(power_mW, 600) for power_mW in powers_mW]) == []


BOUNDS_uV = (-LARGEST_VOLTAGE_uV, -79_999_999, -1001, -1, 0, 999, 79_999_999, LARGEST_VOLTAGE_uV)
BOUNDS_uA = (-LARGEST_CURRENT_uA, -11_999_999, -1001, -1, 0, 999, 11_999_999, LARGEST_CURRENT_uA)


def test_power_at_the_bounds_of_both_readings_is_small() -> None:
    power = """
    from meter import power_uW as call
    """
    assert beyond_small(power, [(v, a) for v in BOUNDS_uV for a in BOUNDS_uA]) == []


@pytest.mark.parametrize("steps", [1, 3, 8])
def test_charge_and_energy_take_every_pair_small(steps: int) -> None:
    """Also with the low limb full, and a current that a zero out of budget doubled."""
    pair = f"""
    from meter import Meter
    meter = Meter(20_000)
    def call(voltage_uV, current_uA):
        for _ in range(2):
            meter.steps = {steps}
            meter.counting = True
            meter.charge.low = meter.energy.low = (1 << 26) - 1
            meter.take_current(current_uA)
            meter.take_voltage(voltage_uV)
    """
    currents_uA = (*BOUNDS_uA, 2 * LARGEST_CURRENT_uA, -2 * LARGEST_CURRENT_uA)
    assert beyond_small(pair, [(v, a) for v in BOUNDS_uV for a in currents_uA]) == []


def test_a_window_that_nobody_reads_takes_every_pair_small() -> None:
    """A board that is never asked for telemetry, or whose log has grown wide, gathers for days."""
    window = """
    from meter import Window
    window = Window()
    def call(voltage_uV, current_uA):
        for _ in range(40_000):
            window.add(voltage_uV, voltage_uV, current_uA)
    """
    assert beyond_small(window, [(LARGEST_VOLTAGE_uV, LARGEST_CURRENT_uA)] * 4) == []
    assert beyond_small(window, [(-LARGEST_VOLTAGE_uV, -LARGEST_CURRENT_uA)] * 4) == []


def test_limits_that_the_host_may_set_leave_small_integers_for_the_step() -> None:
    """What apply works out outside the step stays in the guard: a big integer there would breed others within."""
    compare = f"""
    from guard import Guard, Limits
    session = Session(**{largest_image()!r})
    guard = session.firmware.guard
    def call(slew_uA_per_ms, silence_ms):
        guard.on_current(SMALLEST, SMALLEST, guard.slew_uA_per_step + 0)
        guard._silence_steps + guard._current_trip_uA + 0
        guard._power_trip_uW + 0
    SMALLEST = -12_000_000
    def found_at(slew, silence):
        guard.apply_values([16_000_000, 60_000_000, 400_000_000, 120_000, 175_000, slew, silence])
        return passing(call, [(slew, silence)])
    """
    pairs = [(1, 1), (1_000_000, 60_000), (999_999, 500), (400_000, 3_000)]
    found = watched(f"{dedent(compare)}\nfound = [found_at(slew, silence) for slew, silence in {pairs!r}]\n")
    assert found == [[]] * len(pairs)


def test_the_trim_sums_small_up_to_the_largest_error_that_it_is_given() -> None:
    """A sixteenth of 16 A and the widest band, for 64 pairs."""
    trim = f"""
    session = Session(**{largest_image()!r})
    control = session.firmware.control
    control.setpoint = 16_000_000
    def call(error_uA, _):
        session.firmware.meter.current_uA = control.setpoint - error_uA
        for _ in range(130):
            control._trim()
    """
    assert beyond_small(trim, [(6_000_000, 0), (-6_000_000, 0), (1, 0)]) == []


def test_the_zero_sums_small_over_the_widest_scale() -> None:
    gather = """
    session = Session()
    control = session.firmware.control
    def call(nominal_uA, _):
        for _ in range(130):
            control._gather_zero(nominal_uA)
    """
    assert beyond_small(gather, [(LARGEST_CURRENT_uA, 0), (-LARGEST_CURRENT_uA, 0)]) == []


def test_a_zero_out_of_budget_keeps_the_step_small() -> None:
    """A converter that reads full scale below nothing while off, and full scale above it when sinking."""
    found = watched(f"""
        session = Session(**{largest_image()!r})
        firmware = session.firmware
        counts = session.board.bus.counts
        counts[:] = [-32768, 25_000, 25_000, 13200]
        session.turns(220)
        counts[0] = 32767
        found = [firmware.control.zero_uA, stays_small(one_step, 140)]
    """)
    assert found[0] < -11_000_000
    assert found[1]


def test_time_goes_on_small_after_the_longest_stall_and_at_the_end_of_a_second() -> None:
    """Differences of a clock that wraps at 2**30 reach 2**29 microseconds."""
    tick = """
    from timekeeper import Timekeeper
    class Clock:
        def __init__(self): self.late = 0
        def ticks_us(self): return 0
        def since(self, earlier): return self.late
        def add(self, ticks, us): return ticks
    clock = Clock()
    time = Timekeeper(clock, 20_000)
    def call(late_us, before_us):
        time.late_us = before_us
        time.micros = 999_999
        clock.late = late_us
        time.tick()
    """
    assert beyond_small(tick, [(2**29 - 1, 0), (-(2**29), 2**29 - 1), (50_000, 0), (0, 50_000)]) == []
