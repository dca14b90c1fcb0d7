"""What a procedure works on: the load, the record, and the person watching; and the few things it may do.

Everything that draws current goes through `sink` and ends by `off`, so the words that a person reads and the
event that the record keeps are always those of what the load was told. It knows no kind of test.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Protocol

from sinkwright.errors import LinkLost, ProtectionTripped
from sinkwright.procedures.endings import DERATED, INTERRUPTED, TURNED_OFF, Stopped, name_of
from sinkwright.procedures.progress import Doing, Progress, Reading, Warned
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

    async def sink(self, current_A: float) -> None:
        """Draw `current_A`; turns the load on if it is off, with a current zero measured just before."""
        await self.instrument.set_current(current_A)
        if not self.sinking:
            # Told before it is so: a failure in between must still end with the load turned off.
            self.sinking = self.progress.sinking = True
            await self.instrument.on(when_host_silent=self.plan.when_host_silent)
        self.commanded_us = (await self.instrument.status()).time_us
        self.say(f"The load sinks {current_A:.3f} A.")

    async def off(self) -> None:
        """Clamp the gate. Never refused."""
        await self.instrument.off()
        if self.sinking:
            self.say("The load is off.")
        self.sinking = self.progress.sinking = self._seen_sinking = False

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
        elif self._seen_sinking:
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
