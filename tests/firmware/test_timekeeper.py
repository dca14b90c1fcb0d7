"""The board's time: no step is skipped, lateness is counted, ticks may wrap."""

from __future__ import annotations

from tests.firmware.running import on_board


def test_board_time_is_the_sum_of_the_periods_and_of_what_came_late() -> None:
    found = on_board("""
        from timekeeper import Timekeeper
        board = Board()
        time = Timekeeper(board.clock, 2350)
        for step in range(1000):
            if step == 500:
                board.clock.stall_us = 9_000
            time.wait()
            time.tick()
        found = [time.now_us(), time.overruns, time.late_us]
    """)
    assert found[0] == 1000 * 2350
    assert found[1] == 3  # 9000, 6650 and 4300 us late are more than a period; 1950 us is not
    assert found[2] == 0


def test_time_goes_on_where_the_tick_counter_wraps() -> None:
    found = on_board("""
        from timekeeper import Timekeeper
        WRAP = 1 << 30
        class Wrapping:
            now = WRAP - 5_000
            def ticks_us(self): return self.now
            def add(self, ticks, us): return (ticks + us) % WRAP
            def since(self, earlier): return (self.now - earlier + WRAP // 2) % WRAP - WRAP // 2
            def wait_until(self, ticks): self.now = ticks
        time = Timekeeper(Wrapping(), 2350)
        for _ in range(10):
            time.wait()
            time.tick()
        found = [time.now_us(), time.overruns]
    """)
    assert found == [23_500, 0]
