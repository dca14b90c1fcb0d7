"""What to say when a link fails: what was seen on the port, who else holds the board, what the load does now.

It judges what others have seen, and makes the errors. It must not open, send or wait.
"""

from __future__ import annotations

from sinkwright.errors import LOAD_UNTOUCHED, BoardRefused, LinkLost
from sinkwright_wire.messages import VERSION
from sinkwright_wire.vocabulary import Refusal

#: Enough to recognise a prompt or a banner.
KEPT_BYTES = 200
_SHOWN_CHARACTERS = 40
_SHOWN_BYTES = 8


def no_board(url: str, seen: bytes, sent: bytes) -> LinkLost:
    """The error for a port where `sent` was said and `seen` came, none of it a valid frame."""
    what, remedy = _judge(seen, sent)
    return LinkLost(what, where=url, load=LOAD_UNTOUCHED, remedy=remedy)


def deaf(where: str) -> LinkLost:
    """The error for a board whose pushes arrive, but which answers no greeting."""
    return LinkLost(
        "the board sends, but does not answer this program",
        where=where,
        remedy="Switch the board off and on again.",
    )


def restarted(where: str) -> LinkLost:
    """The error for a board that has started anew under this program."""
    return LinkLost(
        "the board has restarted",
        where=where,
        load="A board starts with its gate clamped, so the load is off.",
        remedy="Look at its supply and at what it printed, then start again.",
    )


def not_restarted(where: str) -> LinkLost:
    """The error for a board that was asked to restart and answers as if nothing had been."""
    return LinkLost(
        "the board was asked to restart and has not",
        where=where,
        load="A board restarts with its gate clamped, and takes the request only while the load is off.",
        remedy="Switch the board off and on again.",
    )


def held_by_another(where: str, heard_ms: int) -> BoardRefused:
    """The error for a board that another program controls."""
    return BoardRefused(
        f"another program controls this board (heard {heard_ms / 1000:.1f} s ago)",
        refusal=Refusal.NOT_IN_CONTROL,
        where=where,
        load="This program changed nothing on the load.",
        remedy="Let that program end, or turn the load off with `sinkwright off`, which anybody may.",
    )


def wrong_version(where: str, version: int) -> LinkLost:
    """The error for firmware that speaks another wire version."""
    return LinkLost(
        f"the board's firmware speaks wire version {version}, this program version {VERSION}",
        where=where,
        load=LOAD_UNTOUCHED,
        remedy="Bring firmware and program to the same release.",
    )


def explained(lost: LinkLost, load: str) -> LinkLost:
    """`lost` with what is known of the load, for a link that worked before."""
    lost.load = load
    lost.remedy = lost.remedy or (
        "Check the cable and the board's supply; if the load must be off at once, press its OFF button or "
        "pull the source lead. Then connect again."
    )
    return lost


def _judge(seen: bytes, sent: bytes) -> tuple[str, str]:
    if not seen:
        return (
            "nothing answered",
            "Check that the board has power and runs the firmware; `sinkwright ports` lists what is there.",
        )
    if sent in seen:
        return (
            "what was sent came back unchanged, so this port loops to itself",
            "Choose the port of a board; `sinkwright ports` lists what is there.",
        )
    if b">>> " in seen or b"raw REPL" in seen:
        return (
            f"bytes came, but none were ours: {_excerpt(seen)}, a MicroPython prompt",
            "The board waits at its prompt instead of running the firmware: switch it off and on again.",
        )
    return (
        f"bytes came, but none were ours: {_excerpt(seen)}",
        "Another device or program speaks on this port; `sinkwright ports` lists what is there.",
    )


def _excerpt(seen: bytes) -> str:
    text = " ".join(seen.decode("utf-8", "replace").split())
    readable = sum(character.isprintable() and character != "\ufffd" for character in text)
    if text and readable >= 0.9 * len(text):
        shown = "".join(character for character in text if character.isprintable())
        return f"text '{shown[:_SHOWN_CHARACTERS]}'"
    return f"{len(seen)} or more bytes that begin {seen[:_SHOWN_BYTES].hex(' ')}"
