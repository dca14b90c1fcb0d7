"""What the board knows of a run: when it may go on alone, and that it is kept until it is fetched."""

from __future__ import annotations

import pytest

from tests.firmware.running import on_board

BAD_VALUE, LOAD_IS_ON, ENDS_MISSING, RUN_NOT_FETCHED = 3, 11, 17, 18
OFF, SINKING, ENDED, FAULT = 0, 1, 2, 3
DURATION, DISABLED, BY_FAULT = 4, 6, 7

READY = """
    def run_of(session):
        return list(struct.unpack(wire.RUN_FORMAT, session.ask(wire.GET_RUN, session=9, sequence=1)[1]))
    def enable(session, silence, run):
        return session.refusal(wire.ENABLE, struct.pack(wire.ENABLE_FORMAT, silence, run, 0))
    def ends(session, *values):
        return session.refusal(wire.SET_ENDS, struct.pack(wire.SET_ENDS_FORMAT, *values))
    def fetched(session, run, by=1, number=None):
        mark = struct.pack(wire.MARK_FETCHED_FORMAT, run)
        return session.refusal(wire.MARK_FETCHED, mark, session=by, sequence=number)
    session = Session()
    session.take_control()
    session.ask(wire.SET_POINT, struct.pack(wire.SET_POINT_FORMAT, wire.MODE_CURRENT, 1_000_000))
    session.board.show(None, 12_000_000)
"""


def test_a_board_that_has_not_sunk_names_no_run_and_wants_none_fetched() -> None:
    run = on_board(READY + "    found = run_of(session)\n")
    assert run[:7] == [0, OFF, 0, 1, 0, 0, 0]


@pytest.mark.parametrize(
    ("ends", "refused"),
    [
        ("0, 0, 0, 0, 0", True),
        ("11_000_000, 0, 0, 0, 0", True),
        ("0, 1000, 0, 1000, 0", True),
        ("11_000_000, 0, 1000, 0, 50_000", True),
        ("11_000_000, 1000, 0, 0, 0", False),
        ("11_000_000, 0, 0, 1000, 0", False),
    ],
)
def test_going_on_alone_needs_a_voltage_end_and_a_charge_or_time_end(ends: str, refused: bool) -> None:
    found = on_board(
        READY
        + f"""
    ends(session, {ends})
    found = [enable(session, wire.SILENCE_CONTINUE, 5), session.board.gate.released]
    """
    )
    assert found == ([[ENDS_MISSING, 0, 0], False] if refused else [None, True])


def test_a_run_that_goes_on_alone_cannot_lose_its_ends() -> None:
    found = on_board(
        READY
        + """
    ends(session, 11_000_000, 0, 0, 60_000, 0)
    enable(session, wire.SILENCE_CONTINUE, 5)
    found = [ends(session, 0, 0, 0, 60_000, 0), ends(session, 10_000_000, 1000, 0, 0, 0)]
    """
    )
    assert found == [[ENDS_MISSING, 0, 0], None]


def test_a_host_that_falls_silent_stops_a_run_unless_it_may_go_on_alone() -> None:
    found = on_board(
        READY
        + """
    ends(session, 11_000_000, 0, 0, 60_000, 0)
    enable(session, wire.SILENCE_STOP, 5)
    session.turns(1500)
    found = [session.firmware.machine.state, run_of(session)[:5]]
    """
    )
    assert found == [FAULT, [5, FAULT, BY_FAULT, 1, 0]]


def test_a_run_that_went_on_alone_must_be_fetched_before_the_next_and_by_its_name() -> None:
    found = on_board(
        READY
        + """
    ends(session, 11_000_000, 0, 0, 5000, 0)
    enable(session, wire.SILENCE_CONTINUE, 0xFFFF0001)
    session.turns(2200)
    found = [run_of(session)[:5], enable(session, wire.SILENCE_STOP, 6)]
    session.ask(wire.DISABLE)
    found.append(enable(session, wire.SILENCE_STOP, 6))
    found.append(fetched(session, 6))
    found.append(fetched(session, 0xFFFF0001, by=44, number=3))
    found.append(enable(session, wire.SILENCE_STOP, 6))
    found.append(run_of(session)[:5])
    """
    )
    assert found == [
        [0xFFFF0001, ENDED, DURATION, 0, 1],
        [RUN_NOT_FETCHED, 0, ENDED],
        [RUN_NOT_FETCHED, 0, OFF],
        [BAD_VALUE, 0, 0],
        None,
        None,
        [6, SINKING, 0, 1, 0],
    ]


