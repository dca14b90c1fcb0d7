"""Carries out a plan on an instrument: prepares, runs each test, and turns the load off however it ends.

Decides what stops a run and what is kept of it. A test that was stopped still gives its result, from
everything measured up to then; the tests after it are named as not carried out. It knows neither files nor
screens.
"""

from __future__ import annotations

import asyncio
from dataclasses import replace
from typing import TYPE_CHECKING, Any

from sinkwright.definitions.plan import AnyTest, CurrentLimit, Hold, LoadRegulation, Rest
from sinkwright.errors import BoardRefused, Interrupted, LinkLost, SinkwrightError
from sinkwright.procedures.bench import Bench, INTERVAL_s, Stop
from sinkwright.procedures.current_limit import CurrentLimitRun
from sinkwright.procedures.endings import FAILED, INTERRUPTED, LINK_LOST, Stopped, is_planned
from sinkwright.procedures.hold import HoldRun
from sinkwright.procedures.load_regulation import LoadRegulationRun
from sinkwright.procedures.preflight import Preflight, preflight
from sinkwright.procedures.preparation import limits_restored, look_at_source, prepare
from sinkwright.procedures.procedure import Procedure
from sinkwright.procedures.progress import Progress, RunBegins, TestBegins, TestEnds, Warned
from sinkwright.procedures.rest import RestRun
from sinkwright.results import RunResult, TestResult

if TYPE_CHECKING:
    from sinkwright.definitions.board import BoardFile
    from sinkwright.definitions.plan import Plan
    from sinkwright.instrument import Instrument
    from sinkwright.records import RecordWriter

PROCEDURES: dict[type[Any], type[Procedure[Any]]] = {
    LoadRegulation: LoadRegulationRun,
    CurrentLimit: CurrentLimitRun,
    Hold: HoldRun,
    Rest: RestRun,
}


async def run_plan(
    instrument: Instrument,
    plan: Plan,
    board: BoardFile,
    writer: RecordWriter,
    progress: Progress,
    stop: Stop,
) -> RunResult:
    """Carry out `plan`; see `PlanRun.carry_out`."""
    return await PlanRun(Bench(instrument, plan, board, writer, progress, stop)).carry_out()


class PlanRun:
    """A plan being carried out. `result` may be asked at any time, also after an error."""

    def __init__(self, bench: Bench) -> None:
        self._bench = bench
        self._results: list[TestResult] = []

    @property
    def result(self) -> RunResult:
        """What was found so far."""
        bench = self._bench
        simulated = bench.instrument.identity.simulated
        return RunResult(bench.plan.name, str(bench.writer.path), simulated, tuple(self._results))

    async def carry_out(self) -> RunResult:
        """Run every test; the load is off when this returns or raises, unless the way to the board is gone.

        Returns what was found, also after a fault or an interruption during a test (see `stopped_by`).
        Raises SinkwrightError for a plan that cannot be carried out, LinkLost, and Interrupted before the
        first test; what was measured by then is in `result` and in the writer all the same.
        """
        bench = self._bench
        expected = preflight(bench.plan, bench.board)
        self._tell_begin(expected)
        async with limits_restored(bench):
            try:
                await prepare(bench)
                await self._carry_out_all(expected)
            finally:
                await turn_off(bench)
            if all(is_planned(result.stopped_by) for result in self._results):
                await bench.see_it_off()
        return self.result

    def _tell_begin(self, expected: Preflight) -> None:
        bench = self._bench
        identity = bench.instrument.identity
        bench.progress.tell(
            RunBegins(
                plan=bench.plan.name,
                board=identity.name,
                simulated=identity.simulated,
                tests=len(bench.plan.tests),
                expected_s=expected.duration_s,
                record=str(bench.writer.path),
            )
        )
        for warning in expected.warnings:
            bench.warn(warning)

    async def _carry_out_all(self, expected: Preflight) -> None:
        bench = self._bench
        tests = bench.plan.tests
        for number, test in enumerate(tests, start=1):
            if test.instruction:
                await _follow_instruction(bench, test.instruction)
            duration_s = expected.tests[number - 1].duration_s
            bench.progress.tell(TestBegins(number, test.kind, duration_s))
            bench.begin_test(duration_s)
            result, failure = await _carry_out(bench, test)
            ends_here = failure is not None or not is_planned(result.stopped_by)
            if ends_here:
                result = naming_left_out(result, tests[number:])
            self._results.append(result)
            bench.writer.add_result(result)
            bench.progress.tell(TestEnds(number, result))
            if failure is not None:
                raise failure
            if ends_here:
                return


async def turn_off(bench: Bench) -> None:
    """Clamp the gate whatever else is going on; a lost link must not hide the error that came first."""
    try:
        await bench.off()
    except LinkLost as lost:
        bench.writer.add_event(bench.now_us, "error", str(lost), {})


async def _carry_out(bench: Bench, test: AnyTest) -> tuple[TestResult, SinkwrightError | None]:
    """One test: its result, and the error that must be passed on once the result is kept."""
    run = PROCEDURES[type(test)](bench, test)
    began_us = bench.now_us
    stopped: Stopped | None = None
    failure: SinkwrightError | None = None
    try:
        await run.carry_out()
    except Stopped as planned:
        stopped = planned
    except Interrupted:
        stopped = Stopped(INTERRUPTED, "Stopped by the person at the keyboard.")
    except SinkwrightError as error:
        stopped, failure = await _explain(bench, error)
    finally:
        await turn_off(bench)
    if stopped:
        bench.progress.tell(Warned(stopped.sentence))
        bench.writer.add_event(bench.now_us, "stopped", stopped.sentence, {"stopped_by": stopped.stopped_by})
    return run.conclude(stopped, began_us, bench.now_us), failure


async def _explain(bench: Bench, error: SinkwrightError) -> tuple[Stopped, SinkwrightError | None]:
    """A refusal because of a fault is that fault; anything else is a failure that ends the run."""
    if isinstance(error, LinkLost):
        return Stopped(LINK_LOST, str(error)), error
    if isinstance(error, BoardRefused):
        fault = await bench.standing_fault()
        if fault:
            return fault, None
    return Stopped(FAILED, str(error)), error


async def _follow_instruction(bench: Bench, instruction: str) -> None:
    """Wait for the person with the load off; what the source then gives is checked against the plan."""
    bench.say(f"The load is off and waits for you. {instruction}", "instruction")
    await bench.instrument.stream(0)
    asking = asyncio.ensure_future(bench.progress.ask(instruction))
    try:
        while not asking.done():
            # The board must hear this program meanwhile, or another one may take it over.
            await bench.instrument.pause(0.2)
            await asyncio.sleep(0.05)
        await asking
    finally:
        asking.cancel()
    await bench.instrument.stream(INTERVAL_s)
    await look_at_source(bench)


def naming_left_out(result: TestResult, left: tuple[AnyTest, ...]) -> TestResult:
    """The last result of a run that stopped, telling which tests were `left` out."""
    named = tuple(f"{test.kind}: not carried out, because the run stopped before it." for test in left)
    return replace(result, not_tested=(*result.not_tested, *named))
