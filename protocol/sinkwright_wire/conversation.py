"""The host's side of the conversation: one request at a time, each answered, repeated or given up.

Bytes in, events out; no I/O and no clock, so that a serial port, a simulated board and a test drive the
same object. The rules stand in `RULES` below. What a reply means for the load is decided further up, and so
is when to repeat.

The board takes the next sequence number as new, answers the last one again from memory, and refuses
anything else. So a repeated request never acts twice, and a host that gave a request up (and cannot know
whether it was heard) must say hello again, which tells the board where to go on.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from enum import Enum

from .errors import BadField, OutOfTurn, VersionMismatch, WireError
from .framing import Deframer, Frame, Text, encode_frame
from .layouts import VERSION
from .messages import Done, Envelope, Hello, HelloReply, Message, Refused, Request, Telemetry, pack, parse
from .messages import Push as PushMessage


@dataclass(frozen=True, slots=True)
class Reply:
    """The answer to the outstanding request."""

    message: Message


@dataclass(frozen=True, slots=True)
class RefusedReply:
    """The outstanding request was refused."""

    refused: Refused


@dataclass(frozen=True, slots=True)
class Push:
    """Something the board sent unasked."""

    message: Message


@dataclass(frozen=True, slots=True)
class TextLine:
    """A line that the firmware printed."""

    text: str


@dataclass(frozen=True, slots=True)
class Discarded:
    """Bytes that were no message, and why."""

    reason: str


@dataclass(frozen=True, slots=True)
class StaleReply:
    """An answer that nobody waits for: to an earlier request, or to another host's."""

    envelope: Envelope


@dataclass(frozen=True, slots=True)
class BoardRestarted:
    """The board has started anew since the last hello: everything it was told is forgotten."""

    boot_number: int


@dataclass(frozen=True, slots=True)
class WrongVersion:
    """The board speaks another version of the wire."""

    version: int


@dataclass(frozen=True, slots=True)
class TelemetryGap:
    """Readings that fell due and did not arrive, just before the next push."""

    first_missing: int
    count: int


Occurrence = (
    Reply
    | RefusedReply
    | Push
    | TextLine
    | Discarded
    | StaleReply
    | BoardRestarted
    | WrongVersion
    | TelemetryGap
)


class Turn(Enum):
    """Whose turn it is."""

    FREE = "no request is outstanding"
    WAITING = "a request waits for its answer"


class Arrival(Enum):
    """What a good frame is to this conversation."""

    ANSWER = "the reply that the outstanding request calls for"
    REFUSAL = "a refusal of the outstanding request"
    PUSH = "a push"
    OTHER = "any other reply or request"


# What each arrival leads to. In FREE nothing is outstanding, so no frame can be its answer or its refusal.
RULES: dict[tuple[Turn, Arrival], tuple[Turn, type[Occurrence]]] = {
    (Turn.FREE, Arrival.PUSH): (Turn.FREE, Push),
    (Turn.FREE, Arrival.OTHER): (Turn.FREE, StaleReply),
    (Turn.WAITING, Arrival.ANSWER): (Turn.FREE, Reply),
    (Turn.WAITING, Arrival.REFUSAL): (Turn.FREE, RefusedReply),
    (Turn.WAITING, Arrival.PUSH): (Turn.WAITING, Push),
    (Turn.WAITING, Arrival.OTHER): (Turn.WAITING, StaleReply),
}

_HALF_THE_NUMBERS = 1 << 31


