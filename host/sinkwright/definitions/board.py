"""What a board file may say: every value in which two builds of the load differ.

Decides keys, units, defaults and the range of each value by itself. What must hold between values (full scale
reachable, heat carried away) is in `board_checks`; the integers for the firmware are made in `board_image`.
"""

from __future__ import annotations

import math
from typing import Annotated, Literal

import msgspec

from .board_checks import check_board
from .keys import KeyMistake, by_program, meaning, quantity, wording
from .parts import check_part

_Percent = Annotated[float, quantity("%", "Tolerance of this part, as a half-width.", ge=0, le=20)]
_GpioPin = Annotated[int, quantity("", "GPIO number.", ge=0, le=29)]
_OptionalPin = Annotated[int, quantity("", "GPIO number.", default="not fitted", ge=0, le=29)] | None
_Input = Annotated[int, quantity("", "Input number (AIN) of the converter.", ge=0, le=3)]
_Ratio = Annotated[
    float, quantity("1", "Divider: volts at the terminals per volt at the converter.", ge=1, le=100)
]
_Pedestal = Annotated[
    float,
    quantity("V", "Added at the converter's input, so that zero and a wrong sign can be read.", ge=0, le=1),
]

#: ADS1115 (TI SBAS444, config register): range in V to PGA field, conversions per second to DR field.
GAIN_BITS = {6.144: 0, 4.096: 1, 2.048: 2, 1.024: 3, 0.512: 4, 0.256: 5}
RATE_BITS = {8: 0, 16: 1, 32: 2, 64: 3, 128: 4, 250: 5, 475: 6, 860: 7}
#: Its oscillator may be 10 % slow, and it takes 25 us to wake up (from memory: SBAS444).
SLOWEST_RATE = 0.9
WAKE_UP_US = 25
#: MCP4725 (Microchip DS22039): 12 bits, the supply is the reference, V = reference * code / 4096. PWM likewise, near
#: 30.5 kHz (RP2040 datasheet section 4.5.2: 125 MHz / 4096).
DAC_CODES = 4096
PWM_HZ = 30_518
#: RP2040 datasheet section 4.9.2: 2 us a conversion; its driver takes the mean of 32.
RP2_CONVERSION_US = 64


class _Table(msgspec.Struct, frozen=True, forbid_unknown_fields=True, kw_only=True):
    """Base of all tables of a board file."""


class Limits(_Table, frozen=True, kw_only=True):
    """What the board stands. Nobody can set more from outside."""

    voltage_V: Annotated[
        float, quantity("V", "Largest source voltage; 60 V DC is where extra-low voltage ends.", gt=0, le=60)
    ]
    current_A: Annotated[float, quantity("A", "Largest current.", gt=0, le=16)]
    power_W: Annotated[float, quantity("W", "Largest power, for as long as one likes.", gt=0, le=400)]
    heatsink_degC: Annotated[float, quantity("degC", "Hottest heatsink.", ge=40, le=120)] = 85.0
    junction_degC: Annotated[float, quantity("degC", "Hottest junction, as estimated.", ge=60, le=175)] = (
        125.0
    )
    slew_A_per_s: Annotated[
        float, quantity("A/s", "Fastest change of the current demand.", gt=0, le=1000)
    ] = 400.0
    host_silence_s: Annotated[
        float, quantity("s", "Silence of the host after which the board stops.", ge=0.5, le=60)
    ] = 3.0


class Control(_Table, frozen=True, kw_only=True):
    """The supervising loop."""

    period_s: Annotated[float, quantity("s", "Time of one control step.", ge=0.001, le=0.02)] = 0.00235


class Pins(_Table, frozen=True, kw_only=True):
    """GPIO numbers of the microcontroller."""

    gate: Annotated[_GpioPin, meaning("Releases the gate clamp; must be driven, high impedance clamps.")] = 15
    led_red: _GpioPin = 16
    led_green: _GpioPin = 17
    trigger: _OptionalPin = None
    fan: _OptionalPin = None
    off_button: _OptionalPin = None


class I2C(_Table, frozen=True, kw_only=True):
    """The bus to the converters."""

    id: Annotated[int, quantity("", "Number of the bus.", ge=0, le=1)] = 0
    sda: _GpioPin = 4
    scl: _GpioPin = 5
    frequency_Hz: Annotated[int, quantity("Hz", "Clock.", ge=50_000, le=1_000_000)] = 400_000


