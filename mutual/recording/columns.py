"""The header of a recording: which column is what, and in which unit."""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass

from mutual.errors import RefusedInput
from mutual.quoting import has_control, listed, nearest, plain, shown
from mutual.symbols import Unit, unit_of

# Column -> (SI unit, default instrument), interface contract, section 2.1.
_VALUES = {
    "inductance": ("H", "meter"),
    "parallel inductance": ("H", "meter"),
    "parallel resistance": ("ohm", "meter"),
    "resistance": ("ohm", "meter"),
    "quality": ("1", "meter"),
    "dissipation": ("1", "meter"),
    "impedance": ("ohm", "meter"),
    "phase": ("rad", "meter"),
    "resonance": ("Hz", "meter"),
    "tuned with": ("F", "capacitor"),
    "drive": ("V", "voltmeter"),
    "sensed": ("V", "voltmeter"),
    "drive current": ("A", "ammeter"),
    "transfer inductance": ("H", "meter"),
    "transfer resistance": ("ohm", "meter"),
}
VALUE_UNITS: Mapping[str, str] = {name: unit for name, (unit, _) in _VALUES.items()}
INSTRUMENT_OF: Mapping[str, str] = {name: instrument for name, (_, instrument) in _VALUES.items()}
DEFAULT_INSTRUMENTS = tuple(dict.fromkeys(INSTRUMENT_OF.values()))
KICKS = ("kick on make", "kick on break")
HOOKUP = ("across", "tied", "sense")
NUMBERS = {"frequency": "Hz", "temperature": "degC", "level": ""}
TEXTS = ("range", "instrument", "status")
KNOWN = (*HOOKUP, *NUMBERS, *VALUE_UNITS, *KICKS, *TEXTS)

_TITLE = re.compile(r"\s*([^\[\]]*?)\s*(?:\[([^\[\]]*)\])?\s*")


@dataclass(frozen=True)
class Column:
    """One column in use.

    Attributes
    ----------
    index : int
        Position in a record.
    title : str
        As the header has it.
    name : str
        Of section 2.1 without the unit; "point NAME" for a state that was set.
    unit : Unit or None
        None for texts.
    assumed : bool
        Whether the header names no unit and that of the contract was taken.
    """

    index: int
    title: str
    name: str
    unit: Unit | None = None
    assumed: bool = False


def read_header(titles: Sequence[str], mapping: Mapping[str, str]) -> tuple[dict[str, Column], list[str]]:
    """Columns by name, and the titles that were passed over because a mapping is in force.

    Parameters
    ----------
    titles : sequence of str
    mapping : mapping
        Foreign title to one of ours (`--column`); where it is given, unknown titles are passed over.

    Raises
    ------
    RefusedInput
        Unknown or doubled column, unknown unit, a mapped title that is not there.
    """
    present = [" ".join(title.split()) for title in titles]
    for foreign in mapping:
        if foreign not in present:
            near = nearest(foreign, present)
            raise RefusedInput("a mapped column is not in the header", found=shown(foreign), expected=shown(near))
    columns: dict[str, Column] = {}
    passed_over: list[str] = []
    for index, title in enumerate(present):
        ours = mapping.get(title, title)
        if not title or ours.startswith("note"):
            continue
        try:
            column = _column(index, title, ours)
        except RefusedInput as error:
            if mapping and title not in mapping:
                passed_over.append(title)
                continue
            raise error.with_place(column=plain(title[:60])) from None
        twin = columns.setdefault(column.name, column)
        if twin is not column:
            both = f"{shown(twin.title)} and {shown(title)}"
            raise RefusedInput("a column stands twice", column=column.name, found=both, expected="one of them")
    return columns, passed_over


def _column(index: int, title: str, text: str) -> Column:
    match = _TITLE.fullmatch(text)
    name = match.group(1) if match else ""
    unit = (match.group(2) or "").strip() if match else ""
    if match is None or not name:
        raise RefusedInput("not the title of a column", found=shown(text), expected="a name, then [unit]")
    word, _, state = name.partition(" ")
    if word == "point":
        if not state or has_control(state):
            raise RefusedInput("a point needs a name", found=shown(text), expected="such as 'point gap [mm]'")
        return Column(index, title, name, unit_of(unit) if unit else None)
    if name not in KNOWN:
        raise RefusedInput("unknown column", found=shown(text), expected=shown(nearest(name, KNOWN)))
    base = VALUE_UNITS.get(name, NUMBERS.get(name))
    if base is None:
        if unit:
            raise RefusedInput("this column has no unit", found=shown(text), expected=shown(name))
        return Column(index, title, name)
    if unit:
        return Column(index, title, name, _unit(name, unit, base))
    usual = {"rad": "deg", "": "1"}.get(base, base)
    return Column(index, title, name, unit_of(usual), assumed=base not in ("1", ""))


def _unit(name: str, text: str, base: str) -> Unit:
    if base:
        return unit_of(text, base)
    found = unit_of(text)
    if found.base not in ("V", "A"):
        raise RefusedInput("a unit of another kind", found=shown(text), expected="V or A")
    return found


def need_readings(columns: Iterable[str]) -> None:
    """Refuse a header without any column in which a reading could stand.

    Raises
    ------
    RefusedInput
    """
    if not any(name in VALUE_UNITS or name in KICKS for name in columns):
        raise RefusedInput(
            "no column holds a reading",
            found=listed(columns) or "no known column",
            expected="one such as 'inductance [uH]'",
        )
