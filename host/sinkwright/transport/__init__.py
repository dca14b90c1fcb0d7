"""Ways to a board: serial ports, sockets and simulated boards, all as one kind of channel."""

from sinkwright.transport.channel import Channel
from sinkwright.transport.urls import open_channel

__all__ = ["Channel", "open_channel"]
