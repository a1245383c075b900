"""Walks along valleys of chi-square: something is held at one value after another, the rest makes the best of it."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from mutual.bounds import Interval
from mutual.engine import Fit, Problem, fit
from mutual.nuisance import holding
from mutual.physics import Region
from mutual.quantities import Measure
from mutual.stated import Waypoint

Real = NDArray[np.float64]

# Halvings where a way ends, and steps of a fit.
_HALVINGS, _FIT_STEPS = 8, 30
# Factor of a loss from place to place, and how many places (farther apart as they go); how far outside is inside.
FACTOR, _FACTORS = 1.4, 20
_INSIDE = 1e-6
# A parabola is taken this much farther than it turns.
_BEYOND = 1.2
_DETERMINED = 1e-5
_NO_MATTER = 1e-7
# What comes so close to a limit of physics is limited by nothing else.
_CLOSE = 0.02


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

    def determines(self, measure: Measure, scale: Real) -> bool:
        """Whether a quantity is determined here."""
        found = self.fit
        gradient = measure.gradient(found.theta)[found.free] * scale[found.free]
        left = gradient - found.vt.T @ (found.vt @ gradient)
        return float(np.linalg.norm(left)) < _DETERMINED * max(float(np.linalg.norm(gradient)), 1e-300)


class Walk:
    """Walks that start at one fit.

    Parameters
    ----------
    problem : Problem
    best : Fit
    region : Region
    wanted : float
        How far the root of chi-square may rise.
    """

    def __init__(self, problem: Problem, best: Fit, region: Region, wanted: float) -> None:
        self.problem, self.best, self.region, self.wanted = problem, best, region, wanted
        self._inductances = problem.unknowns.groups * problem.unknowns.entries

    def both_ways(self, valley: int, waypoint: Callable[[float], Waypoint]) -> list[Station]:
        """Stations where a loss is a power of `FACTOR` times what it was, the start first."""
        out = [Station(self.best, 0.0)]
        for way in (1.0, -1.0):
            out += self.along(valley, waypoint, [way * (n + n**2 / 12) for n in range(1, _FACTORS + 1)])
        return out

    def along(self, valley: int, waypoint: Callable[[float], Waypoint], places: Sequence[float]) -> Iterator[Station]:
        """Fits at one place after another, and close to where the data end the way."""
        theta, last = self.best.theta, 0.0
        for place in places:
            station = self.at(valley, place, waypoint(place), theta)
            if station is None:
                break
            yield station
            moved = np.abs(station.fit.theta - theta)[: self._inductances]
            if place < 0 and np.all(moved < _NO_MATTER * self.problem.unknowns.scale[: self._inductances]):
                # Less of a loss that is next to nothing changes nothing.
                return
            theta, last = station.fit.theta, place
        else:
            return
        good, bad = last, place
        for _ in range(_HALVINGS):
            middle = (good + bad) / 2
            station = self.at(valley, middle, waypoint(middle), theta)
            if station is None:
                bad = middle
            else:
                yield station
                good, theta = middle, station.fit.theta

    def at(self, valley: int, place: float, pinned: Waypoint, theta: Real) -> Station | None:
        """The fit at one place, None where the data do not allow it."""
        problem = holding(self.problem, pinned)
        found = fit(problem, pinned.placed(problem.unknowns, theta), self.region, steps=_FIT_STEPS)
        rise = found.chi_square - self.best.chi_square
        if rise >= self.wanted**2 or not self.region.contains(found.theta, _INSIDE):
            return None
        return Station(found, float(np.sqrt(max(rise, 0.0))), valley, place)


def enclosed(found: Interval, measure: Measure) -> tuple[Interval, str]:
    """Bounds within what physics allows, and which side the data bound."""
    least, most = measure.range
    low = found.lower <= least + _CLOSE * (found.value - found.lower)
    high = found.upper >= most - _CLOSE * (found.upper - found.value)
    out = replace(found, lower=least if low else found.lower, upper=most if high else found.upper)
    if low == high:
        return out, "both"
    return replace(out, standard=None), "lower" if high else "upper"


def idle(found: Interval, side: str, measure: Measure) -> bool:
    """Whether bounds say no more than physics does."""
    least, most = measure.range
    below, above = found.lower <= least, found.upper >= most
    return below and above if side == "both" else below if side == "lower" else above


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
