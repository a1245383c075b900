"""What no instrument can show of a device of windings, each refused with its row."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from mutual.errors import RefusedInput
from mutual.recording.columns import INSTRUMENT_OF, KICKS
from mutual.recording.model import Accuracy, Row, Value
from mutual.units import engineering

# Divided by omega, or by R at no frequency: without meaning for direct current.
_NEEDS_A_FREQUENCY = ("inductance", "parallel inductance", "quality", "dissipation", "transfer inductance")
_NOT_NEGATIVE = ("frequency", "impedance", "resonance", "tuned with", "drive", "sensed", "drive current")
_NEEDS_SENSE = ("sensed", "transfer inductance", "transfer resistance", *KICKS)
_UNITS = {"frequency": "Hz", "impedance": "ohm", "resonance": "Hz", "tuned with": "F", "drive current": "A"}
_SELF_INDUCTANCES = ("inductance", "parallel inductance")
# Noise reaches three standard deviations; limits are limits; an expanded error has coverage factor 2.
_REACH = {"limit": 1.0, "standard": 3.0, "expanded": 1.5}
# Below zero by more than this part of the largest inductance is no small fault of a small reading.
_FAR_BELOW = 0.05


def refuse_nonsense(row: Row) -> None:
    """Refuse a row that makes no sense whatever the accuracy.

    Raises
    ------
    RefusedInput
        `column` is set.
    """
    numbers = {name: v.value for name, v in row.values.items()}
    if row.frequency is not None:
        numbers["frequency"] = row.frequency
    for name in _NOT_NEGATIVE:
        if numbers.get(name, 0.0) < 0.0:
            found = engineering(numbers[name], _UNITS.get(name, "V"))
            raise RefusedInput("this cannot be negative", column=name, found=found, expected="zero or more")
    for name in _NEEDS_A_FREQUENCY:
        if row.frequency == 0.0 and name in row.values:
            raise RefusedInput(
                f"{name} has no meaning for direct current",
                column=name,
                found=f"{name} at 0 Hz",
                expected="the test frequency, or a resistance",
            )
    for name in _NEEDS_SENSE:
        if row.hookup.sense is None and (name in row.values or name in row.kicks):
            raise RefusedInput(f"{name} needs leads in the column sense", column=name, expected="sense, such as C-D")


def refuse_negative_inductance(rows: Sequence[Row], instruments: Mapping[str, Accuracy]) -> None:
    """Refuse an inductance that is below zero by more than floor, noise and resolution allow.

    Transfer inductances are signed and pass.

    Raises
    ------
    RefusedInput
        Row, line and column are set; far below zero, the reason given is self-resonance.
    """
    read = [(row, name, row.values[name]) for row in rows for name in _SELF_INDUCTANCES if name in row.values]
    largest = max((value.value for _, _, value in read), default=0.0)
    for row, name, value in read:
        if value.value >= 0.0:
            continue
        accuracy = instruments.get(row.instrument or INSTRUMENT_OF[name])
        allowed = _allowed(accuracy, value)
        if value.value >= -allowed:
            continue
        far = -value.value > max(_FAR_BELOW * largest, allowed)
        reason = (
            "a negative inductance: at this frequency the device is above its self-resonance and acts as a capacitor"
            if far
            else "a negative inductance, beyond what floor, noise and resolution allow"
        )
        least = engineering(-allowed, "H") if allowed else "0 H"
        raise RefusedInput(
            reason,
            row=row.number,
            line=row.line,
            column=name,
            found=engineering(value.value, "H"),
            expected=f"{least} or more" + (", read at a lower frequency" if far else ""),
        )


def _allowed(accuracy: Accuracy | None, value: Value) -> float:
    """How far below zero a reading of nothing may be, in H."""
    if accuracy is None:
        return value.step or 0.0
    step = accuracy.resolution.get("H", value.step or 0.0)
    additive = accuracy.floor.get("H", 0.0) + (accuracy.counts or 0.0) * step
    return _REACH[accuracy.stated_as] * additive + 3.0 * accuracy.noise.get("H", 0.0) + step
