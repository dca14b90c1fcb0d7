"""A simulated board, a host and a witness in one interpreter: `micropython bench.py`; runs on the board's side.

Each line of the standard input is one case (JSON), each line of the output what happened in it. The firmware is the
shipped one, started by its own `run`; the bench stands where the pipe to the host stands, so it is called once every
control period. It speaks as a host, brings the trouble at its time, and sees the circuit's true state, which neither
firmware nor host can. It judges nothing.

Case: "setup" (as start.py's), "commands" [[us, name in wire, values...]], "onset_us", "end_us", and "trouble"
(see trouble.py), which may be empty when the trouble is one of the circuit's ("defects" of the plant).
"""

import builtins
import json
import struct
import sys

import trouble
from frames import CaseOver, frame, unframe

import board as simulated_board
import main as firmware
import start
import wire

_BEAT_us = 500_000
_REPEAT_us = 60_000
_SESSION = 7
#: What follows from a fault (current that goes on flowing) is known by then.
_AFTER_A_FAULT_us = 200_000
#: A restart takes a tenth of a second.
_AFTER_A_STRIKE_us = 150_000


class Witness:
    """The gate as the firmware drives it, and the true current."""

    def __init__(self, made, onset_us):
        self._gate = made.gate
        self._plant = plant = made.plant
        self._onset_us = onset_us
        self.clamped = True
        self.clamped_us = None
        self.peak_A = 0.0
        self._advance = plant._advance
        plant._advance = self._watch
        made.gate = self

    def clamp(self):
        plant = self._plant
        if not self.clamped and plant.now >= self._onset_us and self.clamped_us is None:
            self.clamped_us = plant.now
        self.clamped = True
        self._gate.clamp()

    def release(self):
        self.clamped = False
        self._gate.release()

    def _watch(self, us):
        self._advance(us)
        plant = self._plant
        if plant._at > self._onset_us and abs(plant.current_A) > abs(self.peak_A):
            self.peak_A = plant.current_A


class Bench:
    """What the board sees of its host; `grant` is called once a control period."""

    def __init__(self, case):
        self.case = case
        self.out_count = 0
        self.period_us = case["setup"]["image"]["period_us"]
        self._grant_us = self.period_us * case.get("periods_a_grant", 1)
        self.host_silent = False
        self.unread = False
        self.garbage = b""
        self._commands = list(case["commands"])
        self._received = bytearray()
        self._sequence = 0
        self._waiting = None
        self._sent_us = 0
        self._heard_us = 0
        self.events = []
        self.refused = []
        self.replies = {}
        made = simulated_board.install(case["setup"], self)
        self.board = made
        self.plant = made.plant
        self.witness = Witness(made, case["onset_us"])
        self.restarts = []
        self.ended_clamped = None
        #: The firmware's own time begins after its self-test; no frame arrives before it was stamped.
        self.clock_behind_us = case["end_us"]
        self.trouble = trouble.make(case.get("trouble") or {}, self)

    # -- in place of the pipe -----------------------------------------------------------------------------------

    def put(self, data):
        self._received.extend(bytes(data))
        self.out_count += len(data)

    def answer(self, now_us):
        if not self.unread:
            self.out_count = 0
            self._listen()

    def grant(self):
        now = self.plant.now
        if self.trouble.struck_us is not None:
            self.case["end_us"] = self.trouble.struck_us + _AFTER_A_STRIKE_us
        if now >= self.case["end_us"]:
            # Before the firmware's last act, which is to clamp.
            self.ended_clamped = self.witness.clamped
            raise CaseOver(0)
        if now >= self.case["onset_us"]:
            self.trouble.step(now)
        return self._grant_us, self.garbage + self._say(now)

    # -- the host -----------------------------------------------------------------------------------------------

    def _say(self, now):
        if self.host_silent:
            return b""
        if self._waiting is not None:
            if now - self._sent_us < _REPEAT_us:
                return b""
            return self._send(now)
        if self._commands and now >= self._commands[0][0]:
            _, name, *values = self._commands.pop(0)
        elif now - self._heard_us >= _BEAT_us and self._sequence and not self.restarts:
            name, values = "BEAT", ()
        else:
            return b""
        self._sequence += 1
        payload = struct.pack(getattr(wire, name + "_FORMAT"), *values)
        head = struct.pack(
            wire.HEADER_FORMAT, wire.VERSION, getattr(wire, name), _SESSION, self._sequence, len(payload)
        )
        self._waiting = name, frame(head + payload)
        return self._send(now)

    def _send(self, now):
        self._sent_us = self._heard_us = now
        return self._waiting[1]

    def _listen(self):
        while True:
            end = self._received.find(b"\x7e")
            if end < 0:
                return
            content = unframe(bytes(self._received[:end]))
            self._received = self._received[end + 1 :]
            if content:
                self._take(content)

    def _take(self, content):
        _, message, _, sequence, _ = struct.unpack_from(wire.HEADER_FORMAT, content)
        payload = content[wire.HEADER_SIZE :]
        if message in (wire.EVENT, wire.TELEMETRY):
            time_us = struct.unpack_from("<IQ", payload)[1]
            self.clock_behind_us = min(self.clock_behind_us, self.plant.now - time_us)
        if message == wire.EVENT:
            event = struct.unpack(wire.EVENT_FORMAT, payload)[1:]
            self.events.append(event)
            if event[1] == wire.EVENT_FAULT and self.plant.now >= self.case["onset_us"]:
                self.case["end_us"] = min(self.case["end_us"], self.plant.now + _AFTER_A_FAULT_us)
        elif self._waiting is not None and sequence == self._sequence:
            name = self._waiting[0]
            self._waiting = None
            if message == wire.REFUSED:
                self.refused.append([name] + list(struct.unpack(wire.REFUSED_FORMAT, payload)[1:]))
            elif name in ("GET_FAULT", "GET_STATUS"):
                layout = wire.FAULT_REPORT_FORMAT if name == "GET_FAULT" else wire.STATUS_FORMAT
                self.replies[name] = struct.unpack(layout, payload)

    # -- the case -----------------------------------------------------------------------------------------------

    def run(self):
        found = self.trouble.around(self._start)
        plant = self.plant
        plant.disturb(1)
        witness = self.witness
        return {
            "left": found,
            "restarts": self.restarts,
            "clamped_us": witness.clamped_us,
            "clamped": witness.clamped if self.ended_clamped is None else self.ended_clamped,
            "peak_A": witness.peak_A,
            "final_A": plant.current_A,
            "junction_degC": plant.heat.junction_degC,
            "events": self.events,
            "clock_behind_us": self.clock_behind_us,
            "refused": self.refused,
            "replies": self.replies,
            "waits": self.trouble.waits,
            "struck_us": self.trouble.struck_us,
        }

    def _start(self):
        """Run the firmware, after each reset again, until something ends it; what did, "" for the case's own end."""
        made = self.board
        try:
            simulated_board.open_board()
            while True:
                try:
                    firmware.run(made)
                    return "returned"
                except simulated_board.Reset:
                    self.restarts.append([self.plant.now, made.reset_cause, made.maintenance])
                    made.start_again()
        except CaseOver:
            return ""
        except (Exception, KeyboardInterrupt, SystemExit) as error:
            return type(error).__name__


def main():
    out = sys.stdout
    for line in sys.stdin:
        bench = Bench(json.loads(line))
        # What the firmware prints goes between its frames, as start.py has it.
        builtins.print = start.print_into(bench.board.stream)
        out.write(json.dumps(bench.run()) + "\n")


if __name__ == "__main__":
    main()