def test_a_board_does_not_restart_while_that_would_lose_a_run() -> None:
    found = on_board(
        READY
        + """
    ends(session, 11_000_000, 0, 0, 1000, 0)
    enable(session, wire.SILENCE_CONTINUE, 5)
    session.turns(600)
    session.ask(wire.DISABLE)
    found = session.refusal(wire.RESTART, struct.pack(wire.RESTART_FORMAT, 1))
    """
    )
    assert found == [RUN_NOT_FETCHED, 0, OFF]


def test_a_run_is_not_fetched_while_it_goes_on() -> None:
    found = on_board(
        READY
        + """
    ends(session, 11_000_000, 0, 0, 5000, 0)
    enable(session, wire.SILENCE_CONTINUE, 5)
    found = fetched(session, 5)
    """
    )
    assert found == [LOAD_IS_ON, 0, 0]


def test_whoever_turns_a_lone_run_off_leaves_it_to_be_fetched() -> None:
    found = on_board(
        READY
        + """
    ends(session, 11_000_000, 0, 0, 60_000, 0)
    enable(session, wire.SILENCE_CONTINUE, 5)
    session.turns(2000)
    session.ask(wire.DISABLE, session=44, sequence=1)
    run = run_of(session)
    found = [run[:5], run[6] - run[5], run[7]]
    """
    )
    run, lasted_us, charge_uC = found
    assert run == [5, OFF, DISABLED, 0, 1]
    assert lasted_us == pytest.approx(2000 * 2350, abs=5 * 2350)
    assert charge_uC == pytest.approx(lasted_us, rel=0.01)


def test_a_second_host_may_look_and_take_over_without_disturbing_a_lone_run() -> None:
    found = on_board(
        READY
        + """
    ends(session, 11_000_000, 0, 0, 60_000, 0)
    enable(session, wire.SILENCE_CONTINUE, 5)
    session.turns(1500)
    session.ask(wire.HELLO, bytes([wire.VERSION, 1]), session=44, sequence=1)
    session.ask(wire.HELLO, bytes([wire.VERSION, 0]), session=45, sequence=1)
    session.turns(1500)
    found = [run_of(session)[:5], session.board.gate.released]
    """
    )
    assert found == [[5, SINKING, 0, 0, 1], True]


def test_turning_on_what_is_on_already_does_not_change_what_happens_without_a_host() -> None:
    found = on_board(
        READY
        + """
    ends(session, 11_000_000, 0, 0, 60_000, 0)
    enable(session, wire.SILENCE_STOP, 5)
    found = [enable(session, wire.SILENCE_CONTINUE, 6), enable(session, wire.SILENCE_STOP, 6), run_of(session)[0]]
    """
    )
    assert found == [[LOAD_IS_ON, 0, 0], None, 5]


def test_the_log_of_a_lone_run_covers_all_of_it() -> None:
    found = on_board(
        READY
        + """
    ends(session, 11_000_000, 0, 0, 30_000, 0)
    enable(session, wire.SILENCE_CONTINUE, 5)
    session.turns(13_000)
    run = run_of(session)
    log = session.firmware.log
    found = [run[2], run[9], list(log.time_ms[:log.entries]), run[6] - run[5]]
    """
    )
    ended_by, entries, times, lasted_us = found
    assert ended_by == DURATION
    assert entries == len(times)
    assert times[0] <= 1100
    assert all(later - earlier <= 1100 for earlier, later in zip(times, times[1:], strict=False))
    assert times[-1] == pytest.approx(lasted_us / 1000, abs=50)


def test_a_silence_of_weeks_stays_a_small_integer() -> None:
    found = on_board(
        READY
        + """
    ends(session, 11_000_000, 0, 0, 4_000_000_000, 0)
    enable(session, wire.SILENCE_CONTINUE, 5)
    session.firmware.guard.quiet_steps = (1 << 28) + 1
    session.turns(100)
    found = [session.firmware.machine.state, session.firmware.guard.quiet_steps]
    """
    )
    assert found[0] == SINKING
    assert found[1] <= (1 << 28) + 1
