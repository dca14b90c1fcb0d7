"""The fan: on above one temperature, off below a lower one, on while a fault stands."""

from __future__ import annotations

from tests.firmware.running import on_board


def test_it_starts_hot_and_stops_cool_with_a_distance_between() -> None:
    found = on_board("""
        from fan import Fan
        switched = []
        fan = Fan(lambda on: switched.append(bool(on)))
        found = []
        for degC in (25, 44, 46, 44, 41, 39, 44):
            fan.service(degC * 1000, wire.FAULT_NONE)
            found.append(fan.on)
        found.append(switched)
    """)
    assert found[:-1] == [False, False, True, True, True, False, False]
    assert found[-1] == [False, True, False]


def test_it_runs_while_a_fault_stands_because_the_reading_may_be_what_is_wrong() -> None:
    found = on_board("""
        from fan import Fan
        fan = Fan(lambda on: None)
        fan.service(-20_000, wire.FAULT_THERMISTOR_OPEN)
        found = [fan.on]
        fan.service(-20_000, wire.FAULT_NONE)
        found.append(fan.on)
    """)
    assert found == [True, False]
