"""Valleys of chi-square that losses shared between windings open, walked from the best fit as far as the data allow.

Along a valley a shared loss, or the loss of one of the windings that share it, is held at one value after another;
everything else makes the best of it. Where Rm/sqrt(R1 R2) turns back on the way, R/(omega L) goes on.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from functools import partial

import numpy as np
from numpy.typing import NDArray

from mutual.engine import Fit, Problem, fit
from mutual.evidence import Body
from mutual.nuisance import ReadLossAt, Shared, SharedAt
from mutual.physics import Region
from mutual.posterior import Posterior
from mutual.quantities import Measure
from mutual.unknowns import Unknowns

Real = NDArray[np.float64]
Waypoint = SharedAt | ReadLossAt

# Steps of the way to all that may be shared; factors of a winding's loss and how many; halvings where a way ends.
_PARTS = (0.3, 0.65, 1.0)
_FACTOR, _FACTORS = 1.4, 20
_HALVINGS = 8
# A parabola is taken this much farther; rounds of fits where it turns; how far outside of physics is inside.
_BEYOND = 1.2
_ROUNDS = 2
_INSIDE = 1e-6
_FIT_STEPS = 30


@dataclass(frozen=True)
class Station:
    """A place on a valley.

    Attributes
    ----------
    fit : Fit
        With what leads along the valley held.
    rise : float
        Root of the rise of chi-square.
    valley : int
        Number of the valley; -1 for the best fit itself.
    place : float
        Where on it; the best fit is at 0.
    """

    fit: Fit
    rise: float
    valley: int = -1
    place: float = 0.0

    def standard(self, measure: Measure, scale: Real) -> float:
        """Standard uncertainty of a quantity here, by what is determined."""
        found = self.fit
        gradient = measure.gradient(found.theta)[found.free] * scale[found.free]
        return float(np.linalg.norm((found.vt @ gradient) / found.s))


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
        self._problem, self._shared, self._losses, self._best = problem, tuple(shared), tuple(losses), best
        self._region, self._wanted = region, wanted

    def stations(self) -> list[Station]:
        """Places along all valleys, both ways, the best fit first."""
        u, theta = self._problem.unknowns, self._best.theta
        found = [Station(self._best, 0.0)]
        for valley, (state, i) in enumerate(self._losses):
            waypoint = partial(_loss, state, i, _ratio(u, theta, state, i))
            walked = [found[0]]
            for way in (1.0, -1.0):
                places = [way * (n + n**2 / 12) for n in range(1, _FACTORS + 1)]
                walked += self._along(valley, waypoint, places)
            found += [*walked[1:], *self._turns(valley, waypoint, walked)]
        # Where both losses are known, the shared part of them is itself a measure of the place.
        known = np.array([not {(s.state, s.i), (s.state, s.j)} & set(self._losses) for s in self._shared])
        start = shared_parts(self._problem, self._shared, self._best)
        most = np.array([limit[3] for limit in self._region.shared])
        where = [(s.state, s.i, s.j) for s in self._shared]
        for valley, ray in enumerate(_rays(known), len(self._losses)):
            found += self._along(valley, partial(_share, where, start, np.where(ray == 0, start, ray * most)), _PARTS)
        return found

    def _turns(self, valley: int, waypoint: Callable[[float], Waypoint], walked: Sequence[Station]) -> list[Station]:
        """Stations where couplings turn back."""
        u, found = self._problem.unknowns, list(walked)
        for s in self._shared:
            own, other, m = (u.inductance(0, *ij) for ij in ((s.i, s.i), (s.j, s.j), (s.i, s.j)))
            measure = Measure("", "coupling", (own, other, m), folded=True)
            for _ in range(_ROUNDS):
                values = np.array([float(measure.size(station.fit.theta)) for station in found])
                for k, place in turning(found, values)[1]:
                    station = self._at(valley, place, waypoint(place), found[k].fit.theta)
                    found += [] if station is None else [station]
        return found[len(walked) :]

    def _along(self, valley: int, waypoint: Callable[[float], Waypoint], places: Sequence[float]) -> Iterator[Station]:
        """Fits at one place after another, and close to where the data end the way."""
        theta, last = self._best.theta, 0.0
        for place in places:
            station = self._at(valley, place, waypoint(place), theta)
            if station is None:
                break
            yield station
            theta, last = station.fit.theta, place
        else:
            return
        good, bad = last, place
        for _ in range(_HALVINGS):
            middle = (good + bad) / 2
            station = self._at(valley, middle, waypoint(middle), theta)
            if station is None:
                bad = middle
            else:
                yield station
                good, theta = middle, station.fit.theta

    def _at(self, valley: int, place: float, pinned: Waypoint, theta: Real) -> Station | None:
        problem = holding(self._problem, pinned)
        found = fit(problem, pinned.placed(problem.unknowns, theta), self._region, steps=_FIT_STEPS)
        rise = found.chi_square - self._best.chi_square
        if rise >= self._wanted**2 or not self._region.contains(found.theta, _INSIDE):
            return None
        return Station(found, float(np.sqrt(max(rise, 0.0))), valley, place)


def turning(stations: Sequence[Station], values: Real) -> tuple[Real, list[tuple[int, float]]]:
    """Where a quantity turns back between stations of one valley, by a parabola through three of them.

    Returns
    -------
    values : (s,) float
        Moved on to the turning point at the station next to it.
    turns : list of (int, float)
        That station and the place of the turning point.
    """
    out, turns = values.copy(), []
    for valley in {s.valley for s in stations} - {-1}:
        order = sorted((k for k, s in enumerate(stations) if s.valley in (valley, -1)), key=lambda k: stations[k].place)
        for before, k, after in zip(order, order[1:], order[2:], strict=False):
            a, b = stations[before].place - stations[k].place, stations[after].place - stations[k].place
            da, db = values[before] - values[k], values[after] - values[k]
            if da * db <= 0:
                continue
            bend = (da / a - db / b) / (a - b)
            slope = da / a - bend * a
            out[k] = values[k] - _BEYOND * slope**2 / (4 * bend)
            where = stations[k].place + float(np.clip(-slope / (2 * bend), a, b))
            turns.append((k, where))
    return out, turns


def holding(problem: Problem, pinned: Waypoint) -> Problem:
    """The problem with a nuisance held."""
    return Problem(Body((*problem.body.pieces, pinned)), problem.unknowns, problem.held)


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
    """R/(omega L) of a winding."""
    return float(theta[u.resistance(state, i, i)]) / (u.omegas[state] * float(theta[u.inductance(0, i, i)]))


def shared_parts(problem: Problem, shared: Sequence[Shared], at: Fit) -> Real:
    """Rm/sqrt(R1 R2) of every open mutual resistance (m,)."""
    u, theta = problem.unknowns, at.theta
    own = [[abs(float(theta[u.resistance(s.state, k, k)])) for k in (s.i, s.j)] for s in shared]
    m = np.array([float(theta[u.resistance(s.state, s.i, s.j)]) for s in shared])
    return np.asarray(m / np.maximum(np.sqrt(np.prod(own, axis=1)), 1e-300))


def _share(where: Sequence[tuple[int, int, int]], start: Real, end: Real, place: float) -> Waypoint:
    return SharedAt(where, start + place * (end - start))


def _loss(state: int, winding: int, ratio: float, place: float) -> Waypoint:
    return ReadLossAt(state, winding, ratio * _FACTOR**place)


def _rays(known: NDArray[np.bool_]) -> list[Real]:
    """Signs of the mutual resistances that change along a way: each alone and all of them, both ways."""
    alone = [sign * row for row in np.eye(len(known))[known] for sign in (1.0, -1.0)]
    together = [1.0 * known, -1.0 * known] if np.sum(known) > 1 else []
    return [*together, *alone]
