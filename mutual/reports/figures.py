"""Quantities for people: as many digits as the uncertainty supports, and bounds rounded outwards."""

from __future__ import annotations

from dataclasses import dataclass
from decimal import ROUND_CEILING, ROUND_FLOOR, ROUND_HALF_EVEN, Decimal
from math import floor, isfinite, log10

from mutual.result import Quantity
from mutual.symbols import prefixed

SIGNIFICANT = 2
# Results of noise-free readings would fill the line with digits that nobody measures.
MOST_DIGITS = 7
NOT_DETERMINED = "not determined by these readings"


@dataclass(frozen=True)
class Figures:
    """Texts of one quantity, all with the same prefix and the same number of decimals.

    Attributes
    ----------
    relation : {"=", ">=", "<="}
    value : str
        The value; the bound itself where there is one bound only.
    lower, upper : str or None
        None for quantities bounded on one side.
    unit : str
        With its prefix; empty for plain numbers.
    """

    relation: str
    value: str
    lower: str | None
    upper: str | None
    unit: str

    def __str__(self) -> str:
        text = f"{self.value} {self.unit}".rstrip()
        if self.relation != "=":
            return f"{self.relation} {text}"
        return text if self.lower is None else f"{text} ({self.lower} to {self.upper})"


def figures(quantity: Quantity, unit: str) -> Figures:
    """Texts of a quantity.

    Parameters
    ----------
    quantity : Quantity
        SI units.
    unit : str
        "H", "ohm", "F", "Hz" or, for plain numbers, "1".
    """
    lower, upper = quantity.lower, quantity.upper
    relation = {"lower": ">=", "upper": "<="}.get(quantity.bound, "=")
    edge = {"lower": lower, "upper": upper}.get(quantity.bound)
    main = quantity.value if edge is None else edge
    spread = _spread(quantity)
    size = max(abs(main), spread)
    symbol, power = _prefix(size, unit)
    digit = _last_digit(spread, max(abs(x) for x in (main, lower, upper) if x is not None)) - power
    if relation != "=":
        way = ROUND_FLOOR if relation == ">=" else ROUND_CEILING
        return Figures(relation, rounded(main, power, digit, way), None, None, symbol)
    if lower is None or upper is None:
        return Figures(relation, rounded(main, power, digit), None, None, symbol)
    low = rounded(lower, power, digit, ROUND_FLOOR)
    high = rounded(upper, power, digit, ROUND_CEILING)
    return Figures(relation, rounded(main, power, digit), low, high, symbol)


def _prefix(size: float, unit: str) -> tuple[str, int]:
    """Unit with the prefix that suits a size, empty for plain numbers, and the prefix's power of ten."""
    chosen = prefixed(unit, size)
    return ("" if unit == "1" else chosen.symbol), chosen.factor.adjusted()


def _spread(quantity: Quantity) -> float:
    """What the last digit is chosen by: u, else the distance from value to bound; 0 where neither is known."""
    if quantity.standard_uncertainty:
        return quantity.standard_uncertainty
    ends = [end for end in (quantity.lower, quantity.upper) if end is not None]
    if quantity.bound == "both" and len(ends) == 2:
        return (ends[1] - ends[0]) / 4
    return max((abs(quantity.value - end) for end in ends), default=0.0)


def _last_digit(spread: float, size: float) -> int:
    """Power of ten of the last digit shown."""
    most = floor(log10(size)) - MOST_DIGITS + 1 if size > 0 else -MOST_DIGITS
    if not spread > 0 or not isfinite(spread):
        return most
    return max(floor(log10(spread)) - SIGNIFICANT + 1, most)


def rounded(value: float, power: int, digit: int, way: str = ROUND_HALF_EVEN) -> str:
    """The value divided by ten to `power`, rounded at the digit of ten to `digit`, written without exponent."""
    # repr has the fewest digits that give the same float, so 2.4e-5 shifts to 24 and not to 24.000000000000004.
    exact = Decimal(repr(float(value))).scaleb(-power)
    text = format(exact.quantize(Decimal(1).scaleb(digit), rounding=way), "f")
    return text.removeprefix("-") if not any(c in "123456789" for c in text) else text


def short(value: float, unit: str, digits: int = 4) -> str:
    """A number that has no uncertainty, such as a test frequency: at most `digits` significant, no idle zeros."""
    symbol, power = _prefix(abs(value), unit)
    if value == 0:
        return f"0 {symbol}".rstrip()
    text = rounded(value, power, floor(log10(abs(value))) - digits + 1 - power)
    if "." in text:
        text = text.rstrip("0").rstrip(".")
    return f"{text} {symbol}".rstrip()


def percent(share: float, digits: int = 3) -> str:
    """A fraction in percent, without idle zeros."""
    return f"{100 * share:.{digits}g} %"


def probability(p: float, symbol: str = "p") -> str:
    """A probability such as "p = 0.27", in figures that neither say 1 nor 0 for what is merely likely or unlikely."""
    if p < 1e-12:
        return f"{symbol} below 1e-12"
    if p < 0.001:
        return f"{symbol} = {p:.1e}".replace("e-0", "e-")
    if p > 0.999:
        return f"{symbol} above 0.999"
    return f"{symbol} = {p:.2g}"


def odds(p: float) -> str:
    """Odds for something of probability `p` >= 0.5, in words and figures; rounded down."""
    if p >= 1 - 1e-6:
        return "odds of a million to 1 or better"
    ratio = p / (1 - p)
    if ratio < 1.05:
        return "even odds"
    step = 10 ** max(floor(log10(ratio)) - 1, 0)
    whole = int(ratio // step * step)
    return f"odds of {whole} to 1" if ratio >= 2 else f"odds of {ratio:.1f} to 1"