class Conversation:
    """One session with one board. `session` is drawn at random by the caller, from 1 to 65535."""

    def __init__(self, session: int) -> None:
        if not 1 <= session <= 0xFFFF:
            raise BadField("Conversation", "session", session, "an integer from 1 to 65535")
        self.session = session
        self.boot_number: int | None = None
        self.stale_replies = 0
        self.telemetry_missing = 0
        self.deframer = Deframer()
        self._turn = Turn.FREE
        self._sequence = 0
        self._request: Request | None = None
        self._bytes = b""
        self._next_number: int | None = None

    @property
    def outstanding(self) -> Request | None:
        """The request that waits for its answer."""
        return self._request if self._turn is Turn.WAITING else None

    def hello(self, watch: bool = False) -> bytes:
        """The bytes of a hello; gives up whatever is outstanding."""
        self.abandon()
        return self.request(Hello(VERSION, watch))

    def request(self, message: Request) -> bytes:
        """The bytes of a new request. Raises OutOfTurn while another one is outstanding."""
        if self.outstanding is not None:
            waiting, asked = type(self.outstanding).__name__, type(message).__name__
            raise OutOfTurn(f"{asked} was asked while {waiting} is outstanding")
        self._sequence = (self._sequence + 1) & 0xFFFF
        self._bytes = encode_frame(pack(message, self.session, self._sequence))
        self._request = message
        self._turn = Turn.WAITING
        return self._bytes

    def repeat(self) -> bytes:
        """The outstanding request's bytes again, unchanged. Raises OutOfTurn when nothing is outstanding."""
        if self.outstanding is None:
            raise OutOfTurn("nothing is outstanding that could be repeated")
        return self._bytes

    def abandon(self) -> None:
        """Give the outstanding request up. Only hello, or what needs no session, may follow."""
        self._turn = Turn.FREE

    def receive(self, data: bytes) -> list[Occurrence]:
        """What `data` completes, in its order."""
        occurrences: list[Occurrence] = []
        for found in self.deframer.feed(data):
            if isinstance(found, Frame):
                occurrences.extend(self._take(found.content))
            elif isinstance(found, Text):
                occurrences.extend(TextLine(line) for line in found.text.splitlines() if line.strip())
            else:
                occurrences.append(Discarded(f"{found.length} bytes: {found.reason}"))
        return occurrences

    def _take(self, content: bytes) -> Iterator[Occurrence]:
        try:
            envelope = parse(content)
        except VersionMismatch as mismatch:
            yield WrongVersion(mismatch.version)
            return
        except WireError as error:
            yield Discarded(str(error))
            return
        self._turn, kind = RULES[self._turn, self._arrival(envelope)]
        message = envelope.message
        if kind is StaleReply:
            self.stale_replies += 1
            yield StaleReply(envelope)
        elif kind is RefusedReply and isinstance(message, Refused):
            yield RefusedReply(message)
        elif kind is Push:
            yield from self._gap_before(message)
            yield Push(message)
        else:
            yield from self._answered(message)

    def _arrival(self, envelope: Envelope) -> Arrival:
        message = envelope.message
        if isinstance(message, PushMessage):
            return Arrival.PUSH
        request = self.outstanding
        if request is None or (envelope.session, envelope.sequence) != (self.session, self._sequence):
            return Arrival.OTHER
        if isinstance(message, Refused) and message.request == request.ID:
            return Arrival.REFUSAL
        if isinstance(message, Done) and message.request != request.ID:
            return Arrival.OTHER
        return Arrival.ANSWER if isinstance(message, request.REPLY) else Arrival.OTHER

    def _answered(self, message: Message) -> Iterator[Occurrence]:
        """A hello's reply tells more than that it came: who speaks which version, and since when."""
        if isinstance(message, HelloReply):
            if message.wire_version != VERSION:
                yield WrongVersion(message.wire_version)
                return
            if self.boot_number not in (None, message.boot_number):
                self._next_number = None
                yield BoardRestarted(message.boot_number)
            self.boot_number = message.boot_number
        yield Reply(message)

    def _gap_before(self, message: Message) -> Iterator[Occurrence]:
        """Whether telemetry is missing between the last one and this one."""
        if not isinstance(message, Telemetry):
            return
        expected = self._next_number
        self._next_number = (message.number + 1) & 0xFFFFFFFF
        if expected is None:
            return
        count = (message.number - expected) & 0xFFFFFFFF
        # Numbers that run backwards belong to a board that has restarted; the next hello will say so.
        if 0 < count < _HALF_THE_NUMBERS:
            self.telemetry_missing += count
            yield TelemetryGap(expected, count)
