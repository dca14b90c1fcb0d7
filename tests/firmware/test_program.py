"""Programs: timed by the board in control steps, refused by number when they cannot be followed."""

from __future__ import annotations

import pytest

from tests.firmware.running import on_32_bit_board, on_board

PROGRAM = """
    STEP, RAMP = wire.SHAPE_STEP, wire.SHAPE_RAMP

    def piece(first, total, repeats, *steps):
        content = struct.pack(wire.LOAD_PROGRAM_FORMAT, first, total, repeats)
        for step in steps:
            content += struct.pack(wire.PROGRAM_STEP_FORMAT, *step)
        return content

    def load(session, repeats, *steps):
        for first in range(0, len(steps), wire.MAX_STEPS):
            part = steps[first:first + wire.MAX_STEPS]
            refusal = session.refusal(wire.LOAD_PROGRAM, piece(first, len(steps), repeats, *part))
            if refusal:
                return refusal

    def start(session, value, mode=wire.MODE_CURRENT):
        session.ask(wire.SET_POINT, struct.pack(wire.SET_POINT_FORMAT, mode, value))
        session.board.show(None, 12_000_000)
        return session.refusal(wire.ENABLE, struct.pack(wire.ENABLE_FORMAT, wire.SILENCE_STOP, 0, 1))

    session = Session()
    session.take_control()
    firmware = session.firmware
    control = firmware.control
"""


def test_a_pulse_train_keeps_the_board_s_time_over_hundreds_of_pulses() -> None:
    """7 ms and 3 ms are no whole numbers of control steps of 2.35 ms: what is left over is carried on."""
    edges, began, state, level = on_board(
        PROGRAM
        + """
    load(session, 300, (7, 500_000, STEP, 0), (3, 1_500_000, STEP, 1))
    start(session, 500_000)
    began = session.board.clock.now
    for _ in range(1400):
        firmware.guard.quiet_steps = 0
        session.turns(1)
    found = [session.board.trigger.edges, began, firmware.machine.state, session.board.trigger.level]
"""
    )
    rises = [at for at, level in edges if level]
    falls = [at for at, level in edges if not level]
    assert len(rises) == len(falls) == 300
    for number, (rise, fall) in enumerate(zip(rises, falls, strict=True)):
        assert abs(rise - began - 2350 - (10_000 * number + 7_000)) < 2350
        assert abs(fall - began - 2350 - (10_000 * number + 10_000)) < 2350
    assert (state, level) == (2, 0)  # ENDED


