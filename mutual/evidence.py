"""The one contract between methods and engine: values, noise, effects of named shared sources, predict.

Covariance is never typed in. Every value has noise of its own and a sensitivity to named
sources that it may share with others (a meter's gain at one frequency, a fixture's residual):
V = diag(noise^2) + S S'. Sources of one key in several pieces of evidence are one source.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from math import inf
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from mutual.circuit import Compiled
from mutual.unknowns import Unknowns

Real = NDArray[np.float64]

# Values that depend on shared sources alone would make V singular: each keeps this part of its own spread as noise.
OWN_PART = 1e-6
# Numbers with no error stated at all are taken for as good as nine digits.
NUMBER = 1e-9


@dataclass(frozen=True)
class Source:
    """A named source of error.

    Attributes
    ----------
    key : tuple of str
        What makes it the same source in two pieces of evidence.
    label : str
        Name in the uncertainty budget; several keys may share one.
    rectangular : bool
        Whether it was stated as a limit (GUM 4.3.7) and not as a standard deviation.
    freedom : float
        Degrees of freedom behind its standard deviation (GUM G.4).
    """

    key: tuple[str, ...]
    label: str
    rectangular: bool
    freedom: float = inf


@dataclass(frozen=True)
class Prediction:
    """What a piece of evidence should show.

    Attributes
    ----------
    values : (m,) float
    jacobian : (m, P) float
        Derivatives by the unknowns.
    effects : (m, s) float
        Change of the values by one standard deviation of each source, at the predicted value.
    """

    values: Real
    jacobian: Real
    effects: Real


@dataclass(frozen=True)
class Hints:
    """Rough impedances of U cases, from which the starting values are made.

    Attributes
    ----------
    compiled : Compiled
    index, group, state : (U,) int
        Hookup, set of inductances and set of resistances of each case.
    omega : (U,) float, rad/s
    resistance, inductance : (U,) float
        Rough values, ohm and H; nan where nothing was read.
    shows_loss : (U,) bool
        Whether a resistance shows to first order in what was read.
    """

    compiled: Compiled
    index: NDArray[np.int64]
    group: NDArray[np.int64]
    state: NDArray[np.int64]
    omega: Real
    resistance: Real
    inductance: Real
    shows_loss: NDArray[np.bool_]


class Evidence(Protocol):
    """Numbers that a circuit must explain, in whatever unit they were read."""

    @property
    def values(self) -> Real:
        """(m,) what was read."""

    @property
    def noise(self) -> Real:
        """(m,) standard deviation of each value's own noise."""

    @property
    def freedom(self) -> Real:
        """(m,) degrees of freedom behind `noise`."""

    @property
    def rounding(self) -> Real:
        """(m,) standard deviation of each value's own rectangular error, such as the display step."""

    @property
    def sources(self) -> Sequence[Source]:
        """The s named sources, in the order of the columns of `effects`."""

    @property
    def labels(self) -> Sequence[str]:
        """(m,) name of each value's own noise in the budget."""

    @property
    def straight(self) -> NDArray[np.bool_]:
        """(m,) which predictions are linear in the unknowns."""

    @property
    def closed(self) -> bool:
        """Whether a hookup in it has a closed loop (a short, a parallel)."""

    def predict(self, unknowns: Unknowns, theta: Real) -> Prediction:
        """Predict all values for a vector of unknowns."""

    def hints(self) -> Hints:
        """Rough impedances for the starting values."""


class Body:
    """All evidence taken together.

    Parameters
    ----------
    pieces : sequence of Evidence
    """

    def __init__(self, pieces: Sequence[Evidence]) -> None:
        self.pieces = tuple(pieces)
        self.values: Real = _joined([p.values for p in pieces])
        self.noise: Real = _joined([p.noise for p in pieces])
        self.freedom: Real = _joined([p.freedom for p in pieces])
        self.rounding: Real = _joined([p.rounding for p in pieces])
        self.straight: NDArray[np.bool_] = np.concatenate([p.straight for p in pieces]) if pieces else np.ones(0, bool)
        self.linear = bool(self.straight.all())
        self.closed = any(p.closed for p in pieces)
        self.labels: tuple[str, ...] = tuple(label for p in pieces for label in p.labels)
        keys: dict[tuple[str, ...], int] = {}
        sources: list[Source] = []
        self._columns: list[NDArray[np.int64]] = []
        for piece in pieces:
            for source in piece.sources:
                if source.key not in keys:
                    keys[source.key] = len(sources)
                    sources.append(source)
            self._columns.append(np.array([keys[s.key] for s in piece.sources], dtype=np.int64))
        self.sources = tuple(sources)

    def predict(self, unknowns: Unknowns, theta: Real) -> Prediction:
        """Predictions of all pieces, sources of one key in one column."""
        parts = [piece.predict(unknowns, theta) for piece in self.pieces]
        total = len(self.values)
        effects = np.zeros((total, len(self.sources)))
        row = 0
        for part, columns in zip(parts, self._columns, strict=True):
            effects[row : row + len(part.values), columns] = part.effects
            row += len(part.values)
        jacobian = np.concatenate([p.jacobian for p in parts]) if parts else np.zeros((0, unknowns.size))
        return Prediction(_joined([p.values for p in parts]), jacobian, effects)

    def own_variance(self, prediction: Prediction) -> Real:
        """(m,) variance of what each value shares with no other."""
        own = self.noise**2 + self.rounding**2
        spread = own + np.sum(prediction.effects**2, axis=1)
        size = np.maximum(np.abs(prediction.values), np.abs(self.values))
        floor = np.where(spread > 0, OWN_PART**2 * spread, (NUMBER * size) ** 2)
        return np.asarray(np.maximum(own, np.maximum(floor, 1e-300)))

    def whitener(self, prediction: Prediction) -> Real:
        """Lower Cholesky factor (m, m) of V at the predicted values."""
        v = prediction.effects @ prediction.effects.T
        v[np.diag_indices_from(v)] += self.own_variance(prediction)
        try:
            return np.asarray(np.linalg.cholesky(v), dtype=float)
        except np.linalg.LinAlgError:
            # Far from any answer effects may differ by more than double precision holds.
            v[np.diag_indices_from(v)] *= 1 + 1e-9
            return np.asarray(np.linalg.cholesky(v), dtype=float)


def _joined(parts: Sequence[Real]) -> Real:
    return np.concatenate(parts) if parts else np.zeros(0)
