"""Messages about a run on the board: its ends, its program, its log, its bursts, and what became of it.

Quantities carry their unit in the field's name; the meaning of the other fields stands beside the layout, in
layouts.py.
"""

from __future__ import annotations

from . import layouts
from .mapping import Laid, laid_out
from .registry import Done, Message, Request, message
from .vocabulary import BurstTrigger, ReadingKind, RunEnd, Shape, Silence, State


@message(0x0F, layouts.SET_ENDS, reply=Done)
class SetEnds(Request):
    """When the board itself ends a run: whichever comes first. They hold until others are set."""

    voltage_uV: int = 0
    charge_mC: int = 0
    energy_mJ: int = 0
    duration_ms: int = 0
    temperature_mC: int = 0


@message(0x90, layouts.RUN)
class Run(Message):
    """The run that goes on, or the last one."""

    run: int
    state: State
    ended_by: RunEnd
    fetched: bool
    when_silent: Silence
    started_us: int
    ended_us: int
    charge_uC: int
    energy_uJ: int
    log_entries: int
    spacing_ms: int


@message(0x10, layouts.EMPTY, reply=Run)
class GetRun(Request):
    """Asks for the run that goes on, or the last one; answered in any session."""


@message(0x11, layouts.MARK_FETCHED, reply=Done)
class MarkFetched(Request):
    """Tells that a finished run is in a record, so that the next one may begin."""

    run: int


@laid_out(layouts.PROGRAM_STEP)
class ProgramStep(Laid):
    """One step of a program."""

    duration_ms: int
    value: int
    shape: Shape = Shape.STEP
    trigger: bool = False


@message(0x12, layouts.LOAD_PROGRAM, reply=Done)
class LoadProgram(Request):
    """A piece of a program; pieces come in order. Refused as PROGRAM_BAD with the number of the step."""

    first: int
    total: int
    repeats: int = 1
    steps: tuple[ProgramStep, ...] = ()


@laid_out(layouts.LOG_ENTRY)
class LogEntry(Laid):
    """One line of the run log that the board keeps."""

    time_ms: int
    voltage_uV: int
    voltage_min_uV: int
    voltage_max_uV: int
    current_uA: int
    heatsink_cC: int
    charge_mC: int


@message(0x8D, layouts.LOG_ENTRIES)
class LogEntries(Message):
    """A piece of the run log; fewer entries than fit mean that the log ends here."""

    first: int
    total: int
    spacing_ms: int
    entries: tuple[LogEntry, ...] = ()


@message(0x0D, layouts.GET_LOG, reply=LogEntries)
class GetLog(Request):
    """Asks for a piece of the run log."""

    first: int = 0


@laid_out(layouts.BURST_READING)
class BurstReading(Laid):
    """One conversion of a burst, in the unit of its kind."""

    kind: ReadingKind
    value: int


@message(0x94, layouts.BURST_READINGS)
class BurstReadings(Message):
    """A piece of the captured burst; fewer readings than fit mean that it ends here."""

    first: int
    total: int
    before: int
    started_us: int
    step_us: int
    readings: tuple[BurstReading, ...] = ()


@message(0x13, layouts.ARM_BURST, reply=Done)
class ArmBurst(Request):
    """Captures every conversion around a trigger; gives up what was captured before."""

    before: int = 0
    trigger: BurstTrigger = BurstTrigger.NOW


@message(0x14, layouts.GET_BURST, reply=BurstReadings)
class GetBurst(Request):
    """Asks for a piece of the captured burst."""

    first: int = 0


# What the tails of messages are made of
ENTRIES: tuple[type[Laid], ...] = (LogEntry, ProgramStep, BurstReading)
