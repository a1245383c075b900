"""Symbols of units and their SI prefixes; `mutual.units` reads and writes numbers with them."""

from __future__ import annotations

import math
from dataclasses import dataclass
from decimal import Context, Decimal

from mutual.errors import RefusedInput
from mutual.quoting import nearest, shown

_PREFIXES = {
    "q": -30, "r": -27, "y": -24, "z": -21, "a": -18, "f": -15, "p": -12, "n": -9, "u": -6, "m": -3, "c": -2, "d": -1,
    "": 0, "da": 1, "h": 2, "k": 3, "M": 6, "G": 9, "T": 12, "P": 15, "E": 18, "Z": 21, "Y": 24, "R": 27, "Q": 30,
}  # fmt: skip
# What people are shown: one prefix for each three powers of ten.
_SHOWN_PREFIXES = {-15: "f", -12: "p", -9: "n", -6: "u", -3: "m", 0: "", 3: "k", 6: "M", 9: "G"}
# Mega is far likelier a slip for milli on these (interface contract, section 2): refused, and never shown.
_NO_MEGA = ("H", "F")

# Sixty digits: the conversion of a number with the digits of a double is then rounded only once, at the end.
CONTEXT = Context(prec=60)
_ONE_DEGREE = Decimal("0.0174532925199432957692369076848861271344287188854172545609719")

# Symbol -> (SI unit, factor, whether prefixes are taken).
_SYMBOLS: dict[str, tuple[str, Decimal, bool]] = {
    "H": ("H", Decimal(1), True),
    "ohm": ("ohm", Decimal(1), True),
    "F": ("F", Decimal(1), True),
    "V": ("V", Decimal(1), True),
    "A": ("A", Decimal(1), True),
    "Hz": ("Hz", Decimal(1), True),
    "S": ("S", Decimal(1), True),
    "s": ("s", Decimal(1), True),
    "rad": ("rad", Decimal(1), True),
    "deg": ("rad", _ONE_DEGREE, True),
    "degC": ("degC", Decimal(1), False),
    "%": ("1", Decimal("0.01"), False),
    "ppm": ("1", Decimal("0.000001"), False),
    "1": ("1", Decimal(1), False),
    # Only for points, which may be any state that can be set.
    "m": ("m", Decimal(1), True),
    "g": ("kg", Decimal("0.001"), True),
    "N": ("N", Decimal(1), True),
    "K": ("K", Decimal(1), True),
    "T": ("T", Decimal(1), True),
    "W": ("W", Decimal(1), True),
    "Pa": ("Pa", Decimal(1), True),
    "in": ("m", Decimal("0.0254"), False),
}
_SPELLINGS = {"\u03a9": "ohm", "\u2126": "ohm", "Ohm": "ohm", "ohms": "ohm", "\u00b0C": "degC", "\u00b0": "deg"}


@dataclass(frozen=True)
class Unit:
    """A unit with its prefix.

    Attributes
    ----------
    symbol : str
        As it is written, prefix included, e.g. "uH".
    base : str
        The SI unit it measures in: "H", "ohm", "F", "V", "A", "Hz", "S", "s", "rad", "degC", "1", ...
    factor : Decimal
        What one of it is worth in `base`.
    """

    symbol: str
    base: str
    factor: Decimal


def unit_of(text: str, base: str | None = None) -> Unit:
    """Understand a unit with any SI prefix.

    Parameters
    ----------
    text : str
        Such as "uH", "kohm", "deg", "%". The micro signs U+00B5 and U+03BC are `u`.
    base : str, optional
        The SI unit that is wanted.

    Raises
    ------
    RefusedInput
        Unknown unit, one of another kind, or mega on a henry or farad.
    """
    symbol = text.strip().replace("\u00b5", "u").replace("\u03bc", "u")
    found = _resolve(symbol)
    if found is None:
        known = _known_symbols(base)
        raise RefusedInput("unknown unit", found=shown(text), expected=f"{nearest(symbol, known)} or the like")
    if base is not None and found.base != base:
        raise RefusedInput("a unit of another kind", found=shown(text), expected=example_of(base))
    if found.base in _NO_MEGA and found.factor == Decimal(10) ** 6:
        word = {"H": "megahenry", "F": "megafarad"}[found.base]
        raise RefusedInput(
            f"{word} is not taken, as milli is meant more often than not",
            found=shown(text),
            expected=f"m{found.base} (milli) or k{found.base}",
        )
    return found


def _resolve(symbol: str) -> Unit | None:
    if symbol in _SPELLINGS:
        symbol = _SPELLINGS[symbol]
    if symbol in _SYMBOLS:
        base, factor, _ = _SYMBOLS[symbol]
        return Unit(symbol, base, factor)
    for length in (1, 2):
        prefix, rest = symbol[:length], symbol[length:]
        rest = _SPELLINGS.get(rest, rest)
        if prefix in _PREFIXES and rest in _SYMBOLS and _SYMBOLS[rest][2]:
            base, factor, _ = _SYMBOLS[rest]
            return Unit(prefix + rest, base, CONTEXT.multiply(factor, Decimal(10) ** _PREFIXES[prefix]))
    return None


def _known_symbols(base: str | None) -> list[str]:
    symbols = []
    for symbol, (kind, _, prefixed) in _SYMBOLS.items():
        if base is None or kind == base:
            symbols += [p + symbol for p in ("", "u", "m", "n", "p", "k", "M") if prefixed or not p]
    return [s for s in symbols if s not in ("MH", "MF")]


def example_of(base: str) -> str:
    """How a unit that measures in `base` may be written, for a message."""
    examples = {"1": "a plain number or %", "rad": "deg or mrad", "H": "H, mH, uH or nH", "ohm": "ohm, mohm or kohm"}
    return examples.get(base, f"{base}, with or without a prefix")


def prefixed(base: str, magnitude: float) -> Unit:
    """The unit with the prefix in which `magnitude` (in the SI unit) has one to three digits before the point."""
    if base not in _SYMBOLS or not _SYMBOLS[base][2] or not 0.0 < magnitude < math.inf:
        return unit_of(base)
    power = 3 * math.floor(Decimal(repr(float(magnitude))).adjusted() / 3)
    power = min(max(power, -15), 3 if base in _NO_MEGA else 9)
    return unit_of(_SHOWN_PREFIXES[power] + base)
