"""The simulated sources against closed forms; run by MicroPython, as the simulated board is."""

from __future__ import annotations

import pytest

from .board_side import check, check_under_cpython

SUPPLY = '{"kind": "supply", "voltage_V": 12.0, "resistance_ohm": 0.1, %s}'


@pytest.mark.parametrize(
    ("voltage", "resistance"), [(5.0, 0.01), (12.0, 0.045), (12.0, 1.0), (24.0, 0.5), (30.0, 10.0)]
)
def test_a_supply_obeys_ohms_law(voltage: float, resistance: float) -> None:
    """Source: V = Voc - I*R."""
    script = (
        f"voltage, resistance = {voltage}, {resistance}\n"
        + """
world = World({"kind": "supply", "voltage_V": voltage, "resistance_ohm": resistance})
for ampere in (0.1, 0.5, 1.0, 1.8):
    true_A = world.sink(ampere)
    world.run_s(0.05)
    near(world.plant.current_A, true_A, 1e-5)
    near(world.plant.source_V, voltage - true_A * resistance, 1e-4)
    near(world.voltage_V(), voltage - true_A * resistance, 0.5 * 125e-6 * 11 + 1e-4)  # half a count
    near(world.current_A(), true_A, 0.5 * 125e-6 / 0.625 + 1e-5)
"""
    )
    check(script)
    check_under_cpython(script)


def test_a_resistive_source_is_pulled_to_the_floor_of_the_transistor() -> None:
    """Source: two resistances in series; 50 mohm on-resistance and 25 mohm sense resistor are the load's
    least.
    """
    check("""
world = World({"kind": "supply", "voltage_V": 1.0, "resistance_ohm": 0.425})
world.sink(4.0)
world.run_s(0.05)
near(world.plant.current_A, 1.0 / (0.425 + 0.075), 1e-5)
near(world.plant.terminal_V, 2.0 * 0.075, 1e-5)
near(world.plant.drive_A, 44.0, 1e-9)  # the amplifier sits at its rail
""")


def test_a_constant_limit_holds_the_current_down_to_the_floor() -> None:
    check("""
for extra in ({}, {"capacitance_F": 470e-6}, {"capacitance_F": 470e-6, "inductance_H": 1e-6},
              {"leads_inductance_H": 2e-6}):
    source = {"kind": "supply", "voltage_V": 12.0, "resistance_ohm": 0.1, "limit_A": 2.5}
    source.update(extra)
    world = World(source)
    world.sink(2.4)
    world.run_s(0.05)
    near(world.plant.source_V, 12.0 - 0.1 * world.plant.current_A, 1e-3)
    world.demand(3.5)
    world.run_s(0.2)
    near(world.plant.current_A, 2.5, 1e-4)
    near(world.plant.source_V, 2.5 * 0.075, 1e-4)
    world.demand(2.0)
    world.run_s(0.2)
    near(world.plant.source_V, 12.0 - 0.1 * world.plant.current_A, 1e-3)
""")


def test_an_output_capacitance_discharges_by_the_excess_over_the_limit() -> None:
    """Source: C*dV/dt = I_limit - I: 10 mF and 1 A too much fall by 1 V in 10 ms."""
    check("""
source = {"kind": "supply", "voltage_V": 12.0, "resistance_ohm": 0.01, "limit_A": 1.0, "capacitance_F": 0.01}
world = World(source)
world.sink(0.9)
world.run_s(0.05)
true_A = world.demand(2.0)
world.run_s(0.001)
first = world.plant.source_V
world.run_s(0.05)
near((first - world.plant.source_V) / 0.05, (true_A - 1.0) / 0.01, 0.2)
""")


