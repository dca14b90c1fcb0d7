"""The simulated sink, its leads and its heat against closed forms; run by MicroPython."""

from __future__ import annotations

from .board_side import check, check_under_cpython


def test_the_demand_is_the_dac_voltage_less_pedestal_and_offsets_over_gain_and_resistance() -> None:
    check("""
base = plant()
base["current"].update({"resistance_ohm": 0.0252, "gain": 25.1, "offset_V": 0.0002, "pedestal_V": 0.103})
world = World({"kind": "supply", "voltage_V": 12.0, "resistance_ohm": 0.1}, current=base["current"],
              setpoint_offset_V=0.001)
world.sink(2.0)
world.run_s(0.05)
dac_V = world.board.dac.code * 3.3 / 4096
true_A = (dac_V - 0.001 - 0.103 - 25.1 * 0.0002) / (25.1 * 0.0252)
near(world.plant.current_A, true_A, 1e-5)
near(world.convert(0) * 125e-6, 0.103 + 25.1 * (0.0252 * true_A + 0.0002), 0.6 * 125e-6)
""")


def test_the_sinks_own_loop_is_of_first_order() -> None:
    """Source: 1 - exp(-2*pi*B*t); and that averaged over a conversion's window."""
    check("""
world = World({"kind": "supply", "voltage_V": 12.0, "resistance_ohm": 0.1},
              loop={"bandwidth_Hz": 500.0, "rail_A": 44.0})
low_A = world.sink(1.0)
world.run_s(0.1)
high_A = world.demand(2.0)
world.run_s(0.0003)
near(world.plant.current_A, high_A - (high_A - low_A) * math.exp(-2 * math.pi * 500 * 0.0003), 1e-6)
world.demand(1.0)
world.run_s(0.1)
world.begin(0)
world.demand(2.0)
window, before, tau = round(1e6 / 860) * 1e-6, 72e-6, 1 / (2 * math.pi * 500)  # the DAC's write takes 29 bits
lost = before + tau * (1 - math.exp((before - window) / tau))
near((world.finish() * 125e-6 - 0.1) / 0.625, high_A - (high_A - low_A) * lost / window, 4e-4)
""")


def test_a_clamped_gate_lets_nothing_through_and_a_dac_at_nothing_asks_for_nothing() -> None:
    check("""
world = World({"kind": "supply", "voltage_V": 12.0, "resistance_ohm": 0.1})
world.demand(2.0)
world.run_s(0.1)
near(world.plant.current_A, 0.0, 0.0)
near(world.current_A(), 0.0, 1e-4)
near(world.voltage_V(), 12.0, 1e-3)
world = World({"kind": "supply", "voltage_V": 12.0, "resistance_ohm": 0.1})
world.sink(-0.1)
world.run_s(0.1)
near(world.plant.current_A, 0.0, 0.0)
""")


def test_a_source_that_returns_meets_a_wound_up_amplifier() -> None:
    """Source: reference.md section 1, reconnection: a 12 V, 45 mohm source peaks at 44 A, above 2 A for 0.10
    ms.

    The floor (50 + 25 mohm here) and the source bound it as well: 12 V / 120 mohm would allow 100 A."""
    check("""
away = [{"kind": "source_disconnected", "from_us": 100000, "until_us": 200000}]
world = World({"kind": "supply", "voltage_V": 12.0, "resistance_ohm": 0.045}, defects=away)
world.sink(1.0)
world.run_s(0.15)
near(world.plant.current_A, 0.0, 0.0)
near(world.plant.terminal_V, 0.0, 0.0)
near(world.plant.drive_A, 44.0, 1e-9)
peak = above_us = 0.0
while world.plant.now < 200400:
    world.run_s(2e-6)
    peak = max(peak, world.plant.current_A)
    above_us += 2 if world.plant.current_A > 2.0 else 0
near(peak, 44.0, 3.0)
near(above_us, 100, 25)
world.run_s(0.1)
near(world.plant.current_A, 1.0, 1e-3)
weak = World({"kind": "supply", "voltage_V": 12.0, "resistance_ohm": 0.925}, defects=away)
weak.sink(1.0)
weak.run_s(0.1999)
peak = 0.0
while weak.plant.now < 200400:
    weak.run_s(2e-6)
    peak = max(peak, weak.plant.current_A)
near(peak, 12.0 / (0.925 + 0.075), 1e-6)
""")


def test_an_inductance_in_the_leads_delays_the_reconnection() -> None:
    """Source: di/dt <= V/L: 12 V across 100 uH reaches no more than 2.4 A in 20 us."""
    check("""
away = [{"kind": "source_disconnected", "from_us": 100000, "until_us": 200000}]
source = {"kind": "supply", "voltage_V": 12.0, "resistance_ohm": 0.045, "leads_inductance_H": 1e-4}
world = World(source, defects=away)
world.sink(1.0)
world.run_s(0.2 - world.plant.now * 1e-6)
for _ in range(20):
    world.run_s(1e-6)
near(world.plant.current_A, 12.0 / 0.12 * (1 - math.exp(-20e-6 * 0.12 / 1e-4)), 0.05)
""")


