"""Programs and bursts: SI outside, pieces on the wire, and what the board makes of them."""

from __future__ import annotations

import asyncio
import math
from collections.abc import Awaitable, Callable
from pathlib import Path
from typing import Any, TypeVar

import pytest

import sinkwright
from sinkwright import programs
from sinkwright.errors import AskedTooMuch, BoardRefused
from sinkwright.instrument import Instrument
from sinkwright.programs import Program, ProgramStep, listed, pulses, ramp
from sinkwright_wire import messages as m
from sinkwright_wire.vocabulary import BurstTrigger, Mode, ReadingKind, Refusal, RunEnd, Shape, State

Found = TypeVar("Found")


class RecordingLink:
    """Says done to everything, and keeps it."""

    def __init__(self) -> None:
        self.asked: list[Any] = []

    async def request(self, message: Any) -> None:
        self.asked.append(message)


def sent(program: Program, mode: Mode = Mode.CURRENT) -> list[m.LoadProgram]:
    instrument: Any = type("Recording", (), {"link": RecordingLink()})()
    asyncio.run(programs.load_program(instrument, program, mode))
    return instrument.link.asked


def test_steps_go_out_ten_in_a_piece_in_the_wire_s_units() -> None:
    pieces = sent(listed([(0.1 * number, 0.5) for number in range(23)], repeats=3))
    assert [(piece.first, piece.total, piece.repeats, len(piece.steps)) for piece in pieces] == [
        (0, 23, 3, 10),
        (10, 23, 3, 10),
        (20, 23, 3, 3),
    ]
    assert pieces[1].steps[2] == m.ProgramStep(500, 1_200_000, Shape.STEP, False)


@pytest.mark.parametrize(
    ("mode", "value"),
    [
        (Mode.CURRENT, 1_500_000),
        (Mode.POWER, 1_500_000),
        (Mode.RESISTANCE, 1_500),
        (Mode.VOLTAGE, 1_500_000),
    ],
)
def test_values_are_in_the_unit_of_the_mode(mode: Mode, value: int) -> None:
    assert sent(listed([(1.5, 1.0)]), mode)[0].steps[0].value == value


def test_pulses_mark_the_high_part_and_a_ramp_its_rise() -> None:
    train = pulses(0.5, 2.0, low_s=0.1, high_s=0.3, repeats=5)
    assert train.duration_s == pytest.approx(2.0)
    assert [(step.value, step.trigger) for step in train.steps] == [(0.5, False), (2.0, True)]
    rise = ramp(0.0, 3.0, 10.0)
    assert [(step.value, step.ramp, step.trigger) for step in rise.steps] == [
        (0.0, False, False),
        (3.0, True, True),
    ]
    assert pulses(0, 1, low_s=1, high_s=1, repeats=0).duration_s == math.inf


@pytest.mark.parametrize(
    ("program", "says"),
    [
        (Program(()), "0 steps"),
        (listed([(1, 1)] * 256), "256 steps"),
        (listed([(1, 1)], repeats=-1), "repeated -1 times"),
        (listed([(1, 1), (-2.0, 1)]), "value of step 1"),
        (listed([(1, 1), (1, math.nan)]), "duration of step 1"),
    ],
)
def test_what_is_no_program_is_refused_before_anything_is_sent(program: Program, says: str) -> None:
    with pytest.raises(AskedTooMuch, match=says):
        sent(program)


def on_simulated_board(folder: Path, source: str, work: Callable[[Instrument], Awaitable[Found]]) -> Found:
    path = folder / "source.toml"
    path.write_text(source)

    async def run() -> Found:
        async with await Instrument.open(f"sim:{path},speed=max,seed=1") as load:
            return await work(load)

    return asyncio.run(run())


STIFF = 'kind = "supply"\nvoltage_V = 12.0\nresistance_ohm = 0.1\n'
#: First-order recovery with 20 ms: the voltage dips, and comes back to Ohm's law.
SLOW = STIFF + "recovery_s = 0.02\n"


def test_the_board_follows_a_program_by_itself_and_ends_the_run(tmp_path: Path) -> None:
    async def work(load: Instrument) -> tuple[list[float], Any, State]:
        await load.set_current(0.5)
        await programs.load_program(load, pulses(0.5, 1.5, low_s=0.4, high_s=0.4, repeats=3))
        await load.stream(0.1)
        await load.on(program=True)
        setpoints: list[float] = []
        for _ in range(30):
            sample = await load.next_sample(1.0)
            if sample is not None and sample.state == State.SINKING:
                setpoints.append(sample.current_A)
        return setpoints, await load.board_run(), (await load.status()).state

    currents, run, state = on_simulated_board(tmp_path, STIFF, work)
    assert 22 <= len(currents) <= 25
    assert min(currents[1:4]) == pytest.approx(0.5, abs=0.02)
    assert max(currents) == pytest.approx(1.5, abs=0.03)
    assert run.ended_by == RunEnd.PROGRAM
    assert state == State.ENDED


