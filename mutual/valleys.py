"""Valleys of chi-square that losses shared between windings open, walked from the best fit as far as the data allow.

Along a valley a shared loss, or the loss of one of the windings that share it, is held at one value after another;
everything else makes the best of it. Where Rm/sqrt(R1 R2) turns back on the way, R/(omega L) goes on.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from functools import partial

import numpy as np
from numpy.typing import NDArray

from mutual.engine import Fit, Problem, fit
from mutual.nuisance import Shared, holding
from mutual.physics import Region
from mutual.posterior import Posterior
from mutual.quantities import Measure
from mutual.stated import ReadLossAt, SharedAt, Waypoint
from mutual.unknowns import Unknowns
from mutual.walking import FACTOR, Station, Walk, turning

Real = NDArray[np.float64]

# Steps of the way to all that may be shared; rounds of fits where a coupling turns.
_PARTS = (0.3, 0.65, 1.0)
_ROUNDS = 2
_LEAST = 1e-6


class Valleys:
    """Valleys about one fit.

    Parameters
    ----------
    problem : Problem
        With the mutual resistances free.
    shared : sequence of Shared
        Those that the data leave open.
    losses : sequence of (state, winding)
        Losses that the data leave open with them.
    best : Fit
    region : Region
        With their bounds.
    wanted : float
        How far the root of chi-square may rise.
    """

    def __init__(
        self,
        problem: Problem,
        shared: Sequence[Shared],
        losses: Sequence[tuple[int, int]],
        best: Fit,
        region: Region,
        wanted: float,
    ) -> None:
        self._shared, self._losses = tuple(shared), tuple(losses)
        self._walk = Walk(problem, best, region, wanted)

    def stations(self) -> list[Station]:
        """Places along all valleys, both ways, the best fit first."""
        problem, best = self._walk.problem, self._walk.best
        found = [Station(best, 0.0)]
        for valley, (state, i) in enumerate(self._losses):
            waypoint = partial(_loss, state, i, _ratio(problem.unknowns, best.theta, state, i))
            walked = self._walk.both_ways(valley, waypoint)
            found += [*walked[1:], *self._turns(valley, waypoint, walked)]
        # Where both losses are known, the shared part of them is itself a measure of the place.
        known = np.array([not {(s.state, s.i), (s.state, s.j)} & set(self._losses) for s in self._shared])
        start = shared_parts(problem, self._shared, best)
        most = np.array([limit[3] for limit in self._walk.region.shared])
        where = [(s.state, s.i, s.j) for s in self._shared]
        for valley, ray in enumerate(_rays(known), len(self._losses)):
            waypoint = partial(_share, where, start, np.where(ray == 0, start, ray * most))
            found += self._walk.along(valley, waypoint, _PARTS)
        return found

    def _turns(self, valley: int, waypoint: Callable[[float], Waypoint], walked: Sequence[Station]) -> list[Station]:
        """Stations where couplings turn back."""
        u, found = self._walk.problem.unknowns, list(walked)
        for s in self._shared:
            own, other, m = (u.inductance(0, *ij) for ij in ((s.i, s.i), (s.j, s.j), (s.i, s.j)))
            measure = Measure("", "coupling", (own, other, m), folded=True)
            for _ in range(_ROUNDS):
                values = np.array([float(measure.size(station.fit.theta)) for station in found])
                for k, place in turning(found, values)[1]:
                    station = self._walk.at(valley, place, waypoint(place), found[k].fit.theta)
                    found += [] if station is None else [station]
        return found[len(walked) :]


def open_losses(problem: Problem, shared: Sequence[Shared], theta: Real) -> list[tuple[int, int]]:
    """(state, winding) of losses that the data leave open beside a mutual resistance, at unknowns (P,)."""
    u = problem.unknowns
    posterior = Posterior(problem, fit(problem, theta, steps=0), Region(u))
    every = sorted({(s.state, w) for s in shared for w in (s.i, s.j)})
    return [(f, i) for f, i in every if not posterior.determined(np.eye(u.size)[u.resistance(f, i, i)])]


def anchored(problem: Problem, shared: Sequence[Shared], losses: Sequence[tuple[int, int]], theta: Real) -> Problem:
    """The problem with the place on its valleys held at that of unknowns (P,).

    Held are the losses that the data leave open, or the shared parts of them where those are all known: where
    Rm/sqrt(R1 R2) turns back it is no measure of the place.
    """
    if not losses:
        at = fit(problem, theta, steps=0)
        return holding(problem, SharedAt([(s.state, s.i, s.j) for s in shared], shared_parts(problem, shared, at)))
    for state, i in losses:
        problem = holding(problem, ReadLossAt(state, i, _ratio(problem.unknowns, theta, state, i)))
    return problem


def _ratio(u: Unknowns, theta: Real, state: int, i: int) -> float:
    """R/(omega L) of a winding, next to nothing where a fit puts it at nil or a trace below."""
    ratio = float(theta[u.resistance(state, i, i)]) / (u.omegas[state] * float(theta[u.inductance(0, i, i)]))
    return max(ratio, _LEAST)


def shared_parts(problem: Problem, shared: Sequence[Shared], at: Fit) -> Real:
    """Rm/sqrt(R1 R2) of every open mutual resistance (m,)."""
    u, theta = problem.unknowns, at.theta
    own = [[abs(float(theta[u.resistance(s.state, k, k)])) for k in (s.i, s.j)] for s in shared]
    m = np.array([float(theta[u.resistance(s.state, s.i, s.j)]) for s in shared])
    return np.asarray(m / np.maximum(np.sqrt(np.prod(own, axis=1)), 1e-300))


def _share(where: Sequence[tuple[int, int, int]], start: Real, end: Real, place: float) -> Waypoint:
    return SharedAt(where, start + place * (end - start))


def _loss(state: int, winding: int, ratio: float, place: float) -> Waypoint:
    return ReadLossAt(state, winding, ratio * FACTOR**place)


def _rays(known: NDArray[np.bool_]) -> list[Real]:
    """Signs of the mutual resistances that change along a way: each alone and all of them, both ways."""
    alone = [sign * row for row in np.eye(len(known))[known] for sign in (1.0, -1.0)]
    together = [1.0 * known, -1.0 * known] if np.sum(known) > 1 else []
    return [*together, *alone]