@pytest.mark.parametrize("capacitance", ["", '"capacitance_F": 470e-6'])
def test_a_foldback_limit_follows_its_line_and_returns_only_below_it(capacitance: str) -> None:
    """Source: the line of the source file, limit(V) = foldback_A + (limit_A - foldback_A)*V/voltage_V, met
    with the load's floor V = I*R: I = foldback_A / (1 - (limit_A - foldback_A)*R/voltage_V).
    """
    check(
        """
source = %s
source.update({"limit_A": 2.5, "limit_kind": "foldback", "foldback_A": 0.8})
world = World(source)
world.sink(2.3)
world.run_s(0.1)
near(world.plant.source_V, 12.0 - 0.1 * world.plant.current_A, 1e-3)
world.demand(2.6)
world.run_s(0.3)
short_A = 0.8 / (1.0 - 1.7 * 0.075 / 12.0)
near(world.plant.current_A, short_A, 1e-4)
world.demand(1.5)  # still above the line at this voltage: the load holds it down
world.run_s(0.3)
near(world.plant.current_A, short_A, 1e-4)
world.demand(0.7)
world.run_s(0.3)
near(world.plant.source_V, 12.0 - 0.1 * world.plant.current_A, 1e-3)
"""
        % (SUPPLY % capacitance)
    )


def test_a_latched_supply_returns_after_one_second_without_load() -> None:
    check("""
source = {"kind": "supply", "voltage_V": 12.0, "resistance_ohm": 0.1, "limit_A": 2.5, "limit_kind": "latch"}
world = World(source)
world.sink(2.4)
world.run_s(0.1)
near(world.plant.source_V, 12.0 - 0.1 * world.plant.current_A, 1e-3)
world.demand(2.7)
world.run_s(3.0)  # a load that still asks holds the latch
near(world.plant.source_V, 0.0, 1e-6)
near(world.plant.current_A, 0.0, 1e-6)
world.board.gate.clamp()
world.run_s(0.99)
near(world.plant.source_V, 0.0, 1e-3)
world.run_s(0.02)
near(world.plant.source_V, 12.0, 1e-3)
""")


def test_recovery_after_a_load_step_is_first_order() -> None:
    """Source: the definition: the deviation from the new value is R*dI*exp(-t/recovery_s)."""
    check("""
world = World({"kind": "supply", "voltage_V": 12.0, "resistance_ohm": 0.1, "recovery_s": 0.005})
low_A = world.sink(1.0)
world.run_s(0.1)
high_A = world.demand(3.0)
world.run_s(0.010)
left_V = 12.0 - 0.1 * high_A - world.plant.source_V
near(left_V, 0.1 * (high_A - low_A) * math.exp(-0.010 / 0.005), 0.04 * 0.2)
world.run_s(0.2)
near(world.plant.source_V, 12.0 - 0.1 * high_A, 1e-4)
""")


def test_an_output_capacitance_with_resistance_settles_exponentially() -> None:
    """Source: RC step response, 1 ohm and 10 mF, after a step of 1 A."""
    check("""
world = World({"kind": "supply", "voltage_V": 12.0, "resistance_ohm": 1.0, "capacitance_F": 0.01})
low_A = world.sink(1.0)
world.run_s(0.2)
high_A = world.demand(2.0)
world.run_s(0.010)
near(world.plant.source_V, 12.0 - high_A + (high_A - low_A) * math.exp(-1.0), 0.01)
world.run_s(0.3)
near(world.plant.source_V, 12.0 - high_A, 1e-3)
""")


def test_a_cell_steps_by_its_resistance_and_sags_by_its_pairs() -> None:
    """Source: V = OCV - I*r0 - sum of I*R*(1 - exp(-t/RC)); charge balance for the state of charge."""
    script = """
cell = {"kind": "cell", "capacity_Ah": 2.5, "ocv": [[0.0, 3.7], [1.0, 3.7]], "r0_ohm": 0.03,
        "rc": [[0.015, 2000.0], [0.010, 1.0]]}
world = World(cell)
true_A = world.sink(2.0)
world.run_s(0.001)
near(world.plant.source_V, 3.7 - true_A * (0.03 + 0.010 * (1 - math.exp(-0.1))), 3e-4)
for total_s in (0.05, 1.0, 10.0, 30.0, 90.0):
    while world.plant.now < total_s * 1e6:
        world.run_s(min(0.00235, total_s - world.plant.now * 1e-6))
    world.look()
    slow = 0.015 * (1.0 - math.exp(-total_s / 30.0))
    fast = 0.010 * (1.0 - math.exp(-total_s / 0.010))
    near(world.plant.source_V, 3.7 - true_A * (0.03 + slow + fast), 5e-5)
    near(world.plant.source.state_of_charge, 1.0 - true_A * total_s / 9000.0, 2e-7)
"""
    check(script)
    check_under_cpython(script)