class Dac(_Table, frozen=True, kw_only=True):
    """The converter that sets the current."""

    part: Annotated[str, wording("Part number; PWM is the microcontroller's own output and a filter.")] = (
        "MCP4725"
    )
    pin: Annotated[
        _OptionalPin, meaning("GPIO number of the PWM output.", default="none: a chip on the bus")
    ] = None
    frequency_Hz: Annotated[int, quantity("Hz", "Frequency of the PWM output.", ge=1_000, le=100_000)] = (
        PWM_HZ
    )
    address: Annotated[int, quantity("", "Bus address.", ge=0x08, le=0x77)] = 0x60
    reference_V: Annotated[float, quantity("V", "Its supply, which is its reference.", ge=2.7, le=5.5)]
    reference_tolerance_percent: _Percent = 0.2
    integral_nonlinearity_counts: Annotated[
        float, quantity("counts", "Largest distance from the straight line.", ge=0, le=32)
    ] = 4.0

    def __post_init__(self) -> None:
        check_part("dac", self.part)
        if (self.part == "PWM") != (self.pin is not None):
            state = "is missing" if self.pin is None else f"is given, but the {self.part} is on the bus"
            raise KeyMistake("pin", state, "PWM needs the number of its GPIO, a chip none")

    @property
    def code_V(self) -> float:
        """Volts per code."""
        return self.reference_V / DAC_CODES


class AdcInputs(_Table, frozen=True, kw_only=True):
    """Which input of the converter measures what."""

    current: _Input = 0
    voltage: _Input = 1
    force: _Input = 2
    heatsink: _Input = 3

    def __post_init__(self) -> None:
        users: dict[int, str] = {}
        for name in ("current", "voltage", "force", "heatsink"):
            other = users.setdefault(getattr(self, name), name)
            if other != name:
                raise KeyMistake(name, f"uses the same input as {other}", "give each its own, 0 to 3")


class Adc(_Table, frozen=True, kw_only=True):
    """The converter that measures."""

    part: Annotated[str, wording("Part number; RP2 is the microcontroller's own converter.")] = "ADS1115"
    address: Annotated[int, quantity("", "Bus address.", ge=0x08, le=0x77)] = 0x48
    supply_V: Annotated[float, quantity("V", "Its supply; no input may exceed it.", ge=2.0, le=5.5)] = 3.3
    range_V: Annotated[
        float, quantity("V", "Full scale: 6.144, 4.096, 2.048, 1.024, 0.512 or 0.256.", gt=0)
    ] = 4.096
    samples_per_s: Annotated[int, quantity("1/s", "8, 16, 32, 64, 128, 250, 475 or 860.", gt=0)] = 860
    gain_tolerance_percent: _Percent = 0.15
    gain_drift_ppm_per_K: Annotated[float, quantity("ppm/K", "Drift of the gain.", ge=0, le=1000)] = 40.0
    offset_counts: Annotated[float, quantity("counts", "Largest offset.", ge=0, le=100)] = 3.0
    noise_counts: Annotated[
        float, quantity("counts", "Noise of one conversion, standard deviation.", ge=0, le=50)
    ] = 1.0
    inputs: Annotated[AdcInputs, meaning("Which input measures what.")] = msgspec.field(
        default_factory=AdcInputs
    )

    def __post_init__(self) -> None:
        check_part("adc", self.part)
        if self.part == "RP2" and self.range_V != self.supply_V:
            raise KeyMistake(
                "range_V", f"{self.range_V:g} V is not its reference", "write the value of supply_V"
            )
        if self.part == "ADS1115":
            self._check_ads1115()

    def _check_ads1115(self) -> None:
        if self.range_V not in GAIN_BITS:
            right = "write one of " + ", ".join(f"{value:g}" for value in GAIN_BITS)
            raise KeyMistake("range_V", f"{self.range_V:g} V is no range of the {self.part}", right)
        if self.samples_per_s not in RATE_BITS:
            right = "write one of " + ", ".join(str(value) for value in RATE_BITS)
            raise KeyMistake("samples_per_s", f"{self.samples_per_s} is no rate of the {self.part}", right)

    @property
    def conversion_us(self) -> int:
        """Longest time of one conversion."""
        if self.part == "RP2":
            return RP2_CONVERSION_US
        return math.ceil(1e6 / (self.samples_per_s * SLOWEST_RATE)) + WAKE_UP_US

    @property
    def count_V(self) -> float:
        """Volts per count."""
        return self.range_V / 32768


