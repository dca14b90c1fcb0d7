"""MCP4725 at register level, from its datasheet (Microchip DS22039): 12-bit DAC, its supply as reference.

Writes: fast mode (figure 6-1: two bytes a value, C2 C1 = 00), DAC register (figure 6-2: C2 C1 C0 = 010), DAC
register and EEPROM (011; 25 ms typical, during which commands are ignored). Reads give five bytes (figure
6-3). At power-up the EEPROM's value is loaded. The 6 us of settling are left out: the sink's loop is slower.
"""

_WRITE_DAC = 0x40
_WRITE_BOTH = 0x60
_COMMAND = 0xE0
_EEPROM_us = 25_000


class Chip:
    def __init__(self, entry, plant):
        self._plant = plant
        self._reference_V = entry["reference_V"]
        self._inl = entry.get("inl") or ()
        self._eeprom = entry.get("eeprom_code") or 0
        self._eeprom_down = 0
        self.code = self._eeprom
        self._down = 0
        self._busy_until = 0
        self._held_V = None
        plant.set_dac(self.output_V())

    def output_V(self):
        """Vout = reference * (code + nonlinearity) / 4096; powered down, it is pulled low (table 5-2)."""
        if self._held_V is not None:
            return self._held_V
        if self._down:
            return 0.0
        return self._reference_V * (self.code + self._nonlinearity()) / 4096.0

    def _nonlinearity(self):
        code = self.code
        for k in range(1, len(self._inl)):
            x1, y1 = self._inl[k]
            if code <= x1:
                x0, y0 = self._inl[k - 1]
                return y0 + (code - x0) * (y1 - y0) / (x1 - x0)
        return 0.0

    def write(self, data):
        if self._plant.now < self._busy_until:
            return
        first = data[0]
        if first & 0xC0 == 0:
            for k in range(0, len(data) - 1, 2):
                self._set((data[k] & 0x0F) << 8 | data[k + 1], data[k] >> 4 & 3)
        elif first & _COMMAND in (_WRITE_DAC, _WRITE_BOTH):
            for k in range(0, len(data) - 2, 3):
                self._set(data[k + 1] << 4 | data[k + 2] >> 4, data[k] >> 1 & 3)
            if first & _COMMAND == _WRITE_BOTH and len(data) >= 3:
                self._eeprom = self.code
                self._eeprom_down = self._down
                self._busy_until = self._plant.now + _EEPROM_us

    def write_register(self, register, data):
        """`writeto_mem` sends the register's number as the first byte of the same message."""
        self.write(bytes([register]) + bytes(data))

    def read_register(self, _register, buffer):
        """`readfrom_mem_into`: a one-byte write, which completes no command, then a read."""
        self.read(buffer)

    def read(self, buffer):
        ready = self._plant.now >= self._busy_until
        answer = (
            (0x80 if ready else 0) | 0x40 | self._down << 1,
            self.code >> 4,
            self.code << 4 & 0xF0,
            self._eeprom_down << 5 | self._eeprom >> 8,
            self._eeprom & 0xFF,
        )
        for k in range(len(buffer)):
            buffer[k] = answer[k % 5]

    def general_call(self, command):
        """Section 7.3: 06h resets as at power-up, 09h wakes."""
        if command == 0x06:
            self._set(self._eeprom, self._eeprom_down)
        elif command == 0x09:
            self._set(self.code, 0)

    def set_defect(self, kind, begins):
        """The output stays where it is ("stuck") or falls to nothing ("dead"); the registers tell what was written."""
        self._held_V = None
        if begins:
            self._held_V = 0.0 if kind == "dead" else self.output_V()
        self._plant.set_dac(self.output_V())

    def _set(self, code, down):
        self.code = code
        self._down = down
        self._plant.set_dac(self.output_V())