def test_a_burst_shows_a_source_s_recovery_from_a_load_step_and_what_was_before(tmp_path: Path) -> None:
    async def work(load: Instrument) -> programs.Burst | None:
        await load.set_current(0.5)
        await load.on()
        await load.pause(1.0)
        await programs.arm_burst(load, "set-point", before=100)
        await load.pause(0.5)
        assert await programs.fetch_burst(load) is None
        await load.set_current(2.5)
        await load.pause(6.0)
        return await programs.fetch_burst(load)

    burst = on_simulated_board(tmp_path, SLOW, work)
    assert burst is not None
    assert len(burst.points) == 2048
    assert not burst.of(ReadingKind.MISSED)
    assert burst.points[0].time_s == pytest.approx(-100 * burst.interval_s)
    before = [volt for time_s, volt in burst.voltages if time_s < -0.002]
    settled = [volt for time_s, volt in burst.voltages if time_s > 0.3]
    assert max(before) - min(before) < 0.02
    drop_V = sum(before) / len(before) - sum(settled) / len(settled)
    assert drop_V == pytest.approx(2.0 * 0.1, abs=0.01)  # Ohm's law
    # The dip that is left decays with the source's own time constant.
    final_V = sum(settled) / len(settled)
    dips = [(time_s, final_V - volt) for time_s, volt in burst.voltages if 0.01 < time_s < 0.05]
    assert dips[0][1] > 0.1
    (first_s, first_V), (last_s, last_V) = dips[0], dips[-1]
    assert (last_s - first_s) / math.log(first_V / last_V) == pytest.approx(0.02, rel=0.1)
    currents = [current for time_s, current in burst.currents if time_s > 0.02]
    assert sum(currents) / len(currents) == pytest.approx(2.5, abs=0.05)


def test_what_the_board_cannot_follow_is_told_by_the_number_of_the_step(tmp_path: Path) -> None:
    async def work(load: Instrument) -> list[BoardRefused]:
        refusals = []
        await load.set_current(0.5)
        for program in (
            listed([(0.5, 1.0), (0.5, 0.001)]),
            listed([(0.5, 1.0)] * 101),
            listed([(0.5, 1.0), (0.6, 1.0), (9.0, 1.0)]),
            Program((ProgramStep(0.5, 1.0),), repeats=0),
        ):
            with pytest.raises(BoardRefused) as caught:
                await programs.load_program(load, program)
                await load.on(program=True)
            refusals.append(caught.value)
        return refusals

    short, long, beyond, endless = on_simulated_board(tmp_path, STIFF, work)
    assert (short.refusal, short.detail) == (Refusal.PROGRAM_BAD, 1)
    assert (long.refusal, long.detail) == (Refusal.TOO_LONG, 100)
    assert (beyond.refusal, beyond.detail) == (Refusal.PROGRAM_BAD, 2)
    assert endless.refusal == Refusal.ENDS_MISSING
    assert "step 1, counted from 0" in str(short)
    assert "what fits is 100" in str(long)
    assert "repeats without end" in str(endless)


def test_a_trigger_s_name_is_the_wire_s() -> None:
    assert set(programs._TRIGGERS.values()) == set(BurstTrigger)


def test_the_example_on_the_programs_page_runs(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: Any
) -> None:
    page = (Path(__file__).resolve().parents[2] / "host" / "docs" / "programs.md").read_text(encoding="utf-8")
    monkeypatch.chdir(tmp_path)
    Path("supply.toml").write_text(SLOW)
    names: dict[str, Any] = {}
    exec(page.partition("```python\n")[2].partition("```")[0], names)
    assert names["ended"] == State.ENDED
    assert len(capsys.readouterr().out.splitlines()) == 15
    times = [time_s for time_s, _ in names["burst"].voltages[45:60]]
    assert times[0] < 0 < times[-1]


def test_a_program_without_an_end_is_not_followed_from_a_script(tmp_path: Path) -> None:
    (tmp_path / "supply.toml").write_text(STIFF)
    with (
        sinkwright.connect(f"sim:{tmp_path}/supply.toml,speed=max") as load,
        pytest.raises(AskedTooMuch, match="repeats without end"),
    ):
        load.follow(pulses(0.5, 1.0, low_s=0.1, high_s=0.1, repeats=0))