class Monitor(_Table, frozen=True, kw_only=True):
    """A current monitor with a shunt of its own, whose alert clamps the gate without the firmware."""

    part: Annotated[str, wording("Part number.")] = "INA226"
    address: Annotated[int, quantity("", "Bus address.", ge=0x08, le=0x77)] = 0x40
    shunt_ohm: Annotated[float, quantity("ohm", "Its shunt, in the source lead.", gt=0, le=1)]
    alert_pin: Annotated[_GpioPin, meaning("GPIO number at which its alert is read.")]

    def __post_init__(self) -> None:
        check_part("monitor", self.part)


class CurrentSense(_Table, frozen=True, kw_only=True):
    """Sense resistor and amplifier: what the DAC's voltage is compared with, and what the ADC measures."""

    resistance_ohm: Annotated[float, quantity("ohm", "Sense resistor.", gt=0, le=10)]
    resistance_tolerance_percent: _Percent = 1.0
    resistance_drift_ppm_per_K: Annotated[
        float, quantity("ppm/K", "Drift of the sense resistor.", ge=0, le=5000)
    ] = 50.0
    resistance_thermal_K_per_W: Annotated[
        float, quantity("K/W", "How much the sense resistor heats itself.", ge=0, le=500)
    ] = 30.0
    amplifier_gain: Annotated[float, quantity("1", "Gain of the sense amplifier.", ge=1, le=1000)]
    amplifier_gain_tolerance_percent: _Percent = 0.3
    amplifier_offset_V: Annotated[
        float, quantity("V", "Largest offset, at the amplifier's input.", ge=0, le=0.1)
    ] = 0.0001
    pedestal_V: _Pedestal = 0.1
    pedestal_tolerance_percent: _Percent = 5.0

    @property
    def V_per_A(self) -> float:
        """Volts at the amplifier's output per ampere."""
        return self.resistance_ohm * self.amplifier_gain


class VoltageSense(_Table, frozen=True, kw_only=True):
    """Divider of the remote-sense pair."""

    ratio: _Ratio
    ratio_tolerance_percent: _Percent = 0.3
    ratio_drift_ppm_per_K: Annotated[float, quantity("ppm/K", "Drift of the ratio.", ge=0, le=1000)] = 25.0
    offset_V: Annotated[float, quantity("V", "Largest offset, at the converter's input.", ge=0, le=0.1)] = (
        0.002
    )
    pedestal_V: _Pedestal = 0.1
    pedestal_tolerance_percent: _Percent = 5.0
    pair: Annotated[bool, meaning("Whether the board has a remote-sense pair.")] = True


class ForceSense(_Table, frozen=True, kw_only=True):
    """Divider at the load's own terminals."""

    ratio: _Ratio
    ratio_tolerance_percent: _Percent = 2.0
    offset_V: Annotated[float, quantity("V", "Largest offset, at the converter's input.", ge=0, le=0.1)] = (
        0.005
    )
    pedestal_V: _Pedestal = 0.1
    pedestal_tolerance_percent: _Percent = 5.0


class Ntc(_Table, frozen=True, kw_only=True):
    """A thermistor to ground under a pull-up."""

    r25_ohm: Annotated[float, quantity("ohm", "Resistance at 25 degC.", ge=100, le=1e6)] = 10_000.0
    r25_tolerance_percent: _Percent = 2.0
    curve: (
        Annotated[
            Literal["NTCLE100E3-3977"], meaning("Curve of the datasheet.", default="none: `beta_K` counts")
        ]
        | None
    ) = None
    beta_K: (
        Annotated[
            float,
            quantity(
                "K", "Beta value between 25 and 85 degC.", default="none: `curve` counts", ge=2000, le=6000
            ),
        ]
        | None
    ) = None
    pullup_ohm: Annotated[float, quantity("ohm", "Pull-up.", ge=100, le=1e6)] = 10_000.0
    pullup_tolerance_percent: _Percent = 1.0
    supply_V: Annotated[float, quantity("V", "Where the pull-up goes.", ge=1.0, le=5.5)] = 3.3

    def __post_init__(self) -> None:
        if (self.curve is None) == (self.beta_K is None):
            state = "is missing, and beta_K too" if self.curve is None else "is given beside beta_K"
            raise KeyMistake("curve", state, "give one of the two: the curve of the datasheet is the better")


