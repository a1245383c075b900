"""The readings that are repeats of one another, gathered, as the numbers that textbook formulas take."""

from __future__ import annotations

import cmath
import math
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

from mutual.device import Device
from mutual.methods.shapes import Shape, alone, induced, recognise
from mutual.recording.model import Row

Use = tuple[int, str]

# Columns of one row that give an impedance together: (omega, first, second) -> ohm.
FORMS: dict[tuple[str, str], Callable[[float, float, float], complex]] = {
    ("inductance", "resistance"): lambda w, x, r: complex(r, w * x),
    ("inductance", "quality"): lambda w, x, q: complex(w * x / q, w * x),
    ("inductance", "dissipation"): lambda w, x, d: complex(w * x * d, w * x),
    ("parallel inductance", "parallel resistance"): lambda w, x, r: 1 / complex(1 / r, -1 / (w * x)),
    ("parallel inductance", "quality"): lambda w, x, q: w * x / complex(1 / q, -1),
    ("parallel inductance", "dissipation"): lambda w, x, d: w * x / complex(d, -1),
    ("impedance", "phase"): lambda _, z, phase: cmath.rect(z, phase),
}


@dataclass(frozen=True)
class Term:
    """A number that a formula takes, as a function of the readings that it is made of.

    Attributes
    ----------
    uses : tuple of (int, str)
        The readings: position in the rows, column.
    of : callable
        Takes them (SI units) in that order; gives H as a float, or ohm as a complex number.
    """

    uses: tuple[Use, ...]
    of: Callable[[Sequence[float]], Any]


@dataclass
class State:
    """The readings at one frequency (Hz or None) and point, by what they must be repeats of."""

    frequency: float | None
    point: Mapping[str, Any]
    inductances: dict[Shape, list[Term]] = field(default_factory=dict)
    impedances: dict[Shape, list[Term]] = field(default_factory=dict)
    transfers: dict[frozenset[int], list[Term]] = field(default_factory=dict)

    def inductance(self, shape: Shape) -> Term | None:
        """Mean inductance (H) read of a shape."""
        return _mean(self.inductances.get(shape, ()))

    def impedance(self, shape: Shape) -> Term | None:
        """Mean impedance (ohm, complex) read of a shape."""
        return _mean(self.impedances.get(shape, ()))

    def transfer(self, i: int, j: int) -> Term | None:
        """Mean transfer inductance (H) between the first leads of two windings, whichever is driven."""
        return _mean(self.transfers.get(frozenset((i, j)), ()))

    def own(self, i: int, j: int) -> list[Term]:
        """The inductances of both windings alone (H) where both were read, else nothing."""
        terms = [self.inductance(alone(i)), self.inductance(alone(j))]
        return [t for t in terms if t is not None] if None not in terms else []


def gather(device: Device, rows: Sequence[Row]) -> list[State]:
    """File rows by frequency and point, in order of appearance; rows of no textbook shape are passed over."""
    states: dict[Any, State] = {}
    for position, row in enumerate(rows):
        if row.frequency == 0:  # no inductance shows at direct current
            continue
        key = (row.frequency, frozenset(row.point.items()))
        _file(states.setdefault(key, State(row.frequency, row.point)), device, row, position)
    return list(states.values())


def split(terms: Sequence[Term]) -> Callable[[Sequence[float]], list[Any]]:
    """Make a function that turns the readings of several terms, one after another, into the number of each."""

    def numbers(values: Sequence[float]) -> list[Any]:
        out, start = [], 0
        for term in terms:
            end = start + len(term.uses)
            out.append(term.of(values[start:end]))
            start = end
        return out

    return numbers


def _file(state: State, device: Device, row: Row, position: int) -> None:
    numbers = {name for name, value in row.values.items() if math.isfinite(value.value)}
    between = induced(device, row.hookup)
    if between is not None and "transfer inductance" in numbers:
        *pair, sign = between
        signed = Term(((position, "transfer inductance"),), lambda v: sign * v[0])
        state.transfers.setdefault(frozenset(pair), []).append(signed)
    shape = recognise(device, row.hookup)
    if shape is None:
        return
    columns = next((c for c in FORMS if numbers.issuperset(c)), None)
    if columns is not None and state.frequency is not None:
        _file_impedance(state, shape, position, columns, 2 * math.pi * state.frequency)
    if "inductance" in numbers:
        state.inductances.setdefault(shape, []).append(Term(((position, "inductance"),), lambda v: v[0]))


def _file_impedance(state: State, shape: Shape, position: int, columns: tuple[str, str], omega: float) -> None:
    form = FORMS[columns]
    uses = tuple((position, c) for c in columns)
    state.impedances.setdefault(shape, []).append(Term(uses, lambda v: form(omega, v[0], v[1])))
    if "inductance" not in columns:
        apparent = Term(uses, lambda v: form(omega, v[0], v[1]).imag / omega)
        state.inductances.setdefault(shape, []).append(apparent)


def _mean(terms: Sequence[Term]) -> Term | None:
    if not terms:
        return None
    numbers = split(terms)
    return Term(tuple(use for term in terms for use in term.uses), lambda v: sum(numbers(v)) / len(terms))
