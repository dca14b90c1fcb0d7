"""Fetches a run that went on or ended without its program, and makes its record whole.

Decides which record a run on the board belongs to, what the test under way amounts to, and how the record is closed.
It only asks the board, and in the end tells it that the run is fetched: nothing here turns a load on or off. A record
is finished in one step, so a resume that was cut short can simply be repeated.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from pathlib import Path
from typing import TYPE_CHECKING, Any, cast

from sinkwright.definitions.loading import parse_board, parse_plan
from sinkwright.errors import SinkwrightError
from sinkwright.procedures.endings import BOARD_ENDS, TURNED_OFF, Stopped, is_planned, name_of
from sinkwright.procedures.hold import HoldRun
from sinkwright.procedures.runner import PROCEDURES, naming_left_out
from sinkwright.records import open_record
from sinkwright.records.board_log import LoggedEntry, as_sample, logged
from sinkwright.records.merging import Missing, merge
from sinkwright.records.naming import SUFFIX
from sinkwright.reports import write_report
from sinkwright.results import RunResult, TestResult
from sinkwright.sample import Sample
from sinkwright_wire.vocabulary import Fault, RunEnd

if TYPE_CHECKING:
    from sinkwright.board_run import BoardRun
    from sinkwright.definitions.board import BoardFile
    from sinkwright.definitions.plan import AnyTest, Plan
    from sinkwright.instrument import Instrument
    from sinkwright.procedures.bench import Bench
    from sinkwright.readings import FaultDescription
    from sinkwright.records import Record

#: States of a record whose program did not see its run to the end.
_TO_BE_FINISHED = ("open", "lost", "failed")
_LOAD_OFF = "The load is off."


@dataclass(frozen=True)
class Resumed:
    """A record that is whole now; `entries` of the board's log cover the stretch it had missed."""

    result: RunResult
    record: Path
    report: Path
    entries: int
    words: str


@dataclass(frozen=True)
class Fetched:
    """All that the board has to tell of its run."""

    run: BoardRun
    spacing_us: int
    log: tuple[Any, ...]
    fault: FaultDescription | None


async def resume(instrument: Instrument, folder: Path, record_path: Path | None = None) -> Resumed:
    """Fetch the board's last run into its record: `record_path`, or the one in `folder` that names the run.

    Raises SinkwrightError while the run goes on, when there is none, or when no record names it.
    """
    fetched = await _fetch(instrument)
    path = record_path or _find(folder, fetched.run.run)
    resumed = _finish(path, fetched)
    await instrument.mark_fetched(fetched.run.run)
    return resumed


async def _fetch(instrument: Instrument) -> Fetched:
    run = await instrument.board_run()
    if run.going:
        raise SinkwrightError(
            f"the run still goes on, with {run.charge_uC / 3.6e9:.3f} Ah drawn so far",
            where=f"board {instrument.identity.name}",
            load=(await instrument.status()).in_words,
            remedy="Wait for its end and run this again; `sinkwright off` would end it now.",
        )
    if not run.started_us:
        raise SinkwrightError(
            "the board keeps no run: it has not sunk since it was last started",
            where=f"board {instrument.identity.name}",
            load=_LOAD_OFF,
            remedy="What the record holds is all there is; `sinkwright report` opens it.",
        )
    log = await instrument.log()
    fault = await instrument.fault() if run.ended_by == RunEnd.FAULT else None
    return Fetched(run, round(log.spacing_s * 1e6), log.entries, fault)


def _find(folder: Path, run: int) -> Path:
    """The newest record in `folder` that names the run."""
    paths = sorted(folder.glob(f"*{SUFFIX}"), reverse=True) if folder.is_dir() else []
    for path in paths:
        try:
            with open_record(path) as record:
                if any(named.run == run for named in record.board_runs()):
                    return path
        except SinkwrightError:
            continue
    raise SinkwrightError(
        f"no record names the run {run:08X} that the board keeps",
        where=str(folder),
        load=_LOAD_OFF,
        remedy="Name its record: `sinkwright resume RECORD`, as `run --out` put it elsewhere.",
    )


