"""An exception raised inside every module of the firmware in turn: the gate is clamped, and it is told.

In each module, every function and method that a start calls, or a load that sinks in any mode, follows a program, keeps
a burst, ends or trips, is made to raise, one after the other, in a firmware of its own; then the load must be off,
the text must name the error, and a maintenance boot follow.
"""

from __future__ import annotations

import pytest

from tests.firmware.running import on_board
from tests.support.micropython import FIRMWARE

#: Constants, plain values and an exception's own class: nothing in them could raise.
NOTHING_RUNS = {"wire", "safe_image", "refusal"}
#: Chosen by the board file, which here names other parts; their drivers are called as those are.
OTHER_CHIPS = {
    str(path.relative_to(FIRMWARE).with_suffix("")).replace("/", ".")
    for path in (FIRMWARE / "chips").glob("*.py")
} - {"chips.adc_ads1115", "chips.dac_mcp4725"}
#: The loop that does the telling, and what every bus error comes from (tests/firmware/test_control.py).
THE_LOOP_AND_ITS_BOARD = {"main", "board"}
MODULES = sorted(
    {str(path.relative_to(FIRMWARE).with_suffix("")).replace("/", ".") for path in FIRMWARE.rglob("*.py")}
    - NOTHING_RUNS
    - OTHER_CHIPS
    - THE_LOOP_AND_ITS_BOARD
    | {"chips"}
)

TRAPS = """
    import binascii, main, sys, startup
    import {module}
    module = sys.modules["{module}"]
    texts = []
    startup.print = lambda *values: texts.append(" ".join([str(value) for value in values]))
    true_start = startup.start
    armed = None
    called = []

    def trapped(name, true):
        def trap(*arguments):
            if name == armed:
                raise NotImplementedError("raised in " + name)
            if name not in called:
                called.append(name)
            return true(*arguments)
        return trap

    def set_traps(owner, prefix):
        for name in dir(owner):
            true = owner.__dict__.get(name)
            if type(true) is type(set_traps):
                setattr(owner, name, trapped(prefix + name, true))

    for name in dir(module):
        one = getattr(module, name)
        if isinstance(one, type) and one.__name__ == name and not issubclass(one, Exception):
            set_traps(one, name + ".")
        elif type(one) is type(set_traps) and name not in ("start", "leave"):
            setattr(module, name, trapped(name, one))

    class TimeIsUp(BaseException):
        pass

    content = struct.pack(wire.HEADER_FORMAT, wire.VERSION, wire.GET_STATUS, 1, 9999, 0)
    FRAME = b"~" + content + struct.pack("<I", binascii.crc32(content)) + b"~"

    def limited(board, turns):
        true = board.clock.wait_until
        left = [turns]
        def wait_until(ticks):
            left[0] -= 1
            if not left[0]:
                raise TimeIsUp
            board.stream.incoming = FRAME
            true(ticks)
        board.clock.wait_until = wait_until

    def loop(board):
        try:
            main.run(board)
        except TimeIsUp:
            pass

    def from_the_start():
        board = Board()
        board.gate.release()
        limited(board, 30)
        loop(board)
        return board

    def set_point(mode, value):
        return lambda session: session.ask(wire.SET_POINT, struct.pack(wire.SET_POINT_FORMAT, mode, value))

    def follow_a_program(session):
        session.ask(wire.DISABLE)
        step = struct.pack(wire.PROGRAM_STEP_FORMAT, 1000, 500_000, wire.SHAPE_RAMP, 1)
        session.ask(wire.LOAD_PROGRAM, struct.pack(wire.LOAD_PROGRAM_FORMAT, 0, 1, 9) + step)
        session.turns(20)
        session.ask(wire.ENABLE, struct.pack(wire.ENABLE_FORMAT, wire.SILENCE_STOP, 0, 1))
        session.turns(5)

    def end_soon(session):
        session.ask(wire.SET_ENDS, struct.pack(wire.SET_ENDS_FORMAT, 0, 0, 0, 100, 0))

    SITUATIONS = (
        set_point(wire.MODE_CURRENT, 900_000),
        set_point(wire.MODE_POWER, 10_000_000),
        set_point(wire.MODE_RESISTANCE, 14_000),
        set_point(wire.MODE_VOLTAGE, 11_000_000),
        lambda session: session.ask(wire.ARM_BURST, struct.pack(wire.ARM_BURST_FORMAT, 10, wire.BURST_TRIGGER_NOW)),
        follow_a_program,
        end_soon,
        lambda session: session.board.show(5_900_000, 12_000_000),
    )

    def while_sinking(situation, name):
        global armed
        session = Session()
        session.sink(1_000_000)
        situation(session)
        firmware = session.firmware
        firmware.telemetry.ask(4)
        assert session.board.gate.released
        del firmware.link.send, firmware.link.poll, called[:]
        limited(session.board, 100)
        startup.start = lambda board, make: firmware
        armed = name
        loop(session.board)
        armed = None
        startup.start = true_start
        return session.board

    def judge(stage, name, board):
        text = "".join(texts)
        del texts[:]
        told = "raised in " + name in text and board.restarts == [[True, wire.RESET_EXCEPTION]]
        if board.gate.released or not told:
            found.append([stage, name, board.gate.released, board.restarts, text])

    found = []
    from_the_start()
    at_start = list(called)
    for name in at_start:
        armed = name
        board = from_the_start()
        armed = None
        judge("start", name, board)
    in_the_loop = []
    for number, situation in enumerate(SITUATIONS):
        # Once without a trap armed: what is called in it.
        while_sinking(situation, None)
        for name in [name for name in called if name not in in_the_loop]:
            in_the_loop.append(name)
            judge(number, name, while_sinking(situation, name))
    found.append(len(at_start) + len(in_the_loop))
"""


@pytest.mark.parametrize("module", MODULES)
def test_an_exception_inside_a_module_clamps_is_told_and_leads_to_a_maintenance_boot(module: str) -> None:
    *failures, raised = on_board(TRAPS.format(module=module), heapsize="2M")
    assert failures == []
    assert raised > 0, "nothing in this module was called"
