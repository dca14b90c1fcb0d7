"""INA226 at register level, from its datasheet (TI SBOS547, register names; fields and sizes from memory).

Configuration (reset 4127h), shunt voltage (2.5 uV a count), Mask/Enable, alert limit and the two identity
registers are there; bus voltage, power and current read 0. It converts whenever its bus or its ALERT pin is looked
at, in the continuous modes that include the shunt. ALERT pulls to ground: it holds the gate clamped, as it is wired.
"""

_CONFIG = 0x00
_SHUNT = 0x01
_MASK_ENABLE = 0x06
_ALERT_LIMIT = 0x07
_RESET_CONFIG = 0x4127
_RST = 0x8000
_CONTINUOUS_SHUNT = 0b101
_SOL = 0x8000
_AFF = 0x0010
_CVRF = 0x0008
_LEN = 0x0001
_SETTINGS = 0xFC03
_VOLT_PER_COUNT = 2.5e-6
_WRITABLE = (_CONFIG, 0x05, _MASK_ENABLE, _ALERT_LIMIT)


class Chip:
    def __init__(self, entry, plant, gate):
        self._ohm = entry["shunt_ohm"]
        self._plant = plant
        self._gate = gate
        self._reset()

    def _reset(self):
        self._words = {_CONFIG: _RESET_CONFIG, 0xFE: 0x5449, 0xFF: 0x2260}
        self._set_alert(False)

    def read_register(self, register, buffer):
        self._convert()
        value = self._words.get(register, 0)
        if register == _MASK_ENABLE:
            # Reading it clears the flags, and lets go of a latched alert.
            self._words[register] = value & _SETTINGS
            self._set_alert(False)
        buffer[0] = value >> 8 & 0xFF
        buffer[1] = value & 0xFF

    def write_register(self, register, data):
        value = data[0] << 8 | data[1]
        if register == _CONFIG and value & _RST:
            self._reset()
        elif register == _CONFIG:
            self._words[register] = value & 0x0FFF | 0x4000
        elif register == _MASK_ENABLE:
            self._words[register] = value & _SETTINGS
        elif register in _WRITABLE:
            self._words[register] = value

    def write(self, data):
        """A plain write: the register's number, and two bytes for it if they come."""
        if len(data) >= 3:
            self.write_register(data[0], data[1:3])

    def read(self, buffer):
        self.read_register(_CONFIG, buffer)

    def general_call(self, _command):
        """From memory: it knows none."""

    def value(self):
        """The level of ALERT, which a resistor pulls high."""
        self._convert()
        return 0 if self.alert else 1

    def _convert(self):
        if self._words[_CONFIG] & _CONTINUOUS_SHUNT != _CONTINUOUS_SHUNT:
            return
        self._plant.look()
        exact = self._plant.current_A * self._ohm / _VOLT_PER_COUNT
        counts = int(min(max(exact, -32768.0), 32767.0))
        self._words[_SHUNT] = counts & 0xFFFF
        mask = self._words.get(_MASK_ENABLE, 0)
        limit = self._words.get(_ALERT_LIMIT, 0)
        limit = limit - 0x10000 if limit & 0x8000 else limit
        over = bool(mask & _SOL) and counts > limit
        # Without LEN the alert, and with it its flag, follow the latest conversion.
        alert = over or (self.alert and bool(mask & _LEN))
        self._words[_MASK_ENABLE] = mask & ~_AFF | _CVRF | (_AFF if alert else 0)
        self._set_alert(alert)

    def _set_alert(self, alert):
        self.alert = alert
        self._gate.pull(alert)