def test_a_ramp_goes_evenly_from_where_the_step_before_ended_and_arrives_exactly() -> None:
    found = on_board(
        PROGRAM
        + """
    load(session, 1, (47, 100_000, STEP, 0), (235, 1_000_001, RAMP, 0), (100, 300_000, RAMP, 0))
    start(session, 0)
    found = []
    for _ in range(20 + 100 + 42):
        firmware.guard.quiet_steps = 0
        session.turns(1)
        found.append(control.setpoint)
"""
    )
    assert found[:20] == [100_000] * 20
    assert found[20:120] == [100_000 + 900_001 * (k + 1) // 100 for k in range(100)]
    assert found[120] < 1_000_001
    assert found[161] == 300_000
    assert found[120:] == sorted(found[120:], reverse=True)


def test_the_end_of_the_last_round_ends_the_run_and_is_told() -> None:
    state, released, ended_by, trigger = on_board(
        PROGRAM
        + """
    load(session, 2, (24, 500_000, STEP, 1))
    start(session, 0)
    session.turns(19)
    assert firmware.machine.state == wire.STATE_SINKING
    session.turns(4)
    run = struct.unpack(wire.RUN_FORMAT, session.ask(wire.GET_RUN)[1])
    found = [run[1], session.board.gate.released, run[2], session.board.trigger.level]
"""
    )
    assert (state, released, ended_by, trigger) == (2, False, 8, 0)


@pytest.mark.parametrize(
    "otherwise",
    [
        "session.ask(wire.DISABLE)",
        "session.board.show(3_900_000, 12_000_000)",
    ],
    ids=["off", "fault"],
)
def test_a_program_stops_with_the_load_and_leaves_the_trigger_low(otherwise: str) -> None:
    found = on_board(
        PROGRAM
        + f"""
    load(session, 1, (1000, 500_000, STEP, 1))
    start(session, 0)
    session.turns(10)
    before = session.board.trigger.level
    {otherwise}
    session.turns(4)
    found = [before, session.board.trigger.level, firmware.program.running, session.board.gate.released]
"""
    )
    assert found == [1, 0, False, False]


def test_a_hundred_steps_are_taken_in_ten_pieces_and_one_more_is_too_long() -> None:
    found = on_board(
        PROGRAM
        + """
    steps = [(10, 1000 * number, STEP, 0) for number in range(101)]
    taken = load(session, 1, *steps[:100])
    found = [taken, firmware.program.complete(), firmware.program.value_at(99), load(session, 1, *steps)]
"""
    )
    assert found == [None, True, 99_000, [21, 0, 100]]


@pytest.mark.parametrize(
    ("step", "why"),
    [
        ("(2, 1000, STEP, 0)", "shorter than a control step"),
        ("(0, 1000, STEP, 0)", "no time at all"),
        ("(0xFFFFFFFF, 1000, STEP, 0)", "seven weeks are more than the step's count holds"),
        ("(10, -1, STEP, 0)", "negative"),
        ("(10, 0x40000000, STEP, 0)", "more than a small integer"),
        ("(10, 1000, 2, 0)", "no such shape"),
        ("(10, 1000, RAMP, 2)", "neither high nor low"),
    ],
)
def test_an_impossible_step_is_named_and_nothing_of_the_list_stays(step: str, why: str) -> None:
    found = on_board(
        PROGRAM
        + f"""
    refusal = load(session, 1, (10, 1000, STEP, 0), (10, 2000, RAMP, 1), {step}, (10, 1000, STEP, 0))
    found = [refusal, start(session, 0), session.board.gate.released]
"""
    )
    assert found == [[19, 0, 2], [19, 0, 0], False], why


def test_a_value_beyond_the_limits_in_force_is_named_when_the_load_is_to_be_turned_on() -> None:
    found = on_board(
        PROGRAM
        + """
    load(session, 1, (10, 1000, STEP, 0), (10, 3_500_000, STEP, 0), (10, 4_000_001, RAMP, 0))
    found = [start(session, 0), session.board.gate.released]
"""
    )
    assert found == [[19, 0, 2], False]


def test_pieces_out_of_order_or_missing_are_refused() -> None:
    found = on_board(
        PROGRAM
        + """
    one = (10, 1000, STEP, 0)
    found = [
        session.refusal(wire.LOAD_PROGRAM, piece(0, 4, 1, one, one)),
        session.refusal(wire.LOAD_PROGRAM, piece(3, 4, 1, one)),
        start(session, 0),
        session.refusal(wire.LOAD_PROGRAM, piece(2, 5, 1, one)),
        session.refusal(wire.LOAD_PROGRAM, piece(2, 4, 1, one, one, one)),
    ]
"""
    )
    assert found == [None, [19, 0, 2], [19, 0, 2], [19, 0, 2], [19, 0, 4]]


def test_without_end_is_followed_only_when_something_else_ends_the_run() -> None:
    found = on_board(
        PROGRAM
        + """
    load(session, 0, (24, 500_000, STEP, 0))
    refused = start(session, 0)
    session.ask(wire.SET_ENDS, struct.pack(wire.SET_ENDS_FORMAT, 0, 0, 0, 1000, 0))
    taken = start(session, 0)
    session.turns(400)
    going = firmware.machine.state
    session.turns(40)
    run = struct.unpack(wire.RUN_FORMAT, session.ask(wire.GET_RUN)[1])
    found = [refused, taken, going, run[1], run[2], firmware.program.running]
"""
    )
    assert found == [[17, 0, 1], None, 1, 2, 4, False]


def test_while_a_program_runs_nothing_can_pull_the_rug_from_under_it() -> None:
    found = on_board(
        PROGRAM
        + """
    load(session, 1, (1000, 500_000, STEP, 0))
    start(session, 0)
    found = [
        session.refusal(wire.SET_POINT, struct.pack(wire.SET_POINT_FORMAT, wire.MODE_CURRENT, 1000)),
        load(session, 1, (10, 1000, STEP, 0)),
        session.refusal(wire.SET_LIMITS, struct.pack(wire.SET_LIMITS_FORMAT, 4_000_000, 30_000_000, 40_000_000,
                                                     85_000, 125_000, 400_000, 3_000)),
        session.refusal(wire.ENABLE, struct.pack(wire.ENABLE_FORMAT, wire.SILENCE_STOP, 0, 1)),
        session.refusal(wire.ENABLE, struct.pack(wire.ENABLE_FORMAT, wire.SILENCE_STOP, 0, 0)),
    ]
"""
    )
    assert found == [[11, 0, 0], [11, 0, 0], [11, 0, 0], None, [11, 0, 0]]


FOLLOWING = (
    PROGRAM
    + """
    load(session, 0, (7, 500_000, STEP, 1), (11, 2_000_000, RAMP, 0), (13, 1, RAMP, 1))
    session.ask(wire.SET_ENDS, struct.pack(wire.SET_ENDS_FORMAT, 0, 0, 0, 100_000, 0))
    start(session, 1, wire.MODE_{mode})
    session.board.trigger.edges = None
    class Pin:
        def set(self, level):
            self.level = level
    firmware.program._trigger = Pin()
    session.turns(20)
    firmware.guard.quiet_steps = -10000
    wait, follow, step = firmware.time.wait, firmware.program.step, firmware.control.step
    gc.collect()
    _ = 0
    total = {figure}
    total = {figure}
    micropython.heap_lock()
    for _ in range(300):
        wait()
        follow()
        step()
    micropython.heap_unlock()
    found = [{figure} - total, firmware.program.running, firmware.guard.fault]
"""
)


MODES = ("CURRENT", "POWER", "RESISTANCE", "VOLTAGE")


@pytest.mark.parametrize("mode", MODES)
def test_following_a_program_allocates_nothing(mode: str) -> None:
    assert on_board(FOLLOWING.format(figure="micropython.mem_total()", mode=mode)) == [0, True, 0]


@pytest.mark.parametrize("mode", MODES)
def test_following_a_program_allocates_nothing_where_small_integers_have_31_bits(mode: str) -> None:
    assert on_32_bit_board(FOLLOWING.format(figure="gc.mem_alloc()", mode=mode)) == [0, True, 0]


@pytest.mark.parametrize(("start_value", "end_value"), [(0, (1 << 30) - 1), ((1 << 30) - 1, 0)])
@pytest.mark.parametrize("duration_ms", [3, 1_261_634_059])
def test_the_widest_ramp_stays_within_small_integers(
    start_value: int, end_value: int, duration_ms: int
) -> None:
    """The longest duration that is taken, the largest values, in both directions."""
    allocated, value = on_32_bit_board(f"""
        from program import Program
        class Anything:
            state = wire.STATE_SINKING
            def ask(self, value): pass
            def set(self, level): pass
            def end(self, reason): pass
        it = Anything()
        program = Program(2350, it, it, it, it)
        program.forget(1, 1)
        assert program.add({duration_ms}, {end_value}, wire.SHAPE_RAMP, 1)
        program.begin({start_value})
        gc.collect()
        total = gc.mem_alloc()
        total = gc.mem_alloc()
        micropython.heap_lock()
        program._go_on()
        program._sum = program._parts - 1
        program._climb()
        micropython.heap_unlock()
        found = [gc.mem_alloc() - total, program.value]
    """)
    assert allocated == 0
    assert 0 <= value < 1 << 30
