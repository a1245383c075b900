"""Noise and display step of each reading: as stated, or from repeats (type A evaluation, GUM 4.2)."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence
from dataclasses import dataclass, field
from math import inf

import numpy as np
from numpy.typing import NDArray

from mutual.methods.shown import SHOWN
from mutual.recording.model import Accuracy

Real = NDArray[np.float64]
Key = tuple[str, tuple[str, ...]]


@dataclass(frozen=True)
class Together:
    """Values of one row whose noise is correlated, as found from repeats.

    Attributes
    ----------
    values : tuple of int
        Their numbers, c of them.
    factor : (c, c) float
        Lower factor of their covariance.
    freedom : float
        Degrees of freedom behind it.
    """

    values: tuple[int, ...]
    factor: Real
    freedom: float


@dataclass(frozen=True)
class Scatter:
    """Arrays of m, one for each value, in the unit in which it is compared.

    Attributes
    ----------
    compared : (m,) float
        Values, the reciprocal where that is compared.
    noise, step : (m,) float
        Standard deviation of one reading, and display step.
    freedom : (m,) float
        Degrees of freedom of the noise; infinite where it was stated.
    frozen : (m,) bool
        Whether noise is less than half a step, so that repeats share their rounding.
    group : (m,) int
        Number of the group of repeats.
    together : list of Together
    """

    compared: Real
    noise: Real
    step: Real
    freedom: Real
    frozen: NDArray[np.bool_]
    group: NDArray[np.int64]
    together: list[Together] = field(default_factory=list)


@dataclass(frozen=True)
class Shown:
    """One value as shown: number of its row, column, reading, display step, instrument, number of its case."""

    row: int
    column: str
    value: float
    step: float
    accuracy: Accuracy
    case: int


def scatter_of(shown: Sequence[Shown]) -> Scatter:
    """Noise and step of each value, stated or seen in repeats."""
    m = len(shown)
    raw = np.array([s.value for s in shown])
    units = [SHOWN[s.column].unit for s in shown]
    reciprocal = np.array([SHOWN[s.column].reciprocal for s in shown], dtype=bool)
    step = np.array([s.accuracy.resolution.get(u, s.step) for s, u in zip(shown, units, strict=True)])
    noise = np.array([s.accuracy.noise.get(u, 0.0) for s, u in zip(shown, units, strict=True)])
    numbers: dict[tuple[str, str, int], int] = {}
    group = np.array([numbers.setdefault((s.accuracy.name, s.column, s.case), len(numbers)) for s in shown], dtype=int)
    size = np.where(reciprocal, np.maximum(raw**2, 1e-300), 1.0)
    freedom = np.full(m, inf)
    together = []
    mean = np.array([raw[group == g].mean() for g in range(len(numbers))])[group] if m else raw
    for values, relative, degrees in _from_repeats(shown):
        # At the mean of the repeats, not at each reading: that would weigh the small ones more (Peelle's puzzle).
        scale = _relative_to(shown, values, mean) / size[list(values)]
        covariance = relative * scale[:, None] * scale[None, :]
        noise[list(values)] = np.sqrt(np.diag(covariance)) * size[list(values)]
        freedom[list(values)] = degrees
        if len(values) > 1 and degrees >= len(values):
            sure = covariance + np.diag(1e-12 * np.diag(covariance) + 1e-300)
            factor: Real = np.asarray(np.linalg.cholesky(sure), dtype=float)
            together.append(Together(values, factor, degrees))
    frozen = noise < step / 2
    for number in range(len(numbers)):
        members = group == number
        frozen[members] &= bool(np.ptp(raw[members]) < step[members].max())
    compared = np.where(reciprocal, 1 / np.where(raw == 0, 1e-300, raw), raw)
    return Scatter(compared, noise / size, step / size, freedom, frozen, group.astype(np.int64), together)


def _relative_to(shown: Sequence[Shown], values: Sequence[int], mean: Real) -> Real:
    """What scatter is relative to: the mean for inductances and resistances, 1 for what may be near zero."""
    plain = [SHOWN[shown[v].column].unit in ("H", "ohm") and not SHOWN[shown[v].column].transfer for v in values]
    return np.array([abs(mean[v]) if p else 1.0 for v, p in zip(values, plain, strict=True)])


def _from_repeats(shown: Sequence[Shown]) -> list[tuple[tuple[int, ...], Real, float]]:
    """Rows whose noise was not stated, with the pooled (relative) covariance of their columns.

    Columns read together in one row are correlated, often nearly fully (GUM H.2): the covariance
    is pooled over all repeats of one instrument that read the same columns.
    """
    rows: dict[int, list[int]] = defaultdict(list)
    for v, s in enumerate(shown):
        if SHOWN[s.column].unit not in s.accuracy.noise:
            rows[s.row].append(v)
    repeats: dict[tuple[Key, tuple[int, ...]], list[list[int]]] = defaultdict(list)
    for members in rows.values():
        first = shown[members[0]]
        key = (first.accuracy.name, tuple(shown[v].column for v in members))
        repeats[key, tuple(shown[v].case for v in members)].append(members)
    squares: dict[Key, Real] = {}
    degrees: dict[Key, int] = defaultdict(int)
    for (key, _), group in repeats.items():
        if len(group) < 2:
            continue
        values = np.array([[shown[v].value for v in members] for members in group])
        mean = np.zeros(len(shown))
        mean[list(group[0])] = values.mean(axis=0)
        scale = np.maximum(_relative_to(shown, group[0], mean), 1e-300)
        deviation = (values - values.mean(axis=0)) / scale
        squares[key] = squares.get(key, np.zeros((len(key[1]),) * 2)) + deviation.T @ deviation
        degrees[key] += len(group) - 1
    found = []
    for (key, _), group in repeats.items():
        if key in squares:
            for members in group:
                found.append((tuple(members), squares[key] / degrees[key], float(degrees[key])))
    return found
