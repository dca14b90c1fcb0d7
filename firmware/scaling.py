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
_COEFFICIENTS = ("zero_counts", "whole", "part", "offset")


class Scale:
    """Two straight lines from counts: `nominal`, by the parts' values alone, and `reading`, as calibrated.

    Each is `n * (whole + part / 2**14) + offset`, `n = counts - zero_counts`. Without a calibration they are one line,
    and `calibrated` is false.
    """

    def __init__(self, entry):
        self._zero_counts = self._nominal_zero_counts = entry["zero_counts"]
        self._whole = self._nominal_whole = entry["whole"]
        self._part = self._nominal_part = entry["part"]
        self._rounding = _HALF
        self.calibrated = False

    def calibrate(self, entry):
        """Read by `entry` from now on, which `implausible` has found nothing against."""
        self._zero_counts = entry["zero_counts"]
        self._whole = entry["whole"]
        self._part = entry["part"]
        self._rounding = _HALF + (entry["offset"] << _PART_BITS)
        self.calibrated = True

    def reading(self, counts):
        counts -= self._zero_counts
        return counts * self._whole + ((counts * self._part + self._rounding) >> _PART_BITS)

    def nominal(self, counts):
        counts -= self._nominal_zero_counts
        return counts * self._nominal_whole + ((counts * self._nominal_part + _HALF) >> _PART_BITS)

    def higher(self, counts):
        """The higher of both lines."""
        return max(self.reading(counts), self.nominal(counts))

    def lower(self, counts):
        return min(self.reading(counts), self.nominal(counts))

    # -- between control steps; may make big integers -----------------------------------------------------------------

    def largest(self):
        """The largest magnitude that any 16-bit code can give."""
        return max(abs(line(counts)) for line in (self.lower, self.higher) for counts in (-32768, 32767))

    def highest_counts(self, limit):
        """The highest code that neither line reads as more than `limit`: above it, a trip."""
        return _last(lambda counts: self.higher(counts) <= limit)

    def lowest_counts(self, limit):
        """The lowest code that neither line reads as less than `limit`."""
        return _last(lambda counts: self.lower(counts) < limit) + 1


def _last(holds):
    """The last code for which `holds`, which is true up to some code and false from there on."""
    low = -32769
    high = 32768
    while high - low > 1:
        middle = (low + high) >> 1
        if holds(middle):
            low = middle
        else:
            high = middle
    return low


def implausible(calibration, image):
    """A sentence about the first coefficient that parts within their tolerances cannot need; "" if there is none.

    `calibration` has "number" and, by the scales' names, zero_counts, whole, part and offset; the image's
    "calibration" says how far from the nominal line each may lie.
    """
    for name in sorted(image["calibration"]):
        bounds = image["calibration"][name]
        entry = calibration.get(name)
        if not isinstance(entry, dict) or not all(isinstance(entry.get(key), int) for key in _COEFFICIENTS):
            return "the calibration of " + name + " lacks a coefficient"
        if not 0 <= entry["part"] < 1 << _PART_BITS:
            return "the calibrated gain of " + name + " is not written as it must be"
        one = _per_count(image["scales"][name])
        gain = _per_count(entry)
        if abs(gain - one) * 1_000_000 > one * bounds["gain_ppm"]:
            return "the calibrated gain of " + name + " is beyond what the parts allow"
        shift = (image["scales"][name]["zero_counts"] - entry["zero_counts"]) * gain
        if abs(shift + (entry["offset"] << _PART_BITS)) > bounds["zero_counts"] * gain:
            return "the calibrated zero of " + name + " is beyond what the parts allow"
        if abs(entry["offset"] << _PART_BITS) > gain:
            return "the calibrated offset of " + name + " is more than a count"
    return ""


def _per_count(entry):
    return (entry["whole"] << _PART_BITS) + entry["part"]


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
