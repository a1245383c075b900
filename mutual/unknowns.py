"""The vector of unknowns and the matrices it stands for.

One block of n(n+1)/2 entries for each set of inductances (one set where constants fit all
frequencies and points, one for each otherwise), then one for the resistances of each frequency.

A winding whose resistance nothing was read of at a frequency still loads whatever is shorted
through it, but only by its square; its unknown is therefore R^2: there the inductances depend on
it linearly down to R = 0, where the derivative by R itself would vanish and hide it.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

Real = NDArray[np.float64]
Ints = NDArray[np.int64]

# Squared resistances are evaluated from this fraction of omega L upward, and straight on below it.
LEAST_LOSS = 1e-4


@dataclass(frozen=True)
class Matrices:
    """Values of the unknowns as matrices.

    Attributes
    ----------
    inductance : (G, n, n) float, H
    resistance : (F, n, n) float, ohm
    beyond : (P,) float
        How far unknowns lie below the point at which the matrices were formed: predictions go on
        straight from there.
    chain : (P,) float
        Derivative of the matrix entry by its unknown: 1, or 1/(2R) for squared resistances.
    """

    inductance: Real
    resistance: Real
    beyond: Real
    chain: Real


@dataclass(frozen=True)
class Unknowns:
    """Layout of the vector of unknowns.

    Attributes
    ----------
    windings : int
    groups : int
        Sets of inductances.
    omegas : tuple of float
        Angular frequency of each set of resistances, rad/s.
    read : tuple of tuple of bool
        For each frequency and winding: whether something was read that shows its resistance. Where not,
        the unknown is R^2 and no loss is shared.
    scale : (P,) float
        Natural size of each unknown.
    """

    windings: int
    groups: int
    omegas: tuple[float, ...]
    read: tuple[tuple[bool, ...], ...]
    scale: Real

    @cached_property
    def first(self) -> Ints:
        """(T,) rows of the upper triangle."""
        return np.triu_indices(self.windings)[0].astype(np.int64)

    @cached_property
    def second(self) -> Ints:
        """(T,) columns of the upper triangle."""
        return np.triu_indices(self.windings)[1].astype(np.int64)

    @property
    def entries(self) -> int:
        """T, the number of entries of one symmetric matrix."""
        return self.windings * (self.windings + 1) // 2

    @property
    def size(self) -> int:
        """P, the number of unknowns."""
        return self.entries * (self.groups + len(self.omegas))

    @cached_property
    def _entry(self) -> dict[tuple[int, int], int]:
        pairs = {}
        for t, (i, j) in enumerate(zip(self.first, self.second, strict=True)):
            pairs[int(i), int(j)] = pairs[int(j), int(i)] = t
        return pairs

    def inductance(self, group: int, i: int, j: int) -> int:
        """Position of L_ij of a set of inductances."""
        return group * self.entries + self._entry[i, j]

    def resistance(self, state: int, i: int, j: int) -> int:
        """Position of R_ij of a frequency."""
        return (self.groups + state) * self.entries + self._entry[i, j]

    @cached_property
    def squared(self) -> NDArray[np.bool_]:
        """(P,) which unknowns are squared resistances."""
        mask = np.zeros(self.size, dtype=bool)
        for f in range(len(self.omegas)):
            for i in range(self.windings):
                mask[self.resistance(f, i, i)] = not self.read[f][i]
        return mask

    @cached_property
    def fixed(self) -> NDArray[np.bool_]:
        """(P,) which unknowns are nil by rule: shared loss at direct current, and where no resistance was read."""
        mask = np.zeros(self.size, dtype=bool)
        for f, omega in enumerate(self.omegas):
            for i in range(self.windings):
                for j in range(i + 1, self.windings):
                    mask[self.resistance(f, i, j)] = omega == 0 or not (self.read[f][i] and self.read[f][j])
        return mask

    def symmetric(self, entries: Real) -> Real:
        """Matrices (..., n, n) of triangles (..., T)."""
        out = np.zeros((*entries.shape[:-1], self.windings, self.windings))
        out[..., self.first, self.second] = entries
        out[..., self.second, self.first] = entries
        return out

    def matrices(self, theta: Real) -> Matrices:
        """Form the matrices of a vector of unknowns, shape (P,)."""
        least = (LEAST_LOSS**2) * self.scale
        used = np.where(self.squared, np.maximum(theta, least), theta)
        root = np.sqrt(np.where(self.squared, used, 1.0))
        values = np.where(self.squared, root, used).reshape(-1, self.entries)
        return Matrices(
            inductance=self.symmetric(values[: self.groups]),
            resistance=self.symmetric(values[self.groups :]),
            beyond=theta - used,
            chain=np.where(self.squared, 0.5 / root, 1.0),
        )
