"""Numbers with units: "4.7 mH" <-> 4.7e-3. SI units inside, prefixes only here and in `mutual.symbols`.

Decimal arithmetic is used throughout, so that "24.3" under `[uH]` and "24.3e-6" under
`[H]` give the same float to the last bit, and the last printed digit is known exactly.
"""

from __future__ import annotations

import math
import re
from dataclasses import dataclass
from decimal import Context, Decimal

from mutual.errors import RefusedInput
from mutual.quoting import shown
from mutual.symbols import CONTEXT, Unit, example_of, prefixed, unit_of

__all__ = ["Parsed", "Unit", "engineering", "parse", "prefixed", "printed", "read_number", "unit_of"]

# Four digits of exponent reach beyond every double; more would only make the arithmetic slow.
_NUMBER = re.compile(r"([+-]?)([0-9]+(?:\.[0-9]*)?|\.[0-9]+)(?:[eE]([+-]?[0-9]{1,4}))?")
# A display shows no more digits than a double holds: such a number was computed, and its last digit says nothing.
_DIGITS_OF_A_COMPUTED_NUMBER = 16


@dataclass(frozen=True)
class Parsed:
    """A number with its unit.

    Attributes
    ----------
    value : float
        In `unit`.
    unit : str
        SI unit; "1" for a plain number or a percentage.
    step : float or None
        Size of the last printed digit in `unit`; None if it says nothing (16 digits or more).
    """

    value: float
    unit: str
    step: float | None = None


def read_number(text: str, unit: Unit) -> Parsed | None:
    """Read a bare number that is given in `unit`; None if the text is not a number.

    Spaces around it and the minus sign U+2212 are taken. An exponent too large for a double
    gives an infinite value, as "inf" does not.
    """
    match = _NUMBER.fullmatch(text.strip().replace("\u2212", "-"))
    if match is None:
        return None
    sign, mantissa, exponent = match.group(1), match.group(2), int(match.group(3) or 0)
    number = Decimal(f"{sign}{mantissa}e{exponent}")
    value = float(CONTEXT.multiply(number, unit.factor))
    digits = mantissa.replace(".", "")
    significant = digits.lstrip("0") or digits
    if len(significant) >= _DIGITS_OF_A_COMPUTED_NUMBER:
        return Parsed(value, unit.base)
    decimals = len(mantissa.partition(".")[2])
    step = float(CONTEXT.multiply(Decimal(10) ** (exponent - decimals), unit.factor))
    return Parsed(value, unit.base, step if 0.0 < step < math.inf else None)


def parse(text: str, unit: str | None = None) -> Parsed:
    """Understand a number with its unit, such as "24.3uH", "0.1 %" or "100 kHz".

    Parameters
    ----------
    text : str
        The number, perhaps a space, and its unit.
    unit : str, optional
        The SI unit that is wanted: "H", "ohm", "Hz", ... or "1", for which a bare number and a percentage are taken.

    Raises
    ------
    RefusedInput
        Not a number, not finite, no unit, an unknown unit, one of another kind, or mega on a henry or farad.
    """
    expected = "a number with a unit"
    if unit is not None:
        expected = example_of("1") if unit == "1" else f"{expected}: {example_of(unit)}"
    stripped = text.strip().replace("\u2212", "-")
    match = _NUMBER.match(stripped)
    if match is None:
        raise RefusedInput("not a number", found=shown(text), expected=expected)
    symbol = stripped[match.end() :].strip()
    if symbol[:1] in (",", "."):
        raise RefusedInput("not a number", found=shown(text), expected=f"{expected}, with a decimal point")
    if not symbol and unit not in (None, "1"):
        raise RefusedInput("the unit is missing", found=shown(text), expected=expected)
    parsed = read_number(match.group(), unit_of(symbol or "1", unit))
    if parsed is None or not math.isfinite(parsed.value):
        raise RefusedInput("not a finite number", found=shown(text), expected=expected)
    return parsed