def test_a_transistor_failed_short_conducts_although_clamped() -> None:
    check("""
world = World({"kind": "supply", "voltage_V": 12.0, "resistance_ohm": 1.0},
              defects=[{"kind": "transistor_short", "from_us": 100000}])
world.run_s(0.05)
near(world.plant.current_A, 0.0, 0.0)
world.run_s(0.1)
near(world.plant.current_A, 12.0 / 1.075, 1e-4)
""")


def test_the_junction_rises_as_the_foster_stages_say() -> None:
    """Source: [computed] from the stages 0.3/1 ms, 0.7/30 ms, 0.5/0.5 s, 2.5/300 s (K/W), reference.md
    section 3.
    """
    script = """
table = ((0.001, 0.21359), (0.010, 0.50840), (0.1, 1.06650), (1.0, 1.44065), (60.0, 1.95317))
for seconds, kelvin_per_W in table:
    world = World({"kind": "supply", "voltage_V": 10.0, "resistance_ohm": 1e-6},
                  loop={"bandwidth_Hz": 1e6, "rail_A": 44.0})
    true_A = world.sink(1.0)
    world.run_s(seconds)
    near((world.junction_degC() - 25.0) / (10.0 * true_A), kelvin_per_W, 1.5e-4 * max(kelvin_per_W, 1.0))
world.run_s(3000.0)
near((world.junction_degC() - 25.0) / (10.0 * true_A), 4.0, 1e-3)
"""
    check(script)


def test_the_thermistor_reads_the_heatsink_alone() -> None:
    """Source: the NTC's datasheet curve (reference.md section 3), and a divider with its pull-up."""
    check("""
for ambient in (-20.0, 0.0, 25.0, 40.0, 71.3, 100.0):
    world = World({"kind": "supply", "voltage_V": 10.0, "resistance_ohm": 0.1}, ambient_degC=ambient)
    ohm = ntc_ohm(ambient)
    near(world.convert(3) * 125e-6, 3.3 * ohm / (ohm + 10000.0), 2e-4)
world = World({"kind": "supply", "voltage_V": 10.0, "resistance_ohm": 0.0001})
true_A = world.sink(2.0)
world.run_s(300.0)
ohm = ntc_ohm(25.0 + 10.0 * true_A * 2.5 * (1.0 - math.exp(-1.0)))
near(world.convert(3) * 125e-6, 3.3 * ohm / (ohm + 10000.0), 1e-3)
""")


def test_an_open_and_a_shorted_thermistor_read_the_ends() -> None:
    check("""
world = World({"kind": "supply", "voltage_V": 10.0, "resistance_ohm": 0.1}, defects=[
    {"kind": "thermistor_open", "from_us": 10000, "until_us": 20000},
    {"kind": "thermistor_short", "from_us": 30000}])
near(world.convert(3), 3.3 / 2 / 125e-6, 2)
world.run_s(0.012 - world.plant.now * 1e-6)
near(world.convert(3), 3.3 / 125e-6, 1)
world.run_s(0.04)
near(world.convert(3), 0, 1)
""")


def test_a_warm_sense_resistor_lowers_the_current() -> None:
    """Source: R = R0*(1 + per_K*rise), rise = I^2*R*heating_K_per_W once settled; the loop holds I*R."""
    check("""
base = plant()
base["current"].update({"resistance_per_K": 50e-6, "heating_K_per_W": 30.0, "heating_s": 2.0})
world = World({"kind": "supply", "voltage_V": 10.0, "resistance_ohm": 0.1}, current=base["current"])
true_A = world.sink(4.0)
world.run_s(60.0)
rise = true_A ** 2 * 0.025 * 30.0
near(world.plant.current_A / true_A, 1.0 - 50e-6 * rise, 2e-6)
""")


def test_the_same_calls_give_the_same_world_under_both_interpreters() -> None:
    script = """
base = plant()
base["adc"]["noise_counts"] = 1.0
world = World({"kind": "supply", "voltage_V": 12.0, "resistance_ohm": 0.1, "capacitance_F": 470e-6,
               "limit_A": 2.0, "ripple_V": 0.02, "ripple_Hz": 100.0, "recovery_s": 0.001}, adc=base["adc"])
for k in range(60):
    world.sink(0.05 * k)
    print(world.convert(k % 4), world.plant.now)
"""
    printed = check(script)
    assert printed == check(script) == check_under_cpython(script)