class Thermistors(_Table, frozen=True, kw_only=True):
    """Where temperature is measured."""

    heatsink: Annotated[Ntc, meaning("On the transistor's tab, or on the heatsink close to it.")]


class Transistor(_Table, frozen=True, kw_only=True):
    """The transistor that turns the power into heat."""

    part: Annotated[str, wording("Part number; it must have a DC line in its safe operating area.")] = ""
    on_resistance_ohm: Annotated[float, quantity("ohm", "Fully on.", gt=0, le=10)] = 0.05
    stages: Annotated[
        tuple[tuple[float, float], ...],
        meaning("Foster stages from junction to case, `[K/W, s]` each."),
    ]
    case_to_sink_K_per_W: Annotated[
        float, quantity("K/W", "From the case to the thermistor's place.", gt=0, le=20)
    ]
    case_to_sink_s: Annotated[float, quantity("s", "Time constant of that.", gt=0, le=100)] = 0.5

    def __post_init__(self) -> None:
        if not 1 <= len(self.stages) <= 6:
            raise KeyMistake("stages", f"has {len(self.stages)} stages", "give 1 to 6, each as [K/W, s]")
        for number, (resistance, time) in enumerate(self.stages, start=1):
            if not (0 < resistance <= 20 and 1e-5 <= time <= 1000):
                raise KeyMistake(
                    f"stages[{number}]",
                    f"[{resistance:g}, {time:g}] is not plausible",
                    "write [K/W, s] with up to 20 K/W and 0.00001 to 1000 s",
                )

        if min(time for _, time in self.stages) > 1:
            raise KeyMistake(
                "stages",
                "has no stage quicker than 1 s",
                "a junction heats within milliseconds: take the stages of the datasheet's transient curve",
            )

    @property
    def junction_to_sink_K_per_W(self) -> float:
        return sum(resistance for resistance, _ in self.stages) + self.case_to_sink_K_per_W


class Heatsink(_Table, frozen=True, kw_only=True):
    """Heatsink, with its fan if there is one."""

    K_per_W: Annotated[float, quantity("K/W", "From the sink to the air, fan running.", gt=0, le=100)]
    K_per_W_tolerance_percent: Annotated[
        float, quantity("%", "How much weaker the cooling may be before it is called weak.", ge=5, le=100)
    ] = 30.0
    still_air_K_per_W: (
        Annotated[
            float,
            quantity("K/W", "The same, fan at rest.", default="5 times `K_per_W`", gt=0, le=500),
        ]
        | None
    ) = None
    time_constant_s: Annotated[float, quantity("s", "Time constant of the sink.", ge=10, le=10000)] = 180.0
    time_constant_tolerance_percent: Annotated[
        float, quantity("%", "How much longer it may be, for its mass is estimated.", ge=5, le=100)
    ] = 30.0
    ambient_degC: Annotated[float, quantity("degC", "Warmest air it must work in.", ge=0, le=60)] = 40.0
    coldest_air_degC: Annotated[float, quantity("degC", "Coldest air it works in.", ge=-20, le=20)] = 10.0

    def __post_init__(self) -> None:
        if self.still_K_per_W < self.K_per_W:
            raise KeyMistake(
                "still_air_K_per_W",
                f"{self.still_K_per_W:g} K/W is less than with the fan",
                f"choose at least {self.K_per_W:g} K/W, or leave it out",
            )

    @property
    def still_K_per_W(self) -> float:
        return 5 * self.K_per_W if self.still_air_K_per_W is None else self.still_air_K_per_W


class Amplifier(_Table, frozen=True, kw_only=True):
    """The loop that holds the current, as far as the host must know it."""

    loop_bandwidth_Hz: Annotated[
        float, quantity("Hz", "Unity-gain frequency of the loop.", ge=10, le=1e6)
    ] = 5000.0
    output_high_V: Annotated[float, quantity("V", "Highest gate drive: its supply rail.", ge=3, le=30)] = 10.0
    gate_threshold_V: Annotated[float, quantity("V", "Gate drive at which current begins.", ge=0.5, le=8)] = (
        3.0
    )