def printed(value: float, unit: Unit, step: float | None = None, *, padded: bool = False) -> str:
    """Write a number in `unit` so that `read_number` gives it back to the last bit.

    Parameters
    ----------
    value : float
        In the SI unit.
    unit : Unit
    step : float, optional
        Size of the last digit to print, in the SI unit. Where it is no power of ten in `unit`, or too coarse for the
        value, the digits of the value are kept instead.
    padded : bool
        Without a `step`, write so many digits that none counts as the last digit of a display.
    """
    value = float(value)
    if step is not None and step > 0.0:
        exponent = round(math.log10(step / float(unit.factor)))
        text = _ending_at(CONTEXT.divide(Decimal(value), unit.factor), exponent)
        if read_number(text, unit) == Parsed(value, unit.base, step):
            return text
    if unit.factor.as_tuple().digits == (1,):
        exact = CONTEXT.divide(Decimal(repr(value)), unit.factor)
    else:  # a degree or an inch: twenty digits decide any double
        exact = Context(prec=20).divide(Decimal(value), unit.factor)
    if padded:
        spare = max(_DIGITS_OF_A_COMPUTED_NUMBER + 1 - len(exact.as_tuple().digits), 0)
        return _ending_at(exact, int(exact.as_tuple().exponent) - spare if exact else -_DIGITS_OF_A_COMPUTED_NUMBER)
    exact = exact.normalize(CONTEXT)
    return f"{exact:f}" if -12 <= exact.adjusted() <= 15 else f"{exact:e}"


def _ending_at(number: Decimal, exponent: int) -> str:
    """The number rounded to 10**exponent, whose last digit printed stands just there."""
    if number and number.adjusted() - exponent > CONTEXT.prec - 2:
        return ""
    sign, digits, _ = number.quantize(Decimal(1).scaleb(exponent), context=CONTEXT).as_tuple()
    if -25 <= exponent <= 0:
        return f"{Decimal((sign, digits, exponent)):f}"
    return f"{'-' if sign else ''}{''.join(map(str, digits))}e{exponent}"


def engineering(
    value: float, unit: str, *, uncertainty: float | None = None, digits: int = 4, like: float | None = None
) -> str:
    """Write a quantity for people, such as "2.575 uH".

    Parameters
    ----------
    value : float
        In the SI unit.
    unit : str
        SI unit; "1" for a plain number, which gets neither prefix nor unit.
    uncertainty : float, optional
        In the same unit; the value is rounded where the second digit of it stands.
    digits : int
        Significant digits where no uncertainty above zero is given.
    like : float, optional
        A value whose prefix is to be used, so that a value and its bounds have one prefix.
    """
    symbol = "" if unit == "1" else f" {unit}"
    if not math.isfinite(value):
        return f"{value}{symbol}"
    number = Decimal(repr(float(value)))
    if uncertainty is not None and 0.0 < uncertainty < math.inf:
        place = Decimal(repr(float(uncertainty))).adjusted() - 1
    else:
        place = (number.adjusted() if number else 0) - digits + 1
    # Fifteen digits are all that a double holds, however small the uncertainty.
    place = max(place, number.adjusted() - 14) if number else place
    rounded = number.quantize(Decimal(1).scaleb(place), context=CONTEXT)
    if not rounded.is_zero() and uncertainty is None and rounded.adjusted() > number.adjusted():
        rounded = rounded.quantize(Decimal(1).scaleb(place + 1), context=CONTEXT)  # 9.9996 has become 10.000
    scale = like if like is not None else float(rounded) or uncertainty or 0.0
    chosen = prefixed(unit, abs(scale))
    in_unit = rounded.scaleb(-chosen.factor.adjusted())
    return f"{in_unit.copy_abs() if in_unit.is_zero() else in_unit:f}" + ("" if unit == "1" else f" {chosen.symbol}")
