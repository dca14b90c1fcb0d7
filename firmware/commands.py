"""What each command does: one table, one method a command, which returns the reply's payload or None for Done.

Who gave a command, and whether it counts, is settled in dispatch.py before a method is called. A method either
does all that was asked or raises Refusal with nothing changed. Runs between control steps and may allocate.
"""

import struct

import burst
import laws
import program
import states
import wire
from limits import Limits
from refusal import Refusal

_LIMIT_FIELDS = 7
_LINE_BYTES = 100
#: Detail of ENDS_MISSING: it is the program that needs an end.
_FOR_A_PROGRAM = 1
#: After turning off, how long until turning on makes sense: six control steps of the usual period, and one more.
_SETTLING_ms = 17


class Commands:
    def __init__(self, board, parts):
        self._board = board
        self._parts = parts
        self._machine = parts.machine
        self._guard = parts.guard
        self._control = parts.control
        self._meter = parts.meter
        self._telemetry = parts.telemetry
        self._runs = parts.runs
        self._program = parts.program
        self._burst = parts.burst
        #: The session in control, 0 for none; dispatch decides it, Status tells it.
        self.controller = 0
        # id: (payload format, format of the entries in its tail, who may give it, method).
        # "any": whoever asks; "control": the controlling session.
        self.table = {
            wire.IDENTIFY: (wire.IDENTIFY_FORMAT, None, "any", self._identify),
            wire.GET_LIMITS: (wire.GET_LIMITS_FORMAT, None, "any", self._get_limits),
            wire.GET_STATUS: (wire.GET_STATUS_FORMAT, None, "any", self._get_status),
            wire.GET_FAULT: (wire.GET_FAULT_FORMAT, None, "any", self._get_fault),
            wire.GET_LOG: (wire.GET_LOG_FORMAT, None, "any", self._get_log),
            wire.GET_RUN: (wire.GET_RUN_FORMAT, None, "any", self._get_run),
            # It names the run, and marking it again changes nothing: so it needs no control.
            wire.MARK_FETCHED: (wire.MARK_FETCHED_FORMAT, None, "any", self._mark_fetched),
            wire.DISABLE: (wire.DISABLE_FORMAT, None, "any", self.disable),
            wire.SET_LIMITS: (wire.SET_LIMITS_FORMAT, None, "control", self._set_limits),
            wire.SET_POINT: (wire.SET_POINT_FORMAT, None, "control", self._set_point),
            wire.SET_ENDS: (wire.SET_ENDS_FORMAT, None, "control", self._set_ends),
            wire.ENABLE: (wire.ENABLE_FORMAT, None, "control", self._enable),
            wire.CLEAR_FAULT: (wire.CLEAR_FAULT_FORMAT, None, "control", self._clear_fault),
            wire.SET_TELEMETRY: (wire.SET_TELEMETRY_FORMAT, None, "control", self._set_telemetry),
            wire.BEAT: (wire.BEAT_FORMAT, None, "control", self._beat),
            wire.LOAD_PROGRAM: (
                wire.LOAD_PROGRAM_FORMAT,
                wire.PROGRAM_STEP_FORMAT,
                "control",
                self._load_program,
            ),
            wire.ARM_BURST: (wire.ARM_BURST_FORMAT, None, "control", self._arm_burst),
            wire.GET_BURST: (wire.GET_BURST_FORMAT, None, "any", self._get_burst),
            wire.RESTART: (wire.RESTART_FORMAT, None, "control", self._restart),
        }

    # -- questions ----------------------------------------------------------------------------------------------

    def _identify(self):
        image = self._board.image
        if self._parts.why_off:
            line = struct.pack(wire.LOG_LINE_FORMAT, 0) + cut(self._parts.why_off, _LINE_BYTES)
            self._parts.link.send(wire.LOG_LINE, 0, 0, line)
        return struct.pack(
            wire.IDENTITY_FORMAT,
            image["period_us"],
            image["board_file_crc"],
            (self._parts.store.get("calibration") or {}).get("number", 0),
            self._board.reset_cause,
            self._parts.log.capacity,
            cut(self._board.interpreter, 32),
        )

    def _get_limits(self, which):
        if which == wire.LIMIT_SET_IN_FORCE:
            limits = self._guard.limits
        elif which == wire.LIMIT_SET_BOARD:
            limits = self._guard.board_limits
        else:
            raise Refusal(wire.REFUSAL_BAD_VALUE, which)
        return struct.pack(wire.LIMITS_FORMAT, *limits.values())

    def _get_status(self):
        meter = self._meter
        control = self._control
        return struct.pack(
            wire.STATUS_FORMAT,
            self._parts.time.now_us(),
            self._machine.state,
            control.mode,
            control.limiting,
            self._guard.fault,
            control.setpoint,
            meter.voltage_uV,
            meter.current_uA,
            meter.force_uV,
            meter.heatsink_mC,
            control.junction_mC(),
            control.zero_uA,
            control.zero_samples,
            self.controller,
            self._parts.time.overruns,
            self._telemetry.dropped & 0xFFFFFFFF,
            self._parts.link.discarded & 0xFFFFFFFF,
            self._parts.log.entries,
        )

    def _get_fault(self):
        guard = self._guard
        return struct.pack(
            wire.FAULT_REPORT_FORMAT,
            guard.fault,
            guard.fault != wire.FAULT_NONE and guard.standing(),
            guard.value,
            guard.limit,
            guard.seconds * 1_000_000 + guard.micros,
        )

    def _get_run(self):
        runs = self._runs
        return struct.pack(
            wire.RUN_FORMAT,
            runs.run,
            self._machine.state,
            runs.ended_by,
            runs.fetched,
            runs.when_silent,
            runs.started_us,
            runs.ended_us,
            self._meter.charge_uC(),
            self._meter.energy_uJ(),
            self._parts.log.entries,
            self._parts.log.spacing_ms,
        )

    def _get_log(self, first):
        log = self._parts.log
        entries = b""
        for at in range(first, min(first + wire.MAX_ENTRIES, log.entries)):
            entries += struct.pack(
                wire.LOG_ENTRY_FORMAT,
                log.time_ms[at],
                log.voltage_uV[at],
                log.voltage_min_uV[at],
                log.voltage_max_uV[at],
                log.current_uA[at],
                log.heatsink_cC[at],
                log.charge_mC[at],
            )
        return struct.pack(wire.LOG_ENTRIES_FORMAT, first, log.entries, log.spacing_ms) + entries

    def _get_burst(self, first):
        captured = self._burst
        period_us = self._board.image["period_us"]
        readings = b""
        for number in range(first, min(first + wire.MAX_READINGS, captured.total)):
            readings += struct.pack(
                wire.BURST_READING_FORMAT, *captured.reading(number, self._control.zero_uA)
            )
        head = (first, captured.total, captured.before, captured.started_us(period_us), period_us)
        return struct.pack(wire.BURST_READINGS_FORMAT, *head) + readings

    # -- commands -----------------------------------------------------------------------------------------------

    def _mark_fetched(self, run):
        if self._runs.going:
            raise Refusal(wire.REFUSAL_LOAD_IS_ON)
        if run != self._runs.run:
            raise Refusal(wire.REFUSAL_BAD_VALUE)
        self._runs.fetched = True

    def _set_limits(self, *values):
        board = self._guard.board_limits.values()
        for at in range(_LIMIT_FIELDS):
            if values[at] <= 0:
                raise Refusal(wire.REFUSAL_BAD_VALUE, values[at], at + 1)
            if values[at] > board[at]:
                raise Refusal(wire.REFUSAL_BEYOND_BOARD, board[at], at + 1)
        self._check_kept_setpoint(Limits(dict(zip(Limits.FIELDS, values))))
        if self._program.running:
            raise Refusal(wire.REFUSAL_LOAD_IS_ON)
        self._guard.apply_values(values)

    def _set_point(self, mode, value):
        if self._program.running:
            raise Refusal(wire.REFUSAL_LOAD_IS_ON)
        self._check_setpoint(mode, value)
        self._control.obey(mode, value)

    def _check_setpoint(self, mode, value):
        refusal = laws.refused(mode, value, self._guard.limits)
        if refusal:
            raise Refusal(*refusal)

    def _check_kept_setpoint(self, limits):
        """Limits that the set-point in force would break are refused with that set-point."""
        control = self._control
        refusal = control.mode and laws.refused(control.mode, control.setpoint, limits)
        if refusal:
            raise Refusal(refusal[0], control.setpoint, refusal[2])

    def _set_ends(self, voltage_uV, charge_mC, energy_mJ, duration_ms, temperature_mC):
        if voltage_uV < 0:
            raise Refusal(wire.REFUSAL_BAD_VALUE, voltage_uV)
        if self._runs.alone and not (voltage_uV and (charge_mC or duration_ms)):
            raise Refusal(wire.REFUSAL_ENDS_MISSING)
        self._parts.ends.ask(voltage_uV, charge_mC, energy_mJ, duration_ms, temperature_mC)

    def _enable(self, when_silent, run, follow):
        if when_silent not in (wire.SILENCE_STOP, wire.SILENCE_CONTINUE):
            raise Refusal(wire.REFUSAL_BAD_VALUE, when_silent)
        if self._parts.self_test:
            raise Refusal(wire.REFUSAL_BOARD_IMAGE, self._parts.self_test)
        self._guard.before_sinking()
        if self._guard.fault:
            raise Refusal(wire.REFUSAL_FAULT_LATCHED, self._guard.fault)
        if self._board.maintenance:
            raise Refusal(wire.REFUSAL_NOT_OFFERED, when_silent)
        if not self._control.mode:
            raise Refusal(wire.REFUSAL_NO_SETPOINT)
        if self._machine.state == wire.STATE_SINKING:
            if when_silent != self._runs.when_silent or bool(follow) != self._program.running:
                raise Refusal(wire.REFUSAL_LOAD_IS_ON)
            return
        self._check_run(when_silent)
        self._check_zero()
        if follow:
            self._check_program()
        self._meter.restart()
        self._parts.log.begin()
        self._control.start()
        self._runs.begin(run, when_silent)
        self._machine.fire(states.ENABLE)
        if follow:
            self._program.begin(self._control.setpoint)
        self._telemetry.tell(wire.EVENT_ENABLED, self._control.mode, self._control.setpoint)

    def _check_run(self, when_silent):
        if not self._runs.fetched:
            raise Refusal(wire.REFUSAL_RUN_NOT_FETCHED, self._machine.state)
        if when_silent == wire.SILENCE_CONTINUE and not self._parts.ends.suffice():
            raise Refusal(wire.REFUSAL_ENDS_MISSING)

    def _check_zero(self):
        if not self._control.zero_samples:
            raise Refusal(wire.REFUSAL_ZERO_NOT_READY, self._control.zero_wait_ms())
        if not self._guard.settled_off():
            # A conversion may still have seen the run before, and would be more than is asked for now.
            raise Refusal(wire.REFUSAL_ZERO_NOT_READY, _SETTLING_ms)
        if abs(self._control.zero_uA) > self._board.image["zero_budget_uA"]:
            raise Refusal(wire.REFUSAL_ZERO_OUT_OF_BUDGET, self._control.zero_uA)

    def _load_program(self, first, total, repeats, steps):
        """A piece of a program. Whatever is wrong with it, there is no whole program until all is sent again."""
        if self._program.running:
            raise Refusal(wire.REFUSAL_LOAD_IS_ON)
        if first == 0:
            self._program.forget(min(total, program.MOST_STEPS), repeats)
        if total > program.MOST_STEPS:
            raise Refusal(wire.REFUSAL_TOO_LONG, program.MOST_STEPS)
        if first != self._program.count or total != self._program.total:
            raise Refusal(wire.REFUSAL_PROGRAM_BAD, self._program.count)
        for step in steps:
            if not self._program.add(*step):
                number = self._program.count
                self._program.forget()
                raise Refusal(wire.REFUSAL_PROGRAM_BAD, number)

    def _check_program(self):
        """Whether the program is whole, comes to an end, and keeps within the limits in force."""
        loaded = self._program
        if not loaded.complete():
            raise Refusal(wire.REFUSAL_PROGRAM_BAD, loaded.count)
        if not (loaded.repeats or self._parts.ends.some):
            raise Refusal(wire.REFUSAL_ENDS_MISSING, _FOR_A_PROGRAM)
        for number in range(loaded.count):
            try:
                self._check_setpoint(self._control.mode, loaded.value_at(number))
            except Refusal:
                raise Refusal(wire.REFUSAL_PROGRAM_BAD, number)

    def _arm_burst(self, before, trigger):
        if before >= burst.SIZE:
            raise Refusal(wire.REFUSAL_TOO_LONG, burst.SIZE - 1)
        if trigger not in (
            wire.BURST_TRIGGER_NOW,
            wire.BURST_TRIGGER_SETPOINT_CHANGE,
            wire.BURST_TRIGGER_FAULT,
        ):
            raise Refusal(wire.REFUSAL_BAD_VALUE, trigger)
        self._burst.arm(before, trigger, self._control.setpoint)

    def disable(self):
        was_sinking = self._machine.state == wire.STATE_SINKING
        self._machine.fire(states.DISABLE)
        self._meter.stop()
        if was_sinking:
            self._telemetry.tell(wire.EVENT_DISABLED)

    def _clear_fault(self):
        fault = self._guard.fault
        if fault == wire.FAULT_OVER_CURRENT and self._parts.monitor is not None:
            self._rearm_monitor()
        if fault and not self._guard.clear():
            raise Refusal(wire.REFUSAL_CAUSE_STANDS, fault)
        if fault:
            self._telemetry.tell(wire.EVENT_CLEARED, fault)

    def _rearm_monitor(self):
        try:
            self._parts.monitor.rearm()
        except OSError:
            raise Refusal(wire.REFUSAL_CAUSE_STANDS, self._guard.fault)

    def _set_telemetry(self, every_steps):
        self._telemetry.ask(every_steps)

    def _restart(self, maintenance):
        if self._machine.state == wire.STATE_SINKING:
            raise Refusal(wire.REFUSAL_LOAD_IS_ON)
        if not self._runs.fetched:
            # Its log is in memory alone.
            raise Refusal(wire.REFUSAL_RUN_NOT_FETCHED, self._machine.state)
        self._telemetry.tell(wire.EVENT_RESTART, maintenance)
        # The reply leaves first: main.py restarts between two later turns.
        self._parts.restart_to = maintenance

    def _beat(self):
        """Only to be heard."""


def cut(text, size):
    """`text` in UTF-8, cut at a whole character: half of one would make the host discard the reply."""
    while len(text.encode()) > size:
        text = text[:-1]
    return text.encode()
