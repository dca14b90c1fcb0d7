"""From raw counts to microvolt, microampere and millidegree, and from microampere to a DAC code.

Integers only, every intermediate below 2**30, so that a 31-bit small integer holds it. The factors come from the
board image, where the host has worked them out of the board file; the arithmetic here is the only place that
knows how they are applied.
"""

from array import array

from micropython import const

_PART_BITS = const(14)
_HALF = const(1 << (_PART_BITS - 1))
_CODE_BITS = const(6)


class Scale:
    """One straight line: `reading = n * (whole + part / 2**14)`, `n = counts - zero_counts`."""

    def __init__(self, entry):
        self._zero_counts = entry["zero_counts"]
        self._whole = entry["whole"]
        self._part = entry["part"]

    def largest(self):
        """The largest magnitude that any 16-bit code can give; may be a big integer, so not for the step."""
        return max(abs(self.reading(-32768)), abs(self.reading(32767)))

    def reading(self, counts):
        counts -= self._zero_counts
        return counts * self._whole + ((counts * self._part + _HALF) >> _PART_BITS)


class Demand:
    """DAC code for a current, rounded to the nearest and held within the converter's range."""

    def __init__(self, entry):
        self._zero_code = entry["zero_code"]
        self._full_code = entry["full_code"]
        self.uA_per_code_x64 = entry["uA_per_code_x64"]
        self._largest_uA = (entry["full_code"] * entry["uA_per_code_x64"]) >> _CODE_BITS

    def code(self, current_uA):
        """`current_uA` is held within what the converter can reach, which also keeps it below 2**24."""
        current_uA = min(max(current_uA, -self._largest_uA), self._largest_uA)
        step = self.uA_per_code_x64
        code = self._zero_code + ((current_uA << _CODE_BITS) + (step >> 1)) // step
        return min(max(code, 0), self._full_code)


class Thermistor:
    """Piecewise-linear table from counts (rising) to millidegree, as the host made it for this divider."""

    def __init__(self, entry):
        self._counts = array("i", entry["counts"])
        self._mC = array("i", entry["mC"])
        self.open_counts = entry["open_counts"]
        self.short_counts = entry["short_counts"]

    def reading(self, counts):
        """Temperature in millidegree; beyond either end of the table, the end's own."""
        counts = min(max(counts, self._counts[0]), self._counts[-1])
        return self._between(self._segment(counts), counts)

    def _segment(self, counts):
        low = 0
        high = len(self._counts) - 1
        while high - low > 1:
            middle = (low + high) >> 1
            if self._counts[middle] <= counts:
                low = middle
            else:
                high = middle
        return low

    def _between(self, low, counts):
        # The host keeps each segment shorter than 2**12 counts and 2**17 mC, so the product fits.
        rise = (self._mC[low + 1] - self._mC[low]) * (counts - self._counts[low])
        return self._mC[low] + rise // (self._counts[low + 1] - self._counts[low])