class Protection(_Table, frozen=True, kw_only=True):
    """Bands of the guard; without them they follow from the tolerances."""

    zero_budget_A: (
        Annotated[
            float,
            quantity(
                "A", "Largest current zero that is believed.", default="sum of the tolerances", gt=0, le=5
            ),
        ]
        | None
    ) = None
    off_current_A: (
        Annotated[
            float,
            quantity(
                "A",
                "More than this with the gate clamped trips.",
                default="zero budget + 1 % of the limit",
                gt=0,
                le=5,
            ),
        ]
        | None
    ) = None
    demand_margin_A: (
        Annotated[
            float,
            quantity(
                "A",
                "More than this above the demand trips.",
                default="3 % of the limit + 20 DAC codes",
                gt=0,
                le=5,
            ),
        ]
        | None
    ) = None
    lead_allowance_ohm: Annotated[
        float,
        quantity(
            "ohm", "Both leads together; a larger drop counts as a sense lead that is off.", gt=0, le=10
        ),
    ] = 0.5


class BoardFile(msgspec.Struct, frozen=True, forbid_unknown_fields=True, kw_only=True):
    """A whole board file whose values hold together."""

    text: Annotated[str, by_program()] = ""
    name: Annotated[str, wording("What the board is called, up to 16 bytes.", shortest=1)]
    limits: Annotated[Limits, meaning("What the board stands.")]
    control: Annotated[Control, meaning("The supervising loop.")] = msgspec.field(default_factory=Control)
    pins: Annotated[Pins, meaning("GPIO numbers.")] = msgspec.field(default_factory=Pins)
    i2c: Annotated[I2C, meaning("The bus to the converters.")] = msgspec.field(default_factory=I2C)
    dac: Annotated[Dac, meaning("The converter that sets the current.")]
    adc: Annotated[Adc, meaning("The converter that measures.")] = msgspec.field(default_factory=Adc)
    monitor: Annotated[Monitor, meaning("A second trip for the current.", default="not fitted")] | None = None
    current_sense: Annotated[CurrentSense, meaning("Sense resistor and amplifier.")]
    voltage_sense: Annotated[VoltageSense, meaning("Divider of the sense pair.")]
    force_sense: Annotated[ForceSense, meaning("Divider at the terminals.")]
    thermistor: Annotated[Thermistors, meaning("Thermistors.")]
    transistor: Annotated[Transistor, meaning("The transistor.")]
    heatsink: Annotated[Heatsink, meaning("The heatsink.")]
    amplifier: Annotated[Amplifier, meaning("The loop that holds the current.")] = msgspec.field(
        default_factory=Amplifier
    )
    protection: Annotated[Protection, meaning("Bands of the guard.")] = msgspec.field(
        default_factory=Protection
    )

    def __post_init__(self) -> None:
        check_board(self)

    @property
    def zero_budget_A(self) -> float:
        """Largest current zero of a board whose parts keep their tolerances."""
        if self.protection.zero_budget_A is not None:
            return self.protection.zero_budget_A
        sense, adc = self.current_sense, self.adc
        pedestal_V = sense.pedestal_V * sense.pedestal_tolerance_percent / 100
        offset_V = sense.amplifier_offset_V * sense.amplifier_gain
        # four standard deviations of the noise, and one count of resolution
        converter_V = (adc.offset_counts + 4 * adc.noise_counts + 1) * adc.count_V
        converter_V += sense.pedestal_V * adc.gain_tolerance_percent / 100
        return (pedestal_V + offset_V + converter_V) / sense.V_per_A

    @property
    def off_current_A(self) -> float:
        """Current that counts as flowing although the gate is clamped."""
        given = self.protection.off_current_A
        return given if given is not None else self.zero_budget_A + 0.01 * self.limits.current_A

    @property
    def demand_margin_A(self) -> float:
        """Current above the demand that counts as a failed loop."""
        given = self.protection.demand_margin_A
        code_A = self.dac.code_V / self.current_sense.V_per_A
        return given if given is not None else 0.03 * self.limits.current_A + 20 * code_A
