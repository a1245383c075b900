"""Slips that happen at a bench: what a row of readings may really have been.

Which slips are likely is common practice, no source. Each one says how rare it is, and how it explains what was
typed where the circuit does not: both count beside chi-square, as -2 ln of a probability.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from math import log

from mutual.device import Device
from mutual.methods.rewired import Rewiring, Shows
from mutual.methods.shown import SHOWN
from mutual.recording.model import Row, Value

_PREFIXES = {1e3: "a thousand times too small", 1e6: "a million times too small"}
_PREFIXES |= {1e-3: "a thousand times too large", 1e-6: "a million times too large"}
_POINTS = {10.0: "ten times too small", 0.1: "ten times too large"}
_PARALLEL = {
    "inductance": "parallel inductance",
    "resistance": "parallel resistance",
    "parallel inductance": "inductance",
    "parallel resistance": "resistance",
}
# A number typed by an unknown slip may be anything within six decades: the width of its prior, beside its size.
_DECADES = 6 * log(10)
# Numbers without digits are compared to this part of themselves.
_DIGIT = 1e-6


@dataclass(frozen=True)
class Moved:
    """Rows (by position) at which windings stood differently; which winding moved, or None for any of them."""

    rows: frozenset[int]
    winding: int | None = None


@dataclass(frozen=True)
class Alternative:
    """One slip.

    Attributes
    ----------
    text : str
        The slip in words, as a clause.
    position : int
        The row that it is about.
    rows : tuple of (position, Row or None)
        Rows by their position among all, as they should have been; None takes the row out.
    rarity : float
        -2 ln of its odds beside the commonest slips.
    typed : float
        -2 ln of the probability density of what was typed, as far as the readings if mended do not say it.
    moved : Moved or None
        Where windings stood differently; `rows` then says what is left to answer from.
    """

    text: str
    position: int
    rows: tuple[tuple[int, Row | None], ...]
    rarity: float = 0.0
    typed: float = 0.0
    moved: Moved | None = None


class Slips:
    """The likely slips of a set of rows.

    Parameters
    ----------
    device : Device
    rows : sequence of Row
    names : sequence of str
        How texts name each row.
    """

    def __init__(self, device: Device, rows: Sequence[Row], names: Sequence[str]) -> None:
        self.device, self.rows, self.names = device, list(rows), list(names)
        self._rewiring = Rewiring(device)

    def of_row(self, position: int) -> Iterator[Alternative]:
        """All likely slips of one row that say what the row should have been."""
        row = self.rows[position]
        for other in self._rewiring.others(row.hookup, _shows(row)):
            text = f"{other.text}: it was {other.hookup}"
            yield Alternative(text, position, ((position, replace(row, hookup=other.hookup)),))
        for name in columns(row):
            factors = _POINTS if SHOWN[name].unit in ("1", "rad") else {**_PREFIXES, **_POINTS}
            for factor, words in factors.items():
                why = "the decimal point" if factor in _POINTS else "a wrong prefix"
                text = f"the {name} was written {words} ({why})"
                typed = 2 * log(factor) * (1 if SHOWN[name].reciprocal else -1)
                rarity = 0.0 if factor in (1e3, 1e-3) else 4.0
                yield Alternative(text, position, ((position, _scaled(row, name, factor)),), rarity, typed)
        if _turns(row):
            text = f"the meter showed the {_other_equivalent(row)} equivalent"
            yield Alternative(text, position, ((position, _turned(row)),), 1.0, _typed_otherwise(row))

    def everywhere(self) -> Iterator[Alternative]:
        """Slips made in every row."""
        turning = [k for k, row in enumerate(self.rows) if row.frequency and set(columns(row)) & set(_PARALLEL)]
        if not any(_turns(self.rows[k]) for k in turning):
            return
        kinds = {_other_equivalent(self.rows[k]) for k in turning}
        if len(turning) > 1 and len(kinds) == 1:
            rows = tuple((k, _turned(self.rows[k])) for k in turning)
            typed = sum(_typed_otherwise(self.rows[k]) for k in turning)
            text = f"in every row the meter showed the {kinds.pop()} equivalent"
            yield Alternative(text, turning[0], rows, 1.0, typed)

    def twice(self, position: int) -> Iterator[Alternative]:
        """Values that stand in another row too: typed twice, so this row tells nothing of them."""
        row = self.rows[position]
        done = set()
        for k, other in enumerate(self.rows):
            same = tuple(n for n in columns(row) if n in other.values and row.values[n].value == other.values[n].value)
            if k == position or not same or same in done or self.alike(row, other):
                continue
            done.add(same)
            all_of_it = len(same) == len(columns(row)) > 1
            what = "its values are those" if all_of_it else f"its {' and '.join(same)} is that"
            rest = {name: value for name, value in row.values.items() if name not in same}
            left = replace(row, values=rest) if any(name in SHOWN for name in rest) else None
            typed = sum(2 * log(_digit(row.values[n])) - _reciprocal(n, row.values[n]) for n in same)
            text = f"{what} of {self.names[k]}, typed twice"
            yield Alternative(text, position, ((position, left),), 3.0, typed)

    def exchanged(self, first: int, second: int) -> Alternative | None:
        """The values of two rows exchanged; None where that says nothing."""
        a, b = self.rows[first], self.rows[second]
        if set(a.values) != set(b.values) or a.values == b.values or self.alike(a, b):
            return None
        text = f"its values and those of {self.names[second]} were exchanged"
        rows = ((first, replace(a, values=b.values)), (second, replace(b, values=a.values)))
        return Alternative(text, first, rows, 4.0)

    def moved_at(self, position: int) -> Alternative:
        """The windings stood differently at one reading."""
        text = "the windings stood differently at this reading (a coil moved), or it was misread"
        return Alternative(text, position, ((position, None),), 1.0, moved=Moved(frozenset([position])))

    def moved_from(self, position: int, winding: int, shows: Sequence[bool]) -> Alternative:
        """A winding stood differently from one reading on; `shows` says on which rows its place bears."""
        rows = [k for k in range(position, len(self.rows)) if shows[k]]
        who = "the windings" if len(self.device.windings) == 2 else self.device.windings[winding].name
        text = f"{who} stood differently from this reading on (a coil moved)"
        gone = tuple((k, None) for k in rows)
        return Alternative(text, position, gone, 2.0, moved=Moved(frozenset(rows), winding))

    def unknown(self, position: int) -> Alternative:
        """A slip that the program does not know."""
        row = self.rows[position]
        text = "this reading alone contradicts the others; none of the usual slips explains it"
        typed = 0.0
        for name in columns(row):
            size = max(abs(row.values[name].value), 1e-300)
            typed += 2 * log(_DECADES * size) - _reciprocal(name, row.values[name])
        return Alternative(text, position, ((position, None),), 10.0, typed)

    def alike(self, a: Row, b: Row) -> bool:
        """Whether two rows must show the same."""
        if (a.frequency, dict(a.point)) != (b.frequency, dict(b.point)):
            return False
        one, two = (self._rewiring.signature(row.hookup, _shows(row)) for row in (a, b))
        return one == two and _shows(a) == _shows(b)


def columns(row: Row) -> list[str]:
    """Columns that are functions of an impedance."""
    return [name for name in row.values if name in SHOWN]


def _shows(row: Row) -> Shows:
    kinds = {SHOWN[name].transfer for name in columns(row)}
    return Shows(False in kinds, True in kinds)


def _scaled(row: Row, name: str, factor: float) -> Row:
    value = row.values[name]
    step = None if value.step is None else value.step * factor
    return replace(row, values={**row.values, name: Value(value.value * factor, step)})


def _turns(row: Row) -> bool:
    """Whether series and parallel equivalent differ in what was read."""
    return bool(row.frequency) and any(name in _PARALLEL for name in columns(row)) and len(columns(row)) > 1


def _other_equivalent(row: Row) -> str:
    return "parallel" if any(name in ("inductance", "resistance") for name in columns(row)) else "series"


def _turned(row: Row) -> Row:
    return replace(row, values={_PARALLEL.get(name, name): value for name, value in row.values.items()})


def _typed_otherwise(row: Row) -> float:
    """Change of -2 ln of the density when a value is compared as its reciprocal, or no longer."""
    new = _turned(row)
    return sum(_reciprocal(n, v) for n, v in new.values.items()) - sum(_reciprocal(n, v) for n, v in row.values.items())


def _reciprocal(name: str, value: Value) -> float:
    """-2 ln of the derivative of what is compared by what was typed."""
    return 4 * log(max(abs(value.value), 1e-300)) if name in SHOWN and SHOWN[name].reciprocal else 0.0


def _digit(value: Value) -> float:
    return max(value.step or 0.0, _DIGIT * abs(value.value), 1e-300)
