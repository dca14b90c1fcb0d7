"""Frames as a host makes and takes them (RFC 1662), apart from the firmware's own way; and how a case ends."""

import binascii
import struct


class CaseOver(SystemExit):
    """The world ends here; as the closed pipe's, no `except Exception` holds it up."""


def frame(content):
    content += struct.pack("<I", binascii.crc32(content))
    for octet, stuffed in ((b"\x7d", b"\x7d\x5d"), (b"\x7e", b"\x7d\x5e"), (b"\x03", b"\x7d\x23")):
        content = content.replace(octet, stuffed)
    return b"\x7e" + content + b"\x7e"


def unframe(segment):
    for octet, stuffed in ((b"\x7e", b"\x7d\x5e"), (b"\x03", b"\x7d\x23"), (b"\x7d", b"\x7d\x5d")):
        segment = segment.replace(stuffed, octet)
    if len(segment) < 12 or binascii.crc32(segment[:-4]) != struct.unpack("<I", segment[-4:])[0]:
        return None
    return segment[:-4]
