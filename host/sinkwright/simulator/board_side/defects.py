"""What may break in the simulated world, when, and what that does to it.

A defect is {"kind", "from_us", "until_us" (optional: for ever), "value" (where the kind has one)}. Kinds of the
circuit stand here; what begins with "adc_", "dac_" or "bus_" is a chip's or the bus's business and goes to
`plant.on_defect`. Values are of the worst plausible size where no better reason stands beside them.
"""

# What is left of a lifted sense resistor: the sense amplifier's input resistors (a difference amplifier's, from
# memory). The loop closes through them, so that the readback goes on telling what was asked.
_OPEN_SENSE_OHM = 1e3
# A solder bridge across it.
_SHORTED_SENSE_OHM = 5e-4
# Still air instead of the fan: common practice, no source.
_FAN_FACTOR = 4.0
_SENSE_SEEN = {"sense_open": 0.0, "sense_swapped": -1.0}
_SENSE_OHM = {"resistor_open": _OPEN_SENSE_OHM, "resistor_shorted": _SHORTED_SENSE_OHM}


def schedule(defects):
    """[(time in us, kind, whether it begins, value)] in the order of time."""
    events = []
    for defect in defects:
        value = defect.get("value")
        events.append((defect["from_us"], defect["kind"], True, value))
        if defect.get("until_us") is not None:
            events.append((defect["until_us"], defect["kind"], False, value))
    return sorted(events, key=_time)


def _time(event):
    return event[0]


def happen(plant, kind, begins, value):
    """`kind` begins or ends now; the plant has brought its state to this moment."""
    if kind in ("source_disconnected", "source_reversed"):
        plant.set_contact(kind[7:] if begins else "")
    elif kind == "source_high":
        plant.source.set_open_V(value if begins else None)
    elif kind == "transistor_short":
        plant.shorted = begins
    elif kind == "clamp_ineffective":
        plant.break_clamp(begins)
    elif kind == "fan_dead":
        plant.heat.slow_fan((value or _FAN_FACTOR) if begins else 1.0)
    elif kind == "thermistor_loose":
        plant.heat.loosen_sensor(begins)
    elif kind.startswith("thermistor_"):
        plant.thermistor.defect = kind[11:] if begins else ""
    elif kind in _SENSE_SEEN:
        plant.front.sense_seen = _SENSE_SEEN[kind] if begins else 1.0
    elif kind in _SENSE_OHM:
        plant.set_sense_ohm(_SENSE_OHM[kind] if begins else 0.0)
    else:
        plant.on_defect(kind, begins)
