"""Stated accuracies as named sources of error (interface contract, section 2.1)."""

from __future__ import annotations

from collections.abc import Hashable, Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from functools import cached_property
from math import inf, sqrt
from typing import Any

import numpy as np
from numpy.typing import NDArray

from mutual.evidence import Source
from mutual.recording.model import Accuracy

Real = NDArray[np.float64]
Complex = NDArray[np.complex128]
Ints = NDArray[np.int64]

GAIN, PHASE, REACTANCE, RESISTANCE, CONDUCTANCE, SUSCEPTANCE, SHOWN, GAIN_REACTIVE, GAIN_RESISTIVE = range(9)


def standard(limit: float, stated_as: str) -> tuple[float, bool]:
    """Standard deviation of a stated number, and whether it is rectangular (GUM 4.3.7 for limits)."""
    if stated_as == "limit":
        return limit / sqrt(3), True
    return (limit / 2 if stated_as == "expanded" else limit), False


@dataclass
class Effects:
    """Table of which source acts on which value, and how strongly.

    Each line: value number, source number, way of acting, one standard deviation.
    """

    sources: list[Source] = field(default_factory=list)
    _number: dict[tuple[str, ...], int] = field(default_factory=dict)
    lines: list[tuple[int, int, int, float]] = field(default_factory=list)

    def add(
        self,
        value: int,
        key: Iterable[Hashable],
        label: str,
        way: int,
        size: float,
        rectangular: bool,
        freedom: float = inf,
    ) -> None:
        """Let the source `key` act on a value with (signed) standard deviation `size`."""
        name = tuple(str(k) for k in key)
        if name not in self._number:
            self._number[name] = len(self.sources)
            self.sources.append(Source(name, label, rectangular, freedom))
        if size != 0:
            self.lines.append((value, self._number[name], way, size))

    @cached_property
    def _table(self) -> tuple[Ints, Ints, Ints, Real]:
        """Columns of `lines` as arrays."""
        lines = np.array(self.lines, dtype=float).reshape(-1, 4)
        value, source, way = (lines[:, k].astype(np.int64) for k in (0, 1, 2))
        return value, source, way, lines[:, 3]

    def matrix(self, z: Complex, omega: Real, by_re: Real, by_im: Real, low_q: Sequence[str | None]) -> Real:
        """Effects (m, s) at the predicted impedances; no line may be added afterwards.

        Parameters
        ----------
        z : (m,) complex
            Predicted impedance behind each value.
        omega : (m,) float
        by_re, by_im : (m,) float
            Derivatives of each value by the parts of its impedance.
        low_q : sequence of m
            Factor of the data sheet for low Q, or None.
        """
        out = np.zeros((len(z), len(self.sources)))
        value, source, way, size = self._table
        change = z[value].astype(complex)
        for which in np.unique(way):
            here = way == which
            if which != GAIN:
                change[here] = _change(int(which), z[value[here]], omega[value[here]], [low_q[v] for v in value[here]])
        effect = by_re[value] * change.real + by_im[value] * change.imag
        out[value, source] += size * np.where(way == SHOWN, 1.0, effect)
        return out


def _change(way: int, z: Complex, omega: Real, low_q: Sequence[str | None]) -> Any:
    """Change of an impedance by one unit of an error that acts in one way."""
    if way == PHASE:
        return 1j * z
    if way == REACTANCE:
        return 1j * omega
    if way == RESISTANCE:
        return np.ones_like(omega)
    if way in (CONDUCTANCE, SUSCEPTANCE):
        return -(z**2) * (1.0 if way == CONDUCTANCE else 1j)
    if way == GAIN_REACTIVE:
        factor = [_low_q(f, abs(x.imag), abs(x.real)) for f, x in zip(low_q, z, strict=True)]
        return 1j * z.imag * np.array(factor)
    if way == GAIN_RESISTIVE:
        factor = [_low_q(f, abs(x.real), abs(x.imag)) for f, x in zip(low_q, z, strict=True)]
        return z.real * np.array(factor)
    return np.zeros_like(omega)


def _low_q(factor: str | None, wanted: float, other: float) -> float:
    """The factor for a part of Z of size `wanted` beside a part of size `other` (Q = wanted/other)."""
    if factor is None:
        return 1.0
    ratio = other / max(wanted, 1e-300)
    return 1 + ratio if factor == "1 + 1/Q" else sqrt(1 + ratio**2)


@dataclass(frozen=True)
class Choice:
    """One extreme of what the data sheets leave open.

    Attributes
    ----------
    common : mapping of (instrument, "gain" | "phase") to bool
        Whether an error of unknown split is all common (else all each).
    between_frequencies : mapping of instrument to bool
        Whether its common errors are the same at all frequencies (else independent).
    """

    common: Mapping[tuple[str, str], bool] = field(default_factory=dict)
    between_frequencies: Mapping[str, bool] = field(default_factory=dict)


def add_impedance_errors(
    effects: Effects, value: int, accuracy: Accuracy, choice: Choice, frequency: float | None, hookup: Hashable
) -> None:
    """Enter what an instrument's table says of a value derived from one impedance."""
    a = accuracy
    across = choice.between_frequencies.get(a.name, False) and frequency != 0
    common_key = ("all frequencies",) if across else (frequency,)
    for part in ("gain", "phase"):
        stated = _stated(a, part)
        unsplit = "gain" if part == "phase" and _follows_gain(a) else part
        for kind in ("common", "each", "unknown"):
            limit = stated[kind]
            if limit is None or (part == "phase" and frequency == 0):
                continue
            shared = choice.common.get((a.name, unsplit), True) if kind == "unknown" else kind == "common"
            label = f"{a.name} {part}, {'split unknown' if kind == 'unknown' else kind}"
            key = (a.name, part, kind, *(common_key if shared else (frequency, hookup)))
            size, rectangular = standard(limit, a.stated_as)
            for way, suffix in _ways(a, part):
                effects.add(value, (*key, suffix), label, way, size, rectangular)
    for unit, way in (("H", REACTANCE), ("ohm", RESISTANCE)):
        if unit in a.floor and not (unit == "H" and frequency == 0):
            size, rectangular = standard(a.floor[unit], a.stated_as)
            effects.add(value, (a.name, "floor", unit), f"{a.name} floor ({unit})", way, size, rectangular)
    if a.shunt_floor is not None:
        size, rectangular = standard(a.shunt_floor, a.stated_as)
        for way in (CONDUCTANCE, SUSCEPTANCE):
            if not (way == SUSCEPTANCE and frequency == 0):
                key = (a.name, "shunt floor", str(way), *common_key)
                effects.add(value, key, f"{a.name} shunt floor", way, size, rectangular)


def _follows_gain(a: Accuracy) -> bool:
    return a.phase is None and a.phase_common is None and a.phase_each is None


def _stated(a: Accuracy, part: str) -> dict[str, float | None]:
    """Without keys for the phase, p has the size of g; with a factor for low Q it is not added."""
    if part == "phase" and a.low_q_factor is not None:
        return {"common": None, "each": None, "unknown": None}
    if part == "phase" and not _follows_gain(a):
        return {"common": a.phase_common, "each": a.phase_each, "unknown": a.phase}
    return {"common": a.gain_common, "each": a.gain_each, "unknown": a.gain}


def _ways(a: Accuracy, part: str) -> tuple[tuple[int, str], ...]:
    if part == "phase":
        return ((PHASE, ""),)
    if a.low_q_factor is None:
        return ((GAIN, ""),)
    return ((GAIN_REACTIVE, "reactive"), (GAIN_RESISTIVE, "resistive"))
