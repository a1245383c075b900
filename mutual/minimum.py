"""One minimum of chi-square with its bounds, over the losses of windings of which no resistance was read."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import replace
from functools import partial

import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtri

from mutual.bounds import Bounds, Interval
from mutual.engine import Fit, Problem
from mutual.nuisance import places_of, with_loss
from mutual.physics import Region
from mutual.quantities import Measure
from mutual.stated import LossAt, Waypoint
from mutual.walking import FACTOR, Station, Walk, enclosed, idle, turning

Real = NDArray[np.float64]
Ints = NDArray[np.int64]
Least = Callable[[Problem, Sequence[Real]], tuple[Fit, Fit]]

_ALLOWED = 4.0
# Losses of windings of which none was read, as R/(omega L).
_LOSSES = (0.03, 0.1, 0.3, 1.0, 3.0, 10.0, 30.0)
# A change below this part of a half width is none.
_NOTABLE = 0.02
_ON_THE_VALLEY = 0.1
# Far along a valley a straight line is no guide: bounds reach so many half widths of the lossless ones from there.
_REACH = 1.5


class Minimum:
    """One minimum: a problem with its fits and bounds.

    Parameters
    ----------
    problem : Problem
    free, best : Fit
        Anywhere, and within the physical region.
    region : Region
    coverage : float
    least : callable
        (problem, starts) -> (free, best), lowest of the fits from several starts.
    """

    def __init__(self, problem: Problem, free: Fit, best: Fit, region: Region, coverage: float, least: Least) -> None:
        self.problem, self.free, self.best = problem, free, best
        self.bounds = Bounds(problem, free, best, region, coverage)
        self._region, self._coverage, self._least = region, coverage, least
        self._lossy: list[Minimum] | None = None
        self._stations: list[Station] | None = None

    def interval(self, measure: Measure) -> tuple[Interval | None, str]:
        """Bounds of a quantity and which side they bound: "both", "lower" or "upper"."""
        unread = self._unread()
        found = self.bounds.interval(measure, flat=not unread.size)
        if found is not None or not unread.size:
            return found, "both"
        return self._over_losses(measure, unread)

    def _unread(self) -> Ints:
        """Squared resistances that bear on the data."""
        u, free = self.problem.unknowns, self.free
        bearing = np.zeros(u.size, dtype=bool)
        bearing[free.free] = np.linalg.norm(free.jacobian, axis=0) > 1e-9
        return np.flatnonzero(u.squared & bearing & ~self.problem.held)

    def _over_losses(self, measure: Measure, unread: Ints) -> tuple[Interval | None, str]:
        """Union over the losses of windings of which none was read, from none upward."""
        if self._lossy is None:
            self._lossy = self._losses(unread)
        lossless = self._lossy[0]
        if lossless.best.chi_square > self.best.chi_square + _ALLOWED:
            # Some loss there must be: chi-square says how little and how much.
            return self._over_walks(measure, unread)
        least = lossless.bounds.interval(measure)
        if least is None:
            return None, "both"
        values = np.array([float(measure.size(m.best.theta)) for m in self._lossy])
        walked, left = self._on_walks(measure, unread)
        rise = float(max(values.max(), walked.max()) - values[0])
        fall = float(values[0] - min(values.min(), walked.min()))
        notable = _NOTABLE * (least.upper - least.lower) / 2
        if max(rise, fall) < notable:
            return least, "both"
        floor, most = measure.range
        if rise >= fall:
            lower = self._farther(measure, values, walked, left, least.lower, -1.0) if fall > notable else least.lower
            found, side = replace(least, lower=lower, upper=most, standard=None), "lower"
        else:
            upper = self._farther(measure, values, walked, left, least.upper, 1.0) if rise > notable else least.upper
            found, side = replace(least, lower=floor, upper=upper, standard=None), "upper"
        return (None if idle(found, side, measure) else found), side

    def _over_walks(self, measure: Measure, unread: Ints) -> tuple[Interval | None, str]:
        """Bounds over all that the unread losses may be, each in turn held at one value after another."""
        values, left = self._on_walks(measure, unread)
        scale = self.problem.unknowns.scale
        held = [s for s in self._stations or [] if s.valley >= 0]
        # Against the border of physics a fit may lose hold of a quantity that the data determine on the valley.
        if not held or not all(s.determines(measure, scale) for s in held if s.rise < _ON_THE_VALLEY):
            return None, "both"
        low, high = float(np.min(values - left)), float(np.max(values + left))
        return enclosed(Interval(float(measure.size(self.best.theta)), low, high, None), measure)

    def _on_walks(self, measure: Measure, unread: Ints) -> tuple[Real, Real]:
        """Values (s,) of a quantity at all stations, and how far its bounds reach from each."""
        if self._stations is None:
            self._stations = self._walked(unread)
        scale = self.problem.unknowns.scale
        values = turning(self._stations, np.array([float(measure.size(s.fit.theta)) for s in self._stations]))[0]
        # Where a quantity is open, a station says what it may be, not how well that is known.
        left = [
            np.sqrt(self._quantile**2 - s.rise**2) * s.standard(measure, scale) if s.determines(measure, scale) else 0.0
            for s in self._stations
        ]
        return values, np.array(left)

    @property
    def _quantile(self) -> float:
        return float(ndtri((1 + self._coverage) / 2))

    def _walked(self, unread: Ints) -> list[Station]:
        u, theta = self.problem.unknowns, self.best.theta
        walk = Walk(self.problem, self.best, self._region, self._quantile)
        out = [Station(self.best, 0.0)]
        for valley, (state, i) in enumerate(places_of(u, unread)):
            reactance = u.omegas[state] * float(theta[u.inductance(0, i, i)])
            ratio = np.sqrt(max(float(theta[u.resistance(state, i, i)]), 0.0)) / reactance
            out += walk.both_ways(valley, partial(_loss, state, i, max(ratio, _LOSSES[0])))[1:]
        return out

    def _farther(
        self, measure: Measure, values: Real, walked: Real, left: Real, end: float, sign: float
    ) -> float:
        """An end of the bounds, moved out to that of the losses which carry a quantity farthest that way."""
        assert self._lossy is not None
        there = self._lossy[int(np.argmax(sign * values))].bounds.interval(measure)
        if there is None:
            held = measure.limits[1] if sign > 0 else measure.limits[0]
        else:
            held = there.upper if sign > 0 else there.lower
        farthest = int(np.argmax(sign * walked))
        reach = min(float(left[farthest]), _REACH * abs(end - float(values[0])))
        ends = (end, float(held), float(walked[farthest]) + sign * reach)
        return max(ends) if sign > 0 else min(ends)

    def _losses(self, unread: Ints) -> list[Minimum]:
        """Minima with the unread resistances held: at nothing, then rising while the readings allow it.

        All rise together, and each rises alone.
        """
        lossless = self.problem.holding(unread)
        theta = self.free.theta.copy()
        theta[unread] = 0.0
        out = [self._made(lossless, [theta, self._half_coupled(theta)])]
        for rising in [unread, *(unread[[k]] for k in range(len(unread)))][: 1 if len(unread) == 1 else None]:
            last = out[0]
            for loss in _LOSSES:
                theta = last.free.theta.copy()
                theta[unread] = 0.0
                theta[rising] = loss**2 * self.problem.unknowns.scale[rising]
                still = np.setdiff1d(unread, rising)
                last = self._made(with_loss(self.problem.holding(still), rising, loss), [theta])
                if last.best.chi_square > out[0].best.chi_square + _ALLOWED:
                    break
                out.append(last)
        return out

    def _made(self, problem: Problem, starts: Sequence[Real]) -> Minimum:
        free, best = self._least(problem, starts)
        return Minimum(problem, free, best, self._region, self._coverage, self._least)

    def _half_coupled(self, theta: Real) -> Real:
        """The same unknowns with all couplings at half, as a second start."""
        u = self.problem.unknowns
        out = theta.copy()
        off = np.tile(u.first != u.second, u.groups)
        out[: len(off)][off] = 0.5 * u.scale[: len(off)][off]
        return out


def _loss(state: int, winding: int, ratio: float, place: float) -> Waypoint:
    return LossAt([(state, winding)], ratio * FACTOR**place)
