"""How far simulated time may go: at the wall clock's pace, and never far ahead of the last request."""

from __future__ import annotations

import math

import pytest

from sinkwright.simulator.pace import MAX_BACKLOG_S, Pace

SILENCE_US = 3_000_000


@pytest.mark.parametrize("speed", [0.5, 1.0])
def test_up_to_speed_1_time_follows_the_wall_clock_whether_anybody_asks_or_not(speed):
    pace = Pace(speed, SILENCE_US, now_s=100.0)
    board_us = 0
    for tick in range(1, 101):
        board_us += pace.due_us(100.0 + tick * 0.5, board_us)
    assert board_us == pytest.approx(50e6 * speed)
    assert not pace.waits_for_request(board_us)


def test_above_speed_1_time_stops_half_the_silence_limit_after_the_last_request():
    pace = Pace(10.0, SILENCE_US, now_s=0.0)
    assert pace.due_us(0.1, 0) == 1_000_000
    assert pace.due_us(0.5, 1_000_000) == 500_000
    assert pace.due_us(0.9, 1_500_000) == 0
    assert pace.waits_for_request(1_500_000)


def test_a_request_lets_time_go_on_at_the_speed_and_not_faster():
    pace = Pace(10.0, SILENCE_US, now_s=0.0)
    pace.due_us(60.0, 1_500_000)
    pace.heard(60.0, 1_500_000)
    assert pace.due_us(60.01, 1_500_000) == pytest.approx(100_000, abs=1)


def test_at_the_largest_speed_only_the_last_request_bounds_time():
    pace = Pace(math.inf, SILENCE_US, now_s=0.0)
    assert pace.due_us(0.0, 0) == 1_500_000
    pace.heard(0.0, 700_000)
    assert pace.due_us(0.0, 700_000) == 1_500_000


def test_a_long_sleep_of_the_machine_is_not_made_up_for():
    pace = Pace(1.0, SILENCE_US, now_s=0.0)
    assert pace.due_us(3600.0, 0) == MAX_BACKLOG_S * 1e6
    assert pace.due_us(3600.5, 1_000_000) == pytest.approx(500_000)
