"""The lamp: four states, told apart by how they blink, whatever colour the eye makes of them."""

from __future__ import annotations

from itertools import groupby

import pytest

from tests.firmware.running import on_board

#: Sixteen control steps of 2.35 ms.
TURN_S = 16 * 0.00235

SEEN = """
    from lamp import Lamp
    class Led:
        def show(self, state, lit=True):
            self.state, self.lit = state, lit
    led = Led()
    lamp = Lamp(led)
    lamp.show(wire.{state})
    found = []
    for _ in range(512):
        found.append(bool(led.lit))
        lamp.turn()
"""


def seen(state: str) -> list[bool]:
    return on_board(SEEN.format(state=state))


def test_off_is_a_short_blink_every_few_seconds_so_that_a_dead_board_looks_different() -> None:
    lit = seen("STATE_OFF")
    assert sum(lit) == 512 // 64
    assert 2.0 < 64 * TURN_S < 3.0


def test_sinking_shines_without_a_break() -> None:
    assert all(seen("STATE_SINKING"))


@pytest.mark.parametrize(("state", "period_s"), [("STATE_ENDED", 1.2), ("STATE_FAULT", 0.15)])
def test_ended_blinks_slowly_and_fault_eight_times_as_fast(state: str, period_s: float) -> None:
    lengths = [len(list(run)) for _, run in groupby(seen(state))]
    assert len(set(lengths)) == 1
    assert 2 * lengths[0] * TURN_S == pytest.approx(period_s, rel=0.01)


def test_a_new_state_is_shown_at_once_and_lit() -> None:
    found = on_board("""
        from lamp import Lamp
        shown = []
        class Led:
            def show(self, state, lit=True):
                shown.append([state, bool(lit)])
        lamp = Lamp(Led())
        lamp.show(wire.STATE_OFF)
        lamp.turn()
        lamp.show(wire.STATE_FAULT)
        found = shown
    """)
    assert found == [[0, True], [0, False], [3, True]]
