"""The monitor's driver against a simulated INA226 that was written from its datasheet, and the second trip."""

from __future__ import annotations

from tests.firmware.running import on_board, on_rp2_board
from tests.host.simulator.board_side import check

WORLD = """
import chips
image = {"part": "INA226", "address": 0x40, "pin": 21, "limit_uA": 3_000_000, "limit_counts": 12_000}
monitor = {"address": 0x40, "pin": 21, "shunt_ohm": 0.01}
world = World({"kind": "supply", "voltage_V": 10.0, "resistance_ohm": 0.1}, monitor=monitor)
driver = chips.driver("monitor", image, world.board)
def current_A():
    world.look()
    return world.plant.current_A
"""


def test_prepared_it_trips_above_its_limit_and_not_below() -> None:
    """12000 counts of 2.5 uV through 10 mohm are 3 A."""
    check(
        WORLD
        + """
assert driver.prepare(world.board.clock)
asked = world.sink(2.95)
world.run_s(0.01)
assert not driver.tripped()
near(current_A(), asked, 0.001)
world.demand(3.05)
world.run_s(0.01)
assert driver.tripped()
world.run_s(0.001)
assert current_A() == 0.0
"""
    )


def test_it_holds_the_gate_whatever_the_pin_says_until_it_is_let_go() -> None:
    check(
        WORLD
        + """
driver.prepare(world.board.clock)
world.sink(3.5)
world.run_s(0.01)
assert driver.tripped()
world.demand(1.0)
world.board.gate.clamp()
world.board.gate.release()
world.run_s(0.1)
assert current_A() == 0.0 and driver.tripped()
driver.rearm()
assert not driver.tripped()
world.run_s(0.01)
near(current_A(), 1.0, 0.002)
"""
    )


def test_before_it_is_prepared_it_holds_nothing_and_another_part_is_no_monitor() -> None:
    check(
        WORLD
        + """
world.sink(3.5)
world.run_s(0.01)
assert not driver.tripped()
world.board.gate.clamp()
world.board.pins.monitor._words[0xFE] = 0x1234
assert not driver.prepare(world.board.clock)
"""
    )


def test_a_monitor_that_has_acted_is_an_over_current_until_it_is_cleared() -> None:
    found = on_board("""
        session = Session()
        class Monitor:
            limit_uA = 3_000_000
            holds = False
            def tripped(self):
                return self.holds
            def rearm(self):
                self.holds = False
        session.sink(1_000_000)
        monitor = session.firmware.monitor = Monitor()
        session.turns(2)
        calm = session.firmware.guard.fault
        monitor.holds = True
        session.turns(1)
        guard = session.firmware.guard
        tripped = [guard.fault, guard.limit, session.board.gate.released]
        session.board.show(0, 12_000_000)
        session.turns(20)
        refusal = session.refusal(wire.CLEAR_FAULT)
        found = [calm, tripped, refusal, guard.fault, monitor.holds]
    """)
    assert found == [0, [3, 3_000_000, False], None, 0, False]


def test_a_board_whose_monitor_does_not_answer_fails_its_self_test() -> None:
    found = on_board("""
        import chips, selftest
        board = Board()
        class Pins:
            def digital(self, number):
                return None
        board.pins = Pins()
        entry = {"part": "INA226", "address": 0x40, "pin": 21, "limit_uA": 3_000_000, "limit_counts": 12_000}
        found = [selftest.check_monitor(None, board.clock),
                 selftest.check_monitor(chips.driver("monitor", entry, board), board.clock)]
    """)
    assert found[0] == ""
    assert found[1].startswith("the current monitor does not answer")


def test_looking_at_the_alert_allocates_nothing() -> None:
    found = on_rp2_board("""
        import chips
        it = board.Board(IMAGE)
        entry = {"part": "INA226", "address": 0x40, "pin": 21, "limit_uA": 3_000_000, "limit_counts": 12_000}
        driver = chips.driver("monitor", entry, it)
        driver.tripped()
        total = micropython.mem_total()
        total = micropython.mem_total()
        seen = driver.tripped()
        found = [micropython.mem_total() - total, seen]
    """)
    assert found == [0, False]
