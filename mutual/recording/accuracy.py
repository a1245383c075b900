"""Accuracy tables and the kick table of a preface (interface contract, section 2.1)."""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping
from typing import Any

from mutual.errors import RefusedInput
from mutual.quoting import nearest, shown
from mutual.recording.model import Accuracy, KickTable
from mutual.recording.preface import Preface, is_number
from mutual.result import Finding
from mutual.units import parse

GAINS = ("gain_common", "gain_each", "gain")
PHASES = ("phase_common", "phase_each", "phase")
BY_UNIT = ("floor", "noise", "resolution")
PLAIN = ("counts", "shunt_floor", "low_q_factor", "input_resistance", "stated_as")
KEYS = (*GAINS, *PHASES, *BY_UNIT, *PLAIN)
STATED_AS = ("limit", "standard", "expanded")
LOW_Q_FACTORS = ("1 + 1/Q", "sqrt(1 + 1/Q^2)")
_UNITS_OF_READINGS = ("H", "ohm", "V", "A", "Hz", "F", "S", "1", "rad")


def accuracy(preface: Preface, name: str) -> Accuracy:
    """The accuracy table called `name`.

    Raises
    ------
    RefusedInput
        Not a table, an unknown key, a missing or wrong unit, a negative accuracy.
    """
    table = _table(preface, name, KEYS)
    found: dict[str, Any] = {}
    for key, value in table.items():
        path = (name, key)
        if key in GAINS:
            found[key] = _size(preface, path, value, "1", '"0.1 %"')
        elif key in PHASES:
            found[key] = _size(preface, path, value, "rad", '"0.1 deg" or "2 mrad"')
        elif key in BY_UNIT:
            found[key] = _by_unit(preface, path, value)
        elif key == "counts":
            found[key] = _size(preface, path, value, "1", "a number of display steps, such as 3")
        elif key == "shunt_floor":
            found[key] = _size(preface, path, value, "S", '"0.5 nS"')
        elif key == "input_resistance":
            found[key] = _size(preface, path, value, "ohm", '"10 Mohm"')
        else:
            found[key] = _choice(preface, path, value, LOW_Q_FACTORS if key == "low_q_factor" else STATED_AS)
    return Accuracy(name, **found)


def kick_table(preface: Preface) -> KickTable:
    """The table `[kick]`; probabilities as plain numbers or percentages.

    Raises
    ------
    RefusedInput
        An unknown key, or a probability outside 0 to 0.5.
    """
    if "kick" not in preface.tables:
        return KickTable()
    wanted = "a probability from 0 to 0.5"
    chances = {}
    for key, value in _table(preface, "kick", ("misread", "reversed")).items():
        chances[key] = _size(preface, ("kick", key), value, "1", wanted)
        if chances[key] > 0.5:
            raise preface.refused("more often wrong than right", "kick", key, found=value, expected=wanted)
    return KickTable(**chances)


def bare_ratios(preface: Preface, names: Iterable[str], file: str) -> list[Finding]:
    """A caution for each gain that a file gives without `%`: it may have been meant in percent."""
    return [
        Finding("caution", "unit", f"{name}.{key} = {value} has no % and is taken for {100 * value:g} %", file)
        for name in names
        for key, value in preface.tables[name].items()
        if preface.lines and key in GAINS and is_number(value)
    ]


def _table(preface: Preface, name: str, known: tuple[str, ...]) -> Mapping[str, Any]:
    table = preface.tables[name]
    if not isinstance(table, Mapping):
        raise preface.refused("this should be a table", name, found=table, expected=f"[{name}]")
    for key in table:
        if key not in known:
            raise preface.refused("unknown key", name, str(key), found=key, expected=nearest(str(key), known))
    return table


def _size(preface: Preface, path: tuple[str, ...], value: Any, unit: str, example: str) -> float:
    """A size of an error: not negative, finite, in `unit`; a bare number only where the unit is "1"."""
    if unit == "1" and is_number(value):
        size = float(value)
    elif isinstance(value, str):
        try:
            size = parse(value, unit).value
        except RefusedInput as error:
            raise preface.refused(error.reason, *path, found=value, expected=error.expected or example) from None
    else:
        raise preface.refused("not a number with its unit", *path, found=value, expected=example)
    if not 0.0 <= size < math.inf:
        raise preface.refused("an accuracy cannot be negative or infinite", *path, found=value, expected=example)
    return size


def _by_unit(preface: Preface, path: tuple[str, ...], value: Any) -> dict[str, float]:
    """One size, or a list of sizes for several quantities, told apart by their units."""
    example = 'a number with its unit, such as "5 nH", or for Q and D "0.01 1"'
    sizes: dict[str, float] = {}
    for item in value if isinstance(value, (list, tuple)) else [value]:
        if not isinstance(item, str):
            raise preface.refused("the unit is missing", *path, found=item, expected=example)
        try:
            parsed = parse(item)
        except RefusedInput as error:
            raise preface.refused(error.reason, *path, found=item, expected=error.expected or example) from None
        if parsed.unit not in _UNITS_OF_READINGS or (parsed.unit == "1" and not item.rstrip().endswith(" 1")):
            raise preface.refused("this needs the unit of what is read", *path, found=item, expected=example)
        if parsed.value < 0.0:
            raise preface.refused("an accuracy cannot be negative", *path, found=item, expected=example)
        if parsed.unit in sizes:
            raise preface.refused("two sizes for one unit", *path, found=", ".join(map(str, value)))
        sizes[parsed.unit] = parsed.value
    return sizes


def _choice(preface: Preface, path: tuple[str, ...], value: Any, choices: tuple[str, ...]) -> str:
    plain = {choice.replace(" ", ""): choice for choice in choices}
    text = str(value).replace(" ", "")
    if not isinstance(value, str) or text not in plain:
        raise preface.refused("not one of the choices", *path, found=value, expected=" or ".join(map(shown, choices)))
    return plain[text]