def test_a_cell_follows_its_open_circuit_table_and_falls_on_when_empty() -> None:
    check("""
cell = {"kind": "cell", "capacity_Ah": 0.001, "state_of_charge": 0.5, "r0_ohm": 0.001,
        "ocv": [[0.0, 2.9], [0.1, 3.4], [0.5, 3.7], [1.0, 4.18]]}
world = World(cell)
near(world.plant.source_V, 3.7, 1e-9)
true_A = world.sink(1.0)
for seconds in (0.3, 0.5, 0.5, 0.45):
    world.run_s(seconds)
    world.look()
    x = world.plant.source.state_of_charge
    table = 3.4 + (x - 0.1) * 0.75 if x > 0.1 else 2.9 + 5.0 * x
    near(world.plant.source_V, table - 0.001 * true_A, 1e-3)
world.run_s(0.4)
world.look()
assert world.plant.source.state_of_charge < 0.0
assert 0.0 < world.plant.source_V < 2.9
""")


def test_a_curve_is_met_where_it_crosses_the_load() -> None:
    """Source: linear interpolation by hand; below the short-circuit current the voltage, above it the
    floor.
    """
    script = """
world = World({"kind": "curve", "points": [[0.0, 0.76], [0.45, 0.69], [0.57, 0.0]]})
near(world.plant.source_V, 0.57, 1e-9)
for ampere in (0.1, 0.3, 0.6):
    true_A = world.sink(ampere)
    world.run_s(0.05)
    near(world.plant.current_A, true_A, 1e-5)
    near(world.plant.source_V, 0.45 + (0.69 - true_A) / 0.69 * 0.12, 1e-5)
true_A = world.sink(0.72)
world.run_s(0.05)
near(world.plant.source_V, 0.45 * (0.76 - true_A) / 0.07, 1e-4)
world.demand(2.0)
world.run_s(0.05)
floor_A = 0.76 / (1.0 + 0.07 / 0.45 * 0.075)
near(world.plant.current_A, floor_A, 1e-5)
near(world.plant.source_V, floor_A * 0.075, 1e-5)
"""
    check(script)
    check_under_cpython(script)


def test_leads_drop_voltage_only_without_remote_sense() -> None:
    check("""
for remote in (True, False):
    source = {"kind": "supply", "voltage_V": 12.0, "resistance_ohm": 0.1, "leads_ohm": 0.05}
    source["remote_sense"] = remote
    world = World(source)
    true_A = world.sink(2.0)
    world.run_s(0.05)
    source_V = 12.0 - 0.1 * true_A
    near(world.voltage_V(), source_V - (0.0 if remote else 0.05 * true_A), 1.5e-3)
    near((world.convert(2) * 125e-6 - 0.1) * 11.0, source_V - 0.05 * true_A, 1.5e-3)
""")


@pytest.mark.parametrize("frequency", [50.0, 100.0, 120.0, 1000.0])
def test_a_conversion_averages_the_ripple_over_its_window(frequency: float) -> None:
    """Source: the mean of a sine over a window T is its middle value times sin(pi*f*T)/(pi*f*T); RMS =
    amplitude/sqrt 2.
    """
    check(
        f"f = {frequency}"
        + """
world = World({"kind": "supply", "voltage_V": 12.0, "resistance_ohm": 0.1, "ripple_V": 1.0, "ripple_Hz": f})
readings = []
for k in range(400):
    readings.append(world.convert(1) * 125e-6 * 11.0)
    world.run_s(0.000731)
mean = sum(readings) / 400
rms = math.sqrt(sum([(x - mean) ** 2 for x in readings]) / 400)
window = 1.0 / 860
expected = 0.5 / math.sqrt(2) * abs(math.sin(math.pi * f * window) / (math.pi * f * window))
near(rms, expected, 0.03 * expected + 0.002)
"""
    )
