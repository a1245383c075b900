"""One cell -> a number, or why it is none."""

from __future__ import annotations

import math
import re
from dataclasses import dataclass
from typing import Any

from mutual.errors import RefusedInput
from mutual.quoting import shown
from mutual.recording.model import Value
from mutual.recording.preface import is_number
from mutual.units import Unit, parse, read_number

# What SCPI-1999 instruments answer for infinity and for not-a-number; spellings vary, so they are compared as numbers.
_SENTINELS = (9.9e37, 9.91e37)
_SENTINEL_TOLERANCE = 5e-4
_OVERLOAD_WORDS = re.compile(
    r"[+-]?(inf(inity)?|nan|[o0]\.?l\.?|ovld?|ofl|over(load|flow|range)?|-{2,})", re.IGNORECASE
)
_DECIMAL_COMMA = re.compile(r"[+-]?[0-9]+,[0-9]+(?:[eE][+-]?[0-9]+)?")


@dataclass(frozen=True)
class Unusable:
    """Why a cell holds no number: code and text of the finding."""

    code: str
    text: str


def is_empty(cell: Any) -> bool:
    """Whether a cell was not filled in; a missing value of a DataFrame counts as empty."""
    if isinstance(cell, str):
        return not cell.strip()
    if cell is None or type(cell).__name__ in ("NAType", "NaTType"):
        return True
    return bool(cell != cell)  # a float that is not a number: how a DataFrame marks what is missing


def text_of(cell: Any) -> str:
    """A cell as text; a whole number from Python without decimals, as a lead's name may be one."""
    if is_empty(cell):
        return ""
    if is_number(cell) and float(cell).is_integer():
        return str(int(cell))
    return str(cell).strip()


def number_in(cell: Any, unit: Unit) -> Value | Unusable:
    """The number in a cell that is not empty, in SI units, with its last printed digit.

    Raises
    ------
    RefusedInput
        A decimal comma, which would go on for the whole file.
    """
    if not isinstance(cell, str):
        if not is_number(cell):
            return Unusable("left out", f"{shown(cell)} is not a number")
        number = float(cell)
        # Through the shortest text, so that 24.3 from Python and "24.3" in a file are one value.
        parsed = read_number(repr(number), unit) if math.isfinite(number) else None
        return _checked(cell, number, None if parsed is None else Value(parsed.value))
    if _OVERLOAD_WORDS.fullmatch(cell.strip()):
        return Unusable("overload", f"{shown(cell.strip())} means an overload or no number")
    parsed = read_number(cell, unit)
    if parsed is None:
        if _DECIMAL_COMMA.fullmatch(cell.strip()):
            raise RefusedInput("a decimal comma", found=shown(cell), expected="a decimal point")
        return Unusable("left out", f"{shown(cell.strip())} {_why_no_number(cell)}")
    return _checked(cell, parsed.value / float(unit.factor), Value(parsed.value, parsed.step))


def _why_no_number(cell: str) -> str:
    try:
        parse(cell)
    except RefusedInput:
        return "is not a number"
    return "has a unit of its own, which belongs in the header"


def _checked(cell: Any, number: float, value: Value | None) -> Value | Unusable:
    """The value unless the number as it stands is infinite or what instruments answer for that."""
    sentinel = any(abs(abs(number) / s - 1) < _SENTINEL_TOLERANCE for s in _SENTINELS)
    if sentinel or value is None or not math.isfinite(value.value) or not math.isfinite(number):
        return Unusable("overload", f"{shown(str(cell).strip())} means an overload or no number")
    return value
