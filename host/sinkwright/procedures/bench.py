"""What a procedure works on: the load, the record, and the person watching; and the few things it may do.

Everything that draws current goes through `sink` and ends by `off`, so the words that a person reads and the
event that the record keeps are always those of what the load was told. It knows no kind of test.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Protocol

from sinkwright.board_run import BoardEnds
from sinkwright.errors import BoardRefused, LinkLost, ProtectionTripped
from sinkwright.procedures.endings import DERATED, INTERRUPTED, TURNED_OFF, Stopped, name_of
from sinkwright.procedures.progress import Doing, Progress, Reading, Warned
from sinkwright.procedures.setpoint import SetPoint
from sinkwright.records.board_log import BOARD_RUN, BoardRunName, GAP_us, LoggedEntry, logged
from sinkwright_wire.messages import Fault, Limiting, State

if TYPE_CHECKING:
    from sinkwright.definitions.board import BoardFile
    from sinkwright.definitions.plan import Plan
    from sinkwright.instrument import Instrument
    from sinkwright.readings import LoadEvent
    from sinkwright.records import RecordWriter
    from sinkwright.sample import Sample

#: Telemetry interval of a run: ten frames a second, each the mean of about twenty voltage-current pairs.
INTERVAL_s = 0.1
#: A frame that has not come after this long is not coming: the link is asked for the reason.
FRAME_TIMEOUT_s = 2.0
#: After the load was turned off at the end: enough for the board to find current that flows all the same.
FRAMES_AFTER = 3


class Stop(Protocol):
    """Anything that can say that the person asked to stop."""

    @property
    def requested(self) -> bool: ...


@dataclass
class Bench:
    """The load under a plan. `last` is the newest frame; `sinking` what the load was told last."""

    instrument: Instrument
    plan: Plan
    board: BoardFile
    writer: RecordWriter
    progress: Progress
    stop: Stop
    last: Sample | None = field(default=None, init=False)
    sinking: bool = field(default=False, init=False)
    #: Length of the test going on, for the progress it shows.
    expected_s: float = field(default=0.0, init=False)
    _test_began_us: int = field(default=0, init=False)
    _test_number: int = field(default=0, init=False)
    #: Name of the run going on, if the board would go on with it alone.
    _lone_run: int = field(default=0, init=False)
    #: Stretches of that run of which no sample came, as while the computer sleeps.
    _gaps: list[tuple[int, int]] = field(default_factory=list, init=False)
    #: The board's log of the run that is over, if there were such stretches.
    kept_by_board: list[LoggedEntry] = field(default_factory=list, init=False)
    #: Frames from before the load was turned on still arrive: only what was seen sinking can be seen to stop.
    _seen_sinking: bool = field(default=False, init=False)
    #: The board's time just after the newest command to sink: earlier frames were on their way already.
    commanded_us: int = field(default=0, init=False)

    def __post_init__(self) -> None:
        self.instrument.on_event.append(self._keep_event)

    @property
    def now_us(self) -> int:
        """The board's time of the newest frame."""
        return self.last.time_us if self.last else 0

    def begin_test(self, expected_s: float) -> None:
        """Count the progress of a test of about `expected_s` from here."""
        self.expected_s = expected_s
        self._test_began_us = self.now_us
        self._test_number += 1

    def say(self, sentence: str, kind: str = "doing") -> None:
        """Tell the person and the record what the load is doing."""
        self.progress.tell(Doing(sentence))
        self.writer.add_event(self.now_us, kind, sentence, {})

    def warn(self, sentence: str) -> None:
        """Tell the person and the record something that does not stop the run."""
        self.progress.tell(Warned(sentence))
        self.writer.add_event(self.now_us, "warning", sentence, {})

    def _keep_event(self, event: LoadEvent) -> None:
        """What the board tells by itself goes into the record."""
        data = {"code": event.code, "value": event.value, "limit": event.limit}
        self.writer.add_event(event.time_us, event.name, event.in_words, data)

    async def sink(self, current_A: float, ends: BoardEnds | None = None) -> None:
        """Draw `current_A`; turns the load on if it is off, with a current zero measured just before.

        With `ends` the board ends the run by itself, and goes on alone for them if the plan says so.
        """
        await self.hold(SetPoint("current_A", current_A), ends)

    async def hold(self, setpoint: SetPoint, ends: BoardEnds | None = None) -> None:
        """The same with a set-point of any mode."""
        await setpoint.ask(self.instrument)
        if not self.sinking:
            # Told before it is so: a failure in between must still end with the load turned off.
            self.sinking = self.progress.sinking = True
            await self._begin_run(ends)
        self.commanded_us = (await self.instrument.status()).time_us
        self.say(f"The load {setpoint.in_words}.")

    async def _begin_run(self, ends: BoardEnds | None) -> None:
        """Turn the load on under a name that the record keeps, so that `resume` finds one by the other."""
        # Without ends of its own a board must not go on alone: the steps of other kinds are this program's.
        alone = ends is not None and self.plan.when_host_silent == "continue"
        run = self.instrument.name_run()
        self.kept_by_board = []
        wanted = ends or BoardEnds()
        await self.instrument.set_ends(wanted if alone else wanted.tellable())
        self.writer.add_event(
            self.now_us,
            BOARD_RUN,
            f"Run {run:08X} begins on the board"
            + (", which would go on with it alone." if alone else ", which stops it when it is left alone."),
            BoardRunName(run, self._test_number, alone)._asdict(),
        )
        await self.instrument.on("continue" if alone else "stop", run)
        self._lone_run = run if alone else 0

    async def off(self) -> None:
        """Clamp the gate. Never refused."""
        await self.instrument.off()
        if self.sinking:
            self.say("The load is off.")
        self.sinking = self.progress.sinking = self._seen_sinking = False
        if self._lone_run and not self.writer.failed:
            await self._take_over_lone_run()

    async def _take_over_lone_run(self) -> None:
        """All of the run is in the record, or goes there now: the board need not keep it any longer."""
        run, self._lone_run = self._lone_run, 0
        try:
            if self._gaps:
                await self._fill_gaps()
            await self.instrument.mark_fetched(run)
        except BoardRefused as refused:
            self.warn(str(refused))

    async def _fill_gaps(self) -> None:
        """What this program slept through is in the board's own log, coarser."""
        with self.instrument.finishing():
            run, log = await self.instrument.board_run(), await self.instrument.log()
        entries = logged(
            log.entries,
            test=self._test_number,
            started_us=run.started_us,
            spacing_us=round(log.spacing_s * 1e6),
            gaps=self._gaps,
        )
        self.writer.add_board_log(entries)
        self.kept_by_board = entries
        self._gaps.clear()
        self.warn(
            f"For a while no readings came. The board kept {sum(entry.missed for entry in entries)} entries meanwhile, "
            f"one every {log.spacing_s:g} s: that stretch is coarser than the rest."
        )

    async def next_frame(self) -> Sample:
        """The next telemetry frame that ends after the newest command to sink. All go into the record.

        Raises Stopped when the frame shows a fault or derating, or when the person asked to stop.
        """
        while True:
            sample = await self._receive()
            if sample.time_us > self.commanded_us:
                return sample

    async def _receive(self) -> Sample:
        if self.stop.requested:
            raise Stopped(INTERRUPTED, "Stopped by the person at the keyboard.")
        sample = await self.instrument.next_sample(FRAME_TIMEOUT_s)
        if sample is None:
            raise LinkLost(
                f"the board has sent no reading for {FRAME_TIMEOUT_s:g} s, although it answers",
                load="The load has been told to turn off.",
                remedy="Look whether something else takes the board's telemetry, then run the plan again.",
            )
        if self._lone_run and self.last and sample.time_us - self.last.time_us > GAP_us:
            self._gaps.append((self.last.time_us, sample.time_us))
        self.last = sample
        self.writer.add_samples([sample])
        self._show(sample)
        await self._check(sample)
        return sample

    async def see_it_off(self) -> None:
        """Read on after the load was turned off, so that the record ends with it off.

        Raises ProtectionTripped when current flows all the same, or another fault shows.
        """
        for _ in range(FRAMES_AFTER):
            with self.instrument.finishing():
                sample = await self.instrument.next_sample(FRAME_TIMEOUT_s)
            if sample is None:
                return
            self.writer.add_samples([sample])
            if sample.state == State.FAULT:
                stopped = await self.standing_fault()
                name = stopped.stopped_by if stopped else name_of(Fault(sample.fault))
                what = stopped.sentence if stopped else Fault(sample.fault).sentence
                raise ProtectionTripped(what, fault=name, load="The run was over by then.")

    def _show(self, sample: Sample) -> None:
        gone_s = (sample.time_us - self._test_began_us) / 1e6
        fraction = min(gone_s / self.expected_s, 1.0) if self.expected_s else 0.0
        self.progress.tell(
            Reading(sample.time_us, sample.voltage_V, sample.current_A, sample.heatsink_degC, fraction)
        )

    async def _check(self, sample: Sample) -> None:
        if sample.state == State.FAULT:
            fault = await self.standing_fault()
            raise fault or Stopped(name_of(Fault(sample.fault)), Fault(sample.fault).sentence)
        if self.sinking and sample.state == State.SINKING:
            self._seen_sinking = True
        elif self._seen_sinking and sample.state != State.ENDED:
            raise Stopped(TURNED_OFF, "Somebody else turned the load off: `sinkwright off`, or its button.")
        if self.sinking and sample.limiting == Limiting.DERATED:
            raise Stopped(
                DERATED,
                f"The load drew less than asked, to keep its heatsink ({sample.heatsink_degC:.0f} °C) from "
                "overheating. Let it cool, or ask for less power.",
            )

    async def standing_fault(self) -> Stopped | None:
        """The board's latched fault as a stop, in the board's own words; None when there is none."""
        with self.instrument.finishing():
            told = await self.instrument.fault()
        if told is None:
            return None
        sentence = told.sentence.rstrip(".")
        return Stopped(told.name, f"The board stopped by itself: {sentence}. {told.load_in_words}")