def _finish(path: Path, fetched: Fetched) -> Resumed:
    run = fetched.run
    with open_record(path) as record:
        numbers = [named.test for named in record.board_runs() if named.run == run.run]
        if not numbers:
            raise SinkwrightError(
                f"this record is of another run than the one that the board keeps ({run.run:08X})",
                where=str(path),
                load=_LOAD_OFF,
                remedy="Leave the name out: then the record that belongs to it is looked for.",
            )
        done = record.run_result()
        if record.state not in _TO_BE_FINISHED and done is not None:
            return _already_whole(path, done)
        missing = _what_is_missing(record, numbers[-1], fetched)
    merge(path, missing)
    report = write_report(path, path.with_suffix(".html"))
    count = sum(entry.missed for entry in missing.entries)
    return Resumed(missing.result, path, report, count, missing.words)


def _already_whole(path: Path, done: RunResult) -> Resumed:
    report = write_report(path, path.with_suffix(".html"))
    return Resumed(done, path, report, 0, "The record was whole already.")


def _what_is_missing(record: Record, number: int, fetched: Fetched) -> Missing:
    header, run = record.header, fetched.run
    plan = parse_plan(header.plan_text, header.plan_name)
    entries = logged(
        fetched.log,
        test=number,
        started_us=run.started_us,
        spacing_us=fetched.spacing_us,
        gaps=record.gaps(),
    )
    words = _in_words(entries, fetched)
    past = PastBench(plan, parse_board(header.board_file), run.started_us)
    result = _result_of(past, plan.tests[number - 1], fetched, entries, words)
    if left := plan.tests[number:]:
        result = naming_left_out(result, left)
    results = (*record.results()[: number - 1], result)
    whole = RunResult(plan.name, str(record.path), header.simulated, results)
    return Missing(entries, number, whole, _state(result, bool(left)), run.ended_us, words)


@dataclass
class PastBench:
    """As much of a bench as concluding a test needs, of a run that is over."""

    plan: Plan
    board: BoardFile
    commanded_us: int


def _result_of(
    past: PastBench, test: AnyTest, fetched: Fetched, entries: list[LoggedEntry], words: str
) -> TestResult:
    run = fetched.run
    procedure = PROCEDURES[type(test)](cast("Bench", past), test)
    procedure.stopped_by = BOARD_ENDS.get(run.ended_by)
    if isinstance(procedure, HoldRun):
        procedure.take_from_board(_samples(entries, run), run.duration_s)
    procedure.notes.append(words)
    stopped = None if procedure.stopped_by else _stop(fetched)
    return procedure.conclude(stopped, run.started_us, run.ended_us)


def _stop(fetched: Fetched) -> Stopped:
    """Why the run ended, where its plan did not ask for it."""
    if fetched.run.ended_by == RunEnd.FAULT:
        fault = fetched.fault
        if fault is None:
            return Stopped(name_of(Fault.NONE), "A protection stopped the run; it has been cleared since.")
        return Stopped(fault.name, f"The board stopped by itself: {fault.sentence}")
    return Stopped(TURNED_OFF, "Somebody turned the load off: `sinkwright off`, or its button.")


def _state(result: TestResult, tests_left: bool) -> str:
    if not is_planned(result.stopped_by):
        return "interrupted" if result.stopped_by == TURNED_OFF else "fault"
    return "lost" if tests_left else "complete"


def _samples(entries: list[LoggedEntry], run: BoardRun) -> list[Sample]:
    """The log as samples, each standing for its whole spacing; the last one has the run's final meters."""
    samples = [as_sample(entry) for entry in entries]
    if samples:
        samples[-1] = replace(samples[-1], charge_uC=run.charge_uC, energy_uJ=run.energy_uJ)
    return samples


def _in_words(entries: list[LoggedEntry], fetched: Fetched) -> str:
    missed = sum(entry.missed for entry in entries)
    if not missed:
        return "The run was fetched from the board after its program had gone; no stretch of it is missing."
    return (
        f"Without its program the board kept {missed} entries, one every {fetched.spacing_us / 1e6:g} s: that stretch "
        "is coarser than the rest."
    )
