"""ADS1115 at register level, from its datasheet (TI SBAS444): 16 bits, multiplexer, gain stage.

Config register: OS, MUX, PGA, MODE, DR are honoured; the comparator's fields are kept and read back, its pin
leads nowhere on this board. OS reads 0 while a conversion is under way, and writing it then starts nothing.
A conversion is the mean of its input over its own window, 1/data rate times the oscillator's error, plus
noise and rounding.

The plant tells the mean at each pin. While nothing moves it is known in advance, so the result is drawn when
the conversion begins and shown when it ends; integers only, because this is the simulator's hottest path.
"""

_CONVERSION = 0
_CONFIG = 1
_OS = 0x8000
_CONTINUOUS_IS_0 = 0x0100
_RESET = 0x8583
#: Full scale in microvolts by PGA field, and samples per second by DR field.
_FULL_SCALE_uV = (6144000, 4096000, 2048000, 1024000, 512000, 256000, 256000, 256000)
_PER_SECOND = (8, 16, 32, 64, 128, 250, 475, 860)
#: MUX field 0-3: differential pairs (positive, negative).
_PAIRS = ((0, 1), (0, 3), (1, 3), (2, 3))
_FRACTION = 16
_SCALE_SHIFT = 20


class Chip:
    """Pin levels come from `plant.pins` in nanovolts; 16 fractional bits until a result is rounded."""

    def __init__(self, entry, plant, noise):
        self._plant = plant
        plant.adc = self
        gain = entry.get("gain") or 1.0
        # counts * 2**16 per nanovolt, times 2**20: full scale is 32768 counts.
        self._scales = [
            int(gain * 32768.0 * 65536.0 * 1048576.0 / (uV * 1000.0) + 0.5) for uV in _FULL_SCALE_uV
        ]
        self._offset = int((entry.get("offset_counts") or 0.0) * 65536.0) + 32768
        self._windows_us = [int(entry.get("window", 1.0) * 1e6 / rate + 0.5) for rate in _PER_SECOND]
        self._limit_nV = int(entry["supply_V"] * 1e9)
        self._noise = noise
        self._config = _RESET & ~_OS
        self._thresholds = [0x8000, 0x7FFF]
        self._pointer = _CONVERSION
        self._result = 0
        self.pending = 0
        self.busy_until = -1
        self.window_us = 0
        self.stuck = False
        self._idle = False
        self._high_bits = 0  # bits of the result that are stuck at one

    # -- the bus --------------------------------------------------------------------------------------------

    def read_register(self, register, buffer):
        self._pointer = register
        now = self._plant.now
        if register == _CONFIG:
            value = self._config
            if now >= self.busy_until and not self.stuck:
                if value & _CONTINUOUS_IS_0:
                    value |= _OS
        elif register == _CONVERSION:
            if now >= self.busy_until:
                self._result = self.pending
                if not self._config & _CONTINUOUS_IS_0:
                    self._go_on(now)
            value = self._result | self._high_bits
        else:
            value = self._thresholds[register & 1]
        buffer[0] = value >> 8 & 0xFF
        buffer[1] = value & 0xFF

    def write_register(self, register, data):
        self._pointer = register
        value = data[0] << 8 | data[1]
        if register == _CONFIG:
            now = self._plant.now
            starts = now >= self.busy_until and (value & _OS or not value & _CONTINUOUS_IS_0)
            if now >= self.busy_until:
                self._result = self.pending
            self._config = value & 0x7FFF
            if starts and not self.stuck and not self._idle:
                self._start(now)
        elif register > _CONFIG:
            self._thresholds[register & 1] = value

    def write(self, data):
        """A plain write: the pointer, and two bytes for the register it points to, if they come."""
        self._pointer = data[0] & 3
        if len(data) >= 3:
            self.write_register(self._pointer, data[1:3])

    def general_call(self, command):
        """Section "General Call": 06h resets."""
        if command == 0x06:
            self._config = _RESET & ~_OS
            self.busy_until = -1

    def set_defect(self, kind, begins):
        """Begin or end a defect.

        "not_converting": its oscillator stands still, so a conversion that is asked for never ends. "idle": it takes
        its orders, says that it is ready, and begins nothing. "bit_15" and "bit_14": that bit of every result is one.
        """
        if kind == "not_converting":
            self.stuck = begins
        elif kind == "idle":
            self._idle = begins
        else:
            self._high_bits = 1 << int(kind[4:]) if begins else 0

    # -- converting -----------------------------------------------------------------------------------------

    def _go_on(self, now):
        """Continuous mode: the window that has just begun when `now` comes."""
        window = self._windows_us[self._config >> 5 & 7]
        self._start(now - (now - self.busy_until) % window)

    def _start(self, now):
        plant = self._plant
        if plant.moving:
            plant.catch_up()
        self.window_us = window = self._windows_us[self._config >> 5 & 7]
        self.busy_until = now + window
        if plant.moving:
            plant.open_window(now)
        else:
            plant.window_from = now
            self.pending = self.convert()

    def convert(self):
        """Counts for the plant's pin levels; the plant calls it too, after a window with a change in it."""
        config = self._config
        mux = config >> 12 & 7
        plant = self._plant
        if mux & 4:
            level = plant.pins[mux & 3]
            if plant.has_ripple:
                level += plant.ripple(mux & 3, self.busy_until, self.window_us)
        else:
            pair = _PAIRS[mux]
            level = plant.pins[pair[0]] - plant.pins[pair[1]]
        if level > self._limit_nV:
            level = self._limit_nV
        exact = level * self._scales[config >> 9 & 7] >> _SCALE_SHIFT
        counts = exact + self._offset + self._noise.draw() >> _FRACTION
        if counts > 32767:
            counts = 32767
        elif counts < -32768:
            counts = -32768
        return counts
