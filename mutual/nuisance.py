"""What the data leave open of the losses, and how the bounds enclose it.

Two nuisances: losses that two windings share (mutual resistance Rm), bounded by the
resistances where the data do not determine it; and the resistance of a winding of which nothing
was read, which may be anything from zero upward. The value reported has the least of either; the
bounds are the union over the extremes.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from mutual.engine import Fit, Problem
from mutual.evidence import Body, Evidence, Hints, Prediction, Source
from mutual.physics import Region
from mutual.posterior import Posterior
from mutual.unknowns import Unknowns

Real = NDArray[np.float64]

# A corner is held to this part of the bound: a rule of thumb needs no more, and a stiff equation is slow to keep.
_WIDTH = 1e-3
_LEAST = 1e-9
# Room of an open inductance, in natural sizes.
_ROOM = 3.0


@dataclass(frozen=True)
class Shared:
    """One mutual resistance that the data leave open.

    Attributes
    ----------
    state, i, j : int
        Set of resistances and windings.
    most : float or None
        Bound in ohm where the losses above direct current are known (Rm^2 <= dR1 dR2), else None:
        the fraction of sqrt(R1 R2) holds.
    """

    state: int
    i: int
    j: int
    most: float | None


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

    def hints(self) -> Hints:
        """It has none.

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


class LossAt(Stated):
    """Evidence that windings have a given R/(omega L) at one frequency."""

    def __init__(self, where: Sequence[tuple[int, int]], ratio: float) -> None:
        super().__init__(np.full(len(where), ratio**2), "unread loss")
        self._where = where

    def predict(self, unknowns: Unknowns, theta: Real) -> Prediction:
        """(R/(omega L))^2 of each winding."""
        jacobian = np.zeros((len(self._where), unknowns.size))
        values = np.zeros(len(self._where))
        for v, (state, i) in enumerate(self._where):
            r, own = unknowns.resistance(state, i, i), unknowns.inductance(0, i, i)
            reactance = unknowns.omegas[state] * float(theta[own])
            values[v] = float(theta[r]) / reactance**2
            jacobian[v, [r, own]] = [1 / reactance**2, -2 * values[v] / float(theta[own])]
        return Prediction(values, jacobian, np.zeros((len(values), 0)))


class ReadLossAt(Stated):
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


class SharedAt(Stated):
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


def open_shared(problem: Problem, fit: Fit) -> list[tuple[int, int, int]]:
    """Mutual resistances (state, i, j) that the data do not tell from the bounds of a passive device.

    One counts as determined when its standard uncertainty is below sqrt(R1 R2), what physics allows it anyway.
    """
    u = problem.unknowns
    posterior = Posterior(problem, fit, Region(u))
    found = []
    for f in range(len(u.omegas)):
        for i in range(u.windings):
            for j in range(i + 1, u.windings):
                m = u.resistance(f, i, j)
                if problem.held[m]:
                    continue
                gradient = np.zeros(u.size)
                gradient[m] = 1.0
                r1, r2 = (float(fit.theta[u.resistance(f, k, k)]) for k in (i, j))
                root = np.sqrt(max(r1 * r2, 0.0))
                sure = posterior.determined(gradient)
                if not sure or posterior.contributions(gradient).variance > root**2:
                    found.append((f, i, j))
    return found


def with_sizes(problem: Problem, fit: Fit) -> Problem:
    """The problem with the self-inductances that the data leave open about where they are in a fit."""
    u = problem.unknowns
    posterior = Posterior(problem, fit, Region(u))
    every = [u.inductance(g, i, i) for g in range(u.groups) for i in range(u.windings)]
    positions = np.array([p for p in every if not posterior.determined(np.eye(u.size)[p])], dtype=np.int64)
    if not positions.size:
        return problem
    pieces: tuple[Evidence, ...] = (*problem.body.pieces, SizesAbout(positions, fit.theta, u.scale))
    return Problem(Body(pieces), u, problem.held)


def bounded(problem: Problem, fit: Fit, where: tuple[int, int, int]) -> Shared:
    """The bound of an open mutual resistance, from the losses above direct current where those are known."""
    f, i, j = where
    u = problem.unknowns
    if 0.0 not in u.omegas:
        return Shared(f, i, j, None)
    direct = u.omegas.index(0.0)
    posterior = Posterior(problem, fit, Region(u))
    excess = []
    for k in (i, j):
        gradient = np.zeros(u.size)
        gradient[u.resistance(f, k, k)], gradient[u.resistance(direct, k, k)] = 1.0, -1.0
        if not u.read[direct][k] or not posterior.determined(gradient):
            return Shared(f, i, j, None)
        spread = np.sqrt(posterior.contributions(gradient).variance)
        excess.append(max(float(gradient @ fit.theta), 0.0) + 2 * spread)
    return Shared(f, i, j, float(np.sqrt(excess[0] * excess[1])))


def with_loss(problem: Problem, unread: NDArray[np.int64], ratio: float) -> Problem:
    """The problem with the unread resistances at a part of omega L."""
    u = problem.unknowns
    where = [(f, i) for f in range(len(u.omegas)) for i in range(u.windings) if u.resistance(f, i, i) in unread]
    pieces: tuple[Evidence, ...] = (*problem.body.pieces, LossAt(where, ratio))
    return Problem(Body(pieces), u, problem.held)
