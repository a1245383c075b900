"""Nuisances held as if they had been read: losses, shares of losses, sizes that the data leave open."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from mutual.evidence import Hints, Prediction, Source
from mutual.unknowns import Unknowns

Real = NDArray[np.float64]

# A nuisance is held to this part of itself: no more is needed, and a stiff equation is slow to keep.
_WIDTH = 1e-3
_LEAST = 1e-9
# Room of an open inductance, in natural sizes.
_ROOM = 3.0


class Stated:
    """A nuisance held at given values as if it had been read, and no reading of anything else."""

    def __init__(self, values: Real, label: str) -> None:
        m = len(values)
        self.values: Real = values
        self.noise: Real = _WIDTH * np.maximum(np.abs(values), 1e-6)
        self.freedom: Real = np.full(m, np.inf)
        self.rounding: Real = np.zeros(m)
        self.sources: Sequence[Source] = ()
        self.labels: Sequence[str] = (label,) * m
        self.straight = np.zeros(m, dtype=bool)
        self.closed = False

    def predict(self, unknowns: Unknowns, theta: Real) -> Prediction:
        """The nuisance.

        Raises
        ------
        NotImplementedError
        """
        raise NotImplementedError

    def hints(self) -> Hints:
        """It has none.

        Raises
        ------
        NotImplementedError
        """
        raise NotImplementedError


class Waypoint(Stated):
    """A nuisance that leads along a valley of chi-square."""

    def placed(self, unknowns: Unknowns, theta: Real) -> Real:
        """Unknowns (P,) with the nuisance where it is to be.

        Raises
        ------
        NotImplementedError
        """
        raise NotImplementedError


class SizesAbout(Stated):
    """Inductances that the data leave open stay about where they are, so that no fit runs away along with them."""

    def __init__(self, positions: NDArray[np.int64], theta: Real, scale: Real) -> None:
        start = np.clip(theta[positions] / scale[positions], 1 / _ROOM, _ROOM)
        super().__init__(np.log(start), "size")
        self.noise = np.ones(len(positions))
        self._positions, self._scale = positions, scale[positions]

    def predict(self, unknowns: Unknowns, theta: Real) -> Prediction:
        """Logarithms of inductances in natural sizes."""
        size = np.maximum(theta[self._positions] / self._scale, _LEAST)
        jacobian = np.zeros((len(self._positions), unknowns.size))
        jacobian[np.arange(len(self._positions)), self._positions] = 1 / (size * self._scale)
        return Prediction(np.log(size), jacobian, np.zeros((len(self._positions), 0)))


class LossAt(Waypoint):
    """Evidence that windings have a given R/(omega L) at one frequency."""

    def __init__(self, where: Sequence[tuple[int, int]], ratio: float) -> None:
        super().__init__(np.full(len(where), ratio**2), "unread loss")
        self._where = where

    def placed(self, unknowns: Unknowns, theta: Real) -> Real:
        """Unknowns (P,) with the squared resistances where they are to be."""
        out = theta.copy()
        for (state, i), value in zip(self._where, self.values, strict=True):
            reactance = unknowns.omegas[state] * float(theta[unknowns.inductance(0, i, i)])
            out[unknowns.resistance(state, i, i)] = value * reactance**2
        return out

    def predict(self, unknowns: Unknowns, theta: Real) -> Prediction:
        """(R/(omega L))^2 of each winding."""
        jacobian = np.zeros((len(self._where), unknowns.size))
        values = np.zeros(len(self._where))
        for v, (state, i) in enumerate(self._where):
            r, own = unknowns.resistance(state, i, i), unknowns.inductance(0, i, i)
            size = float(theta[own]) or _LEAST * float(unknowns.scale[own])
            reactance = unknowns.omegas[state] * size
            values[v] = float(theta[r]) / reactance**2
            jacobian[v, [r, own]] = [1 / reactance**2, -2 * values[v] / size]
        return Prediction(values, jacobian, np.zeros((len(values), 0)))


class ReadLossAt(Waypoint):
    """Evidence that a winding whose resistance bears on what was read has a given R/(omega L) at one frequency."""

    def __init__(self, state: int, winding: int, ratio: float) -> None:
        super().__init__(np.array([ratio]), "loss")
        self._state, self._winding = state, winding

    def placed(self, unknowns: Unknowns, theta: Real) -> Real:
        """Unknowns (P,) with that resistance, mutual ones in proportion to its root."""
        out = theta.copy()
        r = unknowns.resistance(self._state, self._winding, self._winding)
        before = max(float(theta[r]), _LEAST * float(unknowns.scale[r]))
        out[r] = float(self.values[0]) * abs(self._reactance(unknowns, theta))
        for k in range(unknowns.windings):
            if k != self._winding:
                out[unknowns.resistance(self._state, self._winding, k)] *= np.sqrt(out[r] / before)
        return out

    def predict(self, unknowns: Unknowns, theta: Real) -> Prediction:
        """R/(omega L)."""
        jacobian = np.zeros((1, unknowns.size))
        r, own = unknowns.resistance(self._state, self._winding, self._winding), self._own(unknowns)
        value = float(theta[r]) / self._reactance(unknowns, theta)
        jacobian[0, [r, own]] = [1 / self._reactance(unknowns, theta), -value / float(theta[own])]
        return Prediction(np.array([value]), jacobian, np.zeros((1, 0)))

    def _own(self, unknowns: Unknowns) -> int:
        return unknowns.inductance(0, self._winding, self._winding)

    def _reactance(self, unknowns: Unknowns, theta: Real) -> float:
        return unknowns.omegas[self._state] * float(theta[self._own(unknowns)])


class SharedAt(Waypoint):
    """Evidence that windings share given losses: Rm/sqrt(R1 R2) of each (state, i, j)."""

    def __init__(self, where: Sequence[tuple[int, int, int]], parts: Real) -> None:
        super().__init__(parts, "shared loss")
        self.noise = np.full(len(parts), _WIDTH * max(float(np.max(np.abs(parts))), 1e-6))
        self._where = where

    def placed(self, unknowns: Unknowns, theta: Real) -> Real:
        """Unknowns (P,) with the mutual resistances put where they are to be."""
        out = theta.copy()
        for (state, i, j), part in zip(self._where, self.values, strict=True):
            own = [abs(float(theta[unknowns.resistance(state, k, k)])) for k in (i, j)]
            out[unknowns.resistance(state, i, j)] = part * np.sqrt(own[0] * own[1])
        return out

    def predict(self, unknowns: Unknowns, theta: Real) -> Prediction:
        """Rm/sqrt(R1 R2)."""
        jacobian, values = np.zeros((len(self._where), unknowns.size)), np.zeros(len(self._where))
        for v, (state, i, j) in enumerate(self._where):
            m, *own = (unknowns.resistance(state, *ij) for ij in ((i, j), (i, i), (j, j)))
            least = [_LEAST * float(unknowns.scale[p]) for p in own]
            r1, r2 = (max(float(theta[p]), small) for p, small in zip(own, least, strict=True))
            root = np.sqrt(r1 * r2)
            values[v] = float(theta[m]) / root
            jacobian[v, [m, *own]] = [1 / root, -values[v] / (2 * r1), -values[v] / (2 * r2)]
        return Prediction(values, jacobian, np.zeros((len(values), 0)))
