"""Records of cells -> rows of readings, with a finding for every row that is left out."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from typing import Any

from mutual.errors import RefusedInput
from mutual.quoting import has_control, nearest, shown
from mutual.recording.cells import Unusable, is_empty, number_in, text_of
from mutual.recording.checks import refuse_nonsense
from mutual.recording.columns import DEFAULT_INSTRUMENTS, HOOKUP, KICKS, NUMBERS, VALUE_UNITS, Column
from mutual.recording.hookups import Hookups
from mutual.recording.leftout import EMPTY, LeftOut, Record
from mutual.recording.model import Accuracy, Row, Value
from mutual.units import Unit

# What was set and what was fed: without an answer of the device they say nothing.
_NO_ANSWER = ("tuned with", "drive", "drive current")
_MOST_FOUND = 160
_SIGNS = {"+": "+", "-": "-", "0": "0", "\u2212": "-", "\u2013": "-", "+0": "0", "-0": "0", "0.0": "0"}


class _NotUsable(Exception):
    """The row is left out; the rest of the file goes on."""

    def __init__(self, item: LeftOut) -> None:
        super().__init__(item.reason)
        self.item = item


class RowReader:
    """Rows of one recording.

    Parameters
    ----------
    hookups : Hookups
    columns : mapping of name to Column
    fixed : mapping of "across" and "tied" to text
        Hookup given on the command line; the file's own must agree with it.
    instruments : mapping of name to Accuracy
    """

    def __init__(
        self,
        hookups: Hookups,
        columns: Mapping[str, Column],
        fixed: Mapping[str, str],
        instruments: Mapping[str, Accuracy],
    ) -> None:
        self.hookups = hookups
        self.columns = columns
        self.fixed = fixed
        self.instruments = instruments
        self.left_out: list[LeftOut] = []
        self._numbers = [c for c in columns.values() if c.name in NUMBERS or c.name in VALUE_UNITS]
        self._readings = [c for c in columns.values() if c.name in VALUE_UNITS or c.name in KICKS]

    def read(self, record: Record) -> Row | None:
        """One row, or None if it is left out.

        Raises
        ------
        RefusedInput
            The row makes the whole file doubtful; row, line and column are named.
        """
        try:
            return self._read(record)
        except _NotUsable as reason:
            self.left_out.append(reason.item)
            return None
        except RefusedInput as error:
            placed = error.with_place(row=record.number, line=record.line)
            if error.column is not None and error.column in self.columns:
                placed.column = self.columns[error.column].title
            if placed.found is not None and len(placed.found) > _MOST_FOUND:  # a hookup of any number of ties
                placed.found = placed.found[:_MOST_FOUND] + "..."
            raise placed from None

    def _read(self, record: Record) -> Row:
        filled = [c for c in self._readings if not is_empty(record.cells[c.index])]
        if all(c.name in _NO_ANSWER for c in filled):
            raise _NotUsable(LeftOut(record, EMPTY, "no value is filled in"))
        reads_open = self._reads_open(record, filled)
        texts = {name: self._text(record, name) for name in HOOKUP}
        for name, text in self.fixed.items():
            if texts[name] and texts[name].split() != text.split():
                raise RefusedInput(
                    "the command line contradicts the file", column=name, found=shown(texts[name]), expected=shown(text)
                )
            texts[name] = text
        hookup = self.hookups.read(texts["across"], texts["tied"], texts["sense"], reads_open)
        status = self._text(record, "status")
        if status and not _is_zero(status):
            raise self._not_usable(record, "status", Unusable("left out", f"status {shown(status)} is not 0"))
        numbers = self._read_numbers(record, reads_open)
        frequency = numbers.pop("frequency", None)
        values = {name: numbers[name] for name in VALUE_UNITS if name in numbers}
        row = Row(
            number=record.number,
            line=record.line,
            hookup=hookup,
            frequency=None if frequency is None else frequency.value,
            values=values,
            kicks=self._read_kicks(record),
            instrument=self._instrument(record),
            conditions=self._conditions(record, numbers),
            point=self._read_point(record),
        )
        refuse_nonsense(row)
        return row

    def _text(self, record: Record, name: str) -> str:
        column = self.columns.get(name)
        return "" if column is None else text_of(record.cells[column.index])

    def _not_usable(self, record: Record, name: str, why: Unusable) -> _NotUsable:
        column = self.columns[name]
        return _NotUsable(LeftOut(record, why.code, why.text, column.title, shown(record.cells[column.index])))

    def _reads_open(self, record: Record, filled: Sequence[Column]) -> bool:
        if self._text(record, "resistance").lower() != "open":
            return False
        if len(filled) > 1:
            both = ", ".join(c.name for c in filled)
            raise RefusedInput("a reading of open leaves nothing else to read", column="resistance", found=both)
        return True

    def _read_numbers(self, record: Record, reads_open: bool) -> dict[str, Value]:
        numbers: dict[str, Value] = {}
        for column in self._numbers:
            cell = record.cells[column.index]
            if is_empty(cell):
                continue
            if reads_open and column.name == "resistance":
                numbers[column.name] = Value(math.inf)
                continue
            found = _number(cell, column.unit, column.name)
            if isinstance(found, Unusable):
                raise self._not_usable(record, column.name, found)
            numbers[column.name] = found
        return numbers

    def _read_kicks(self, record: Record) -> dict[str, str]:
        kicks: dict[str, str] = {}
        for name in KICKS:
            text = self._text(record, name)
            if text and text not in _SIGNS:
                raise self._not_usable(record, name, Unusable("left out", f"{shown(text)} is not +, - or 0"))
            if text:
                kicks[name] = _SIGNS[text]
        return kicks

    def _read_point(self, record: Record) -> dict[str, Any]:
        point: dict[str, Any] = {}
        for name, column in self.columns.items():
            if not name.startswith("point ") or is_empty(record.cells[column.index]):
                continue
            state = name.removeprefix("point ")
            if column.unit is None:
                text = text_of(record.cells[column.index])
                if has_control(text):
                    raise RefusedInput("control characters in a text", column=name, found=shown(text))
                point[state] = text
                continue
            found = _number(record.cells[column.index], column.unit, name)
            if isinstance(found, Unusable):
                raise self._not_usable(record, name, found)
            point[state] = found.value
        return point

    def _instrument(self, record: Record) -> str | None:
        name = self._text(record, "instrument")
        if name and name not in self.instruments and name not in DEFAULT_INSTRUMENTS:
            near = nearest(name, [*self.instruments, *DEFAULT_INSTRUMENTS])
            raise RefusedInput(
                "no accuracy table has the name of this instrument",
                column="instrument",
                found=shown(name),
                expected=f"a table of that name in the preface, or {shown(near)}",
            )
        return name or None

    def _conditions(self, record: Record, numbers: Mapping[str, Value]) -> dict[str, Any]:
        conditions: dict[str, Any] = {name: numbers[name].value for name in ("temperature", "level") if name in numbers}
        level = self.columns.get("level")
        if "level" in conditions and level is not None and level.unit is not None and level.unit.base != "1":
            conditions["level unit"] = level.unit.base
        text = self._text(record, "range")
        if has_control(text):
            raise RefusedInput("control characters in a text", column="range", found=shown(text))
        return {**conditions, "range": text} if text else conditions


def _number(cell: Any, unit: Unit | None, name: str) -> Value | Unusable:
    assert unit is not None  # every column of numbers has one
    try:
        return number_in(cell, unit)
    except RefusedInput as error:
        raise error.with_place(column=name) from None


def _is_zero(status: str) -> bool:
    try:
        return float(status) == 0.0
    except ValueError:
        return False