def test_a_reversed_source_finds_the_body_diode_although_the_gate_is_clamped() -> None:
    """Source: (12 V - 0.7 V) / (1 + 0.025 ohm); the sense amplifier is at its lower rail."""
    check("""
world = World({"kind": "supply", "voltage_V": 12.0, "resistance_ohm": 1.0},
              defects=[{"kind": "source_reversed", "from_us": 100000}])
world.run_s(0.2)
near(world.plant.current_A, -11.3 / 1.025, 1e-3)
near(world.voltage_V(), -(0.7 + 11.3 / 1.025 * 0.025), 2e-3)
near(world.current_A(), -0.16, 1e-3)
""")


def test_a_lifted_sense_resistor_lets_the_loop_close_with_next_to_no_current() -> None:
    check("""
world = World({"kind": "supply", "voltage_V": 12.0, "resistance_ohm": 0.1},
              defects=[{"kind": "resistor_open", "from_us": 100000}])
asked_A = world.sink(1.0)
world.run_s(0.2)
near(world.plant.current_A, asked_A * 0.025 / 1e3, 1e-6)
near(world.current_A(), asked_A, 2e-3)
""")


def test_a_bridged_sense_resistor_shows_a_fraction_of_the_current() -> None:
    check("""
world = World({"kind": "supply", "voltage_V": 12.0, "resistance_ohm": 1.0},
              defects=[{"kind": "resistor_shorted", "from_us": 100000}])
world.sink(1.0)
world.run_s(0.2)
near(world.plant.current_A, 12.0 / 1.0505, 1e-3)
near(world.current_A(), 12.0 / 1.0505 * 0.0005 / 0.025, 1e-3)
""")


def test_an_open_sense_lead_reads_nothing_and_a_swapped_one_below_nothing() -> None:
    check("""
world = World({"kind": "supply", "voltage_V": 12.0, "resistance_ohm": 0.1}, defects=[
    {"kind": "sense_open", "from_us": 100000, "until_us": 200000},
    {"kind": "sense_swapped", "from_us": 300000, "until_us": 400000}])
for seconds, expected in ((0.15, 0.0), (0.1, 12.0), (0.1, -1.1), (0.1, 12.0)):
    world.run_s(seconds)
    near(world.voltage_V(), expected, 2e-3)
    near((world.convert(2) * 125e-6 - 0.1) * 11.0, 12.0, 2e-3)
""")


def test_a_clamp_that_does_not_clamp_leaves_the_current_to_the_dac() -> None:
    check("""
world = World({"kind": "supply", "voltage_V": 12.0, "resistance_ohm": 0.1},
              defects=[{"kind": "clamp_ineffective", "from_us": 100000}])
asked_A = world.sink(1.0)
world.run_s(0.2)
world.board.gate.clamp()
world.run_s(0.01)
near(world.plant.current_A, asked_A, 1e-4)
world.demand(-0.16)
world.run_s(0.01)
near(world.plant.current_A, 0.0, 1e-9)
""")


def test_without_its_fan_the_sink_heads_for_a_higher_temperature_as_slowly_as_its_mass_lets_it() -> None:
    """Source: one Foster stage: four times the resistance and time constant, the rise so far kept."""
    check("""
world = World({"kind": "supply", "voltage_V": 10.0, "resistance_ohm": 1e-6},
              defects=[{"kind": "fan_dead", "from_us": 300000000}])
true_A = world.sink(1.0)
world.run_s(300.0)
before = 25.0 * true_A * (1 - math.exp(-1))
world.run_s(300.0)
world.look()
after = 100.0 * true_A + (before - 100.0 * true_A) * math.exp(-0.25)
near(world.plant.heat.heatsink_degC - 25.0, after, 0.05)
""")


def test_a_thermistor_that_has_come_off_tells_the_airs_temperature_before_long() -> None:
    check("""
world = World({"kind": "supply", "voltage_V": 10.0, "resistance_ohm": 1e-6},
              defects=[{"kind": "thermistor_loose", "from_us": 300000000}])
world.sink(2.0)
world.run_s(299.0)
assert world.plant.heat.sensor_degC > 50.0
world.run_s(91.0)
world.look()
assert world.plant.heat.heatsink_degC > 60.0
near(world.plant.heat.sensor_degC, 25.0, 0.3)
""")


def test_a_supply_whose_regulator_fails_rises_and_returns() -> None:
    check("""
world = World({"kind": "supply", "voltage_V": 12.0, "resistance_ohm": 0.1},
              defects=[{"kind": "source_high", "from_us": 100000, "until_us": 200000, "value": 33.0}])
for seconds, volt in ((0.15, 33.0), (0.1, 12.0)):
    world.run_s(seconds)
    near(world.voltage_V(), volt, 3e-3)
""")
