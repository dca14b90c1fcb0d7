"""The traffic of one link: bytes out, events in, each filed where it belongs; and the words for when it
fails.

Feeds sinkwright_wire.conversation from a channel and keeps what came unasked. When to ask, to repeat or to
beat the heart is decided in `sinkwright.link`. It must not know volts or procedures.
"""

from __future__ import annotations

import secrets
from collections import deque
from collections.abc import Callable
from dataclasses import dataclass

from sinkwright import link_failures as failures
from sinkwright.errors import LOAD_UNTOUCHED, LinkLost
from sinkwright.last_known import LastKnown
from sinkwright.transport.channel import Channel
from sinkwright_wire import conversation as wire
from sinkwright_wire.messages import HelloReply, LogLine, Message

#: The silence limit assumed until the board has told its own.
DEFAULT_SILENCE_S = 3.0
#: Pushes kept for a host that does not fetch them; the oldest give way and are counted.
MAX_PUSHES = 20_000

_SESSIONS = 0xFFFF
#: Ctrl-D: to a stranger's MicroPython prompt it means "restart".
_SOFT_RESET = b"\x04"


@dataclass
class LinkCounters:
    """What went wrong on the way and was mended, since the link was opened."""

    retries: int = 0
    discarded: int = 0
    stale_replies: int = 0
    missing_telemetry: int = 0
    pushes_given_up: int = 0


class Traffic:
    """What passes over one channel. `hello` is the board's greeting, or None before it came."""

    def __init__(self, channel: Channel, on_text: Callable[[str], None] | None, session: int | None) -> None:
        self.channel = channel
        self.hello: HelloReply | None = None
        self.silence_s = DEFAULT_SILENCE_S
        self.counters = LinkCounters()
        self.last_known = LastKnown()
        self.pushes: deque[Message] = deque()
        self.spoke_s = 0.0
        self.pushed_s = float("-inf")
        # Lock-step runs repeat byte for byte, so their session must not be drawn at random.
        self.conversation = wire.Conversation(session or (1 if channel.lock_step else _draw_session()))
        self._on_text = on_text
        self._seen = bytearray()
        self._met = False

    def expect_restart(self) -> None:
        """Forget the board as it was: the next greeting is of another boot, and that is no failure."""
        self.hello = None
        self.last_known = LastKnown()
        self.pushes.clear()

    def send(self, data: bytes) -> None:
        """Hand `data` to the channel. Raises LinkLost with what is known of the load."""
        try:
            self.channel.send(data)
        except LinkLost as lost:
            raise self._explained(lost) from None
        self.spoke_s = self.channel.now_s()

    async def receive(self, until_s: float) -> Message | None:
        """Take in what comes until `until_s`, at most one receive; the reply if one is among it."""
        try:
            data = await self.channel.receive(max(0.0, until_s - self.channel.now_s()))
        except LinkLost as lost:
            raise self._explained(lost) from None
        if not self._met and len(self._seen) < failures.KEPT_BYTES:
            self._seen += data[: failures.KEPT_BYTES]
        answer = None
        for event in self.conversation.receive(data):
            reply = self._take(event)
            answer = reply if reply is not None else answer
        return answer

    def _take(self, event: wire.Occurrence) -> Message | None:
        """File one event; return the reply if it is one."""
        if isinstance(event, wire.Push):
            self._met = True
            self._keep(event.message)
            return None
        if isinstance(event, wire.Reply):
            self._met = True
            return event.message
        if isinstance(event, wire.RefusedReply):
            self._met = True
            return event.refused
        if isinstance(event, wire.TextLine):
            self._tell(event.text)
        elif isinstance(event, wire.Discarded):
            self.counters.discarded += 1
        elif isinstance(event, wire.StaleReply):
            self.counters.stale_replies += 1
        elif isinstance(event, wire.TelemetryGap):
            self.counters.missing_telemetry += event.count
        elif isinstance(event, wire.BoardRestarted) and self.hello:
            raise self._restarted()
        elif isinstance(event, wire.WrongVersion):
            raise failures.wrong_version(self.channel.url, event.version)
        return None

    def _keep(self, push: Message) -> None:
        if isinstance(push, LogLine):
            self._tell(push.text)
            return
        if self.hello and self.last_known.shows_restart(push):
            raise self._restarted()
        self.last_known.note_push(push, self.channel.now_s())
        if len(self.pushes) == MAX_PUSHES:
            self.pushes.popleft()
            self.counters.pushes_given_up += 1
        self.pushed_s = self.channel.now_s()
        self.pushes.append(push)

    def _tell(self, text: str) -> None:
        if self._on_text is not None:
            self._on_text(text)

    def where(self) -> str:
        """The board and its port, for errors."""
        return f"{self.hello.name} ({self.channel.url})" if self.hello else self.channel.url

    def state_of_load(self) -> str:
        """What is known of the load, for errors."""
        if self.hello is None:
            return LOAD_UNTOUCHED
        return self.last_known.sentence(self.channel.now_s(), self.silence_s)

    def _explained(self, lost: LinkLost) -> LinkLost:
        return failures.explained(lost, self.state_of_load()) if self.hello else lost

    def unanswered(self, sent: bytes, waited_s: float) -> LinkLost:
        """The error for `sent`, which nothing answered within `waited_s`, however often it was repeated."""
        if not self._met:
            return failures.no_board(self.channel.url, bytes(self._seen), sent)
        if self.hello is None:
            return failures.deaf(self.channel.url)
        what = f"the board stopped answering ({waited_s:g} s without a reply)"
        return self._explained(LinkLost(what, where=self.where()))

    def _restarted(self) -> LinkLost:
        return failures.restarted(self.where())


def _draw_session() -> int:
    """A session number whose greeting cannot restart a stranger's board at a MicroPython prompt."""
    while True:
        session = 1 + secrets.randbelow(_SESSIONS)
        if _SOFT_RESET not in wire.Conversation(session).hello(watch=False):
            return session
