"""A plan from file to report: checked, carried out on the board that a URL names, kept, and reported.

Decides the order, and that the record is closed with the state that the run really had. It shows nothing
itself.
"""

from __future__ import annotations

import zlib
from dataclasses import asdict, dataclass
from pathlib import Path
from typing import TYPE_CHECKING

from sinkwright.board_run import not_fetched
from sinkwright.errors import Interrupted, LinkLost, ProtectionTripped, SinkwrightError
from sinkwright.instrument import Instrument
from sinkwright.procedures.bench import Bench, Stop
from sinkwright.procedures.endings import DERATED, INTERRUPTED, is_planned
from sinkwright.procedures.preflight import preflight
from sinkwright.procedures.progress import Kept, Progress, Warned
from sinkwright.procedures.runner import PlanRun
from sinkwright.records import RecordHeader, RecordWriter, default_folder
from sinkwright.reports import write_report

if TYPE_CHECKING:
    from sinkwright.definitions.board import BoardFile
    from sinkwright.definitions.plan import Plan
    from sinkwright.results import RunResult


@dataclass(frozen=True)
class Job:
    """What to do and where to keep it. `url` None means the only board found."""

    plan: Plan
    board: BoardFile
    url: str | None = None
    folder: Path | None = None
    item: str = ""
    operator: str = ""


@dataclass(frozen=True)
class Done:
    """A job that was carried out; `report` is None when no report could be written."""

    result: RunResult
    record: Path
    report: Path | None


async def carry_out(job: Job, progress: Progress, stop: Stop) -> Done:
    """Carry out a job. Raises as `PlanRun.carry_out` does; record and report are there even then."""
    preflight(job.plan, job.board)
    instrument = await Instrument.open(job.url, stop=stop)
    async with instrument:
        await _refuse_unfetched(instrument)
        folder = (job.folder or default_folder()).absolute()
        writer = RecordWriter.create_in(folder, _header(job, instrument))
        run = PlanRun(Bench(instrument, job.plan, job.board, writer, progress, stop))
        try:
            _check_board_file(job, instrument, progress)
            result = await run.carry_out()
        except BaseException as error:
            writer.finish(_state_after(error), run.result)
            _report(writer.path, progress)
            raise
    writer.finish(_state_of(result), result)
    return Done(result, writer.path, _report(writer.path, progress))


async def _refuse_unfetched(instrument: Instrument) -> None:
    """A run that went on alone is only on the board until it is fetched: another one would write over it."""
    run = await instrument.board_run()
    if not run.fetched:
        raise not_fetched(instrument.identity.name, run)


def _header(job: Job, instrument: Instrument) -> RecordHeader:
    identity = instrument.identity
    return RecordHeader(
        plan_name=job.plan.name,
        plan_text=job.plan.text,
        board=asdict(identity),
        board_file=job.board.text,
        simulated=identity.simulated,
        url=identity.url,
        item=job.item,
        operator=job.operator,
    )


def _check_board_file(job: Job, instrument: Instrument, progress: Progress) -> None:
    """Uncertainties come from the board file here, readings from the one on the board: they must be the
    same.
    """
    crc = instrument.identity.board_file_crc
    if crc != zlib.crc32(job.board.text.encode()):
        progress.tell(
            Warned(
                f"The board {instrument.identity.name} was set up from another board file than "
                f"{job.board.name}, which "
                "is used here for uncertainties and limits. Name its own with --board."
            )
        )


def _state_of(result: RunResult) -> str:
    stops = {test.stopped_by for test in result.tests}
    if INTERRUPTED in stops:
        return "interrupted"
    return "complete" if all(is_planned(stop) or stop == DERATED for stop in stops) else "fault"


def _state_after(error: BaseException) -> str:
    if isinstance(error, Interrupted | KeyboardInterrupt):
        return "interrupted"
    if isinstance(error, ProtectionTripped):
        return "fault"
    return "lost" if isinstance(error, LinkLost) else "failed"


def _report(record: Path, progress: Progress) -> Path | None:
    """Write the report beside the record; a run is not lost because its report could not be written."""
    report: Path | None = record.with_suffix(".html")
    try:
        write_report(record, record.with_suffix(".html"))
    except SinkwrightError as error:
        progress.tell(Warned(f"There is no report. {error}"))
        report = None
    progress.kept = Kept(str(record), None if report is None else str(report))
    progress.tell(progress.kept)
    return report
