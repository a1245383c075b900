"""Coverage intervals within physics.

Three ways, by what the quantity asks for: the exact distribution of the linear error where
nothing is in the way; draws restricted to the physical region where one of its limits is
within reach; the profile of chi-square where the quantity is not linear in the data over
its own uncertainty (a coupling near zero seen only by its square).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import solve_triangular
from scipy.special import ndtri

from mutual.distribution import shortest_of_draws
from mutual.engine import OPEN_ABOVE, Fit, Problem
from mutual.physics import Region
from mutual.posterior import NEAR, Contributions, Posterior
from mutual.profile import Profile
from mutual.quantities import Measure

Real = NDArray[np.float64]

_STRAIGHT = (0.75, 1.33)
_OPEN_STEP = 0.01


@dataclass(frozen=True)
class Interval:
    """Bounds of one quantity.

    Attributes
    ----------
    value, lower, upper : float
    standard : float or None
        Standard uncertainty.
    at_lower, at_upper : bool
        Whether the region ends at what physics allows on that side.
    parts : Contributions or None
        For the budget.
    """

    value: float
    lower: float
    upper: float
    standard: float | None
    at_lower: bool = False
    at_upper: bool = False
    parts: Contributions | None = None


class Bounds:
    """Intervals of the quantities of one fit.

    Parameters
    ----------
    problem : Problem
    free : Fit
        Unconstrained minimum.
    best : Fit
        Minimum within the physical region.
    region : Region
    coverage : float
    """

    def __init__(self, problem: Problem, free: Fit, best: Fit, region: Region, coverage: float) -> None:
        self.problem, self.free, self.best, self.region, self.coverage = problem, free, best, region, coverage
        self.posterior = Posterior(problem, free, region)
        self._profile = Profile(problem, best, region, coverage)

    def interval(self, measure: Measure, flat: bool = True) -> Interval | None:
        """Interval of a quantity, of its magnitude where people ask for that; None where it is not determined.

        `flat` allows for a coupling that chi-square bounds although it has no slope there.
        """
        gradient = measure.gradient(self.free.theta)
        if not self.posterior.determined(gradient):
            return self._where_open(measure) if flat else None
        parts = self.posterior.contributions(gradient)
        standard = float(np.sqrt(parts.variance))
        plain = measure.kind == "entry" and self.problem.body.linear
        if not plain and self.posterior.feigned(measure.size, standard):
            return None
        if self._by_square(measure, standard) or not self._straight(measure, gradient, standard):
            return self._from_profile(measure, standard, parts)
        if self.posterior.limited(parts) and self.posterior.draws is not None:
            return self._from_draws(measure, parts)
        return self._exact(measure, parts)

    def _by_square(self, measure: Measure, standard: float) -> bool:
        """Whether a quantity is near zero and seen by its square: nothing is linear there."""
        position = measure.positions[-1]
        straight = self.problem.body.straight
        if not measure.folded or bool(np.any(self.free.prediction.jacobian[straight, position] != 0)):
            return False
        return abs(float(measure.value(self.best.theta))) < NEAR * standard

    def signed(self, measure: Measure) -> Interval | None:
        """Interval with its sign, no folding."""
        plain = Measure(measure.name, measure.kind, measure.positions, (-measure.limits[1], measure.limits[1]))
        return self.interval(plain)

    def _value(self, measure: Measure) -> float:
        value = float(measure.value(self.best.theta))
        if measure.folded:
            value = abs(value)
        return float(np.clip(value, *measure.limits))

    def _exact(self, measure: Measure, parts: Contributions) -> Interval:
        spread = self.posterior.spread(parts)
        widening = self.posterior.widening(parts, self.coverage)
        centre, value = float(measure.value(self.free.theta)), self._value(measure)
        if measure.folded and abs(centre) < NEAR * spread.standard * widening:
            wide = type(spread)(spread.sigma * widening, spread.halves * widening)
            lower, upper = wide.folded(centre, self.coverage, measure.limits[1])
        else:
            half = spread.half_width(self.coverage) * widening
            middle = abs(centre) if measure.folded else centre
            lower, upper = middle - half, middle + half
        return self._clipped(measure, value, lower, upper, spread.standard, parts)

    def _from_draws(self, measure: Measure, parts: Contributions) -> Interval:
        assert self.posterior.draws is not None
        values = measure.value(self.posterior.draws)
        if measure.folded:
            values = np.abs(values)
        widening = self.posterior.widening(parts, self.coverage)
        lower, upper, first, last = shortest_of_draws(values, self.coverage)
        value = self._value(measure)
        lower, upper = value - (value - lower) * widening, value + (upper - value) * widening
        least, most = measure.limits
        if first and least > -np.inf and lower - least < 0.02 * (upper - lower):
            lower = least
        if last and most < np.inf and most - upper < 0.02 * (upper - lower):
            upper = most
        return self._clipped(measure, value, lower, upper, float(np.sqrt(parts.variance)), parts)

    def _clipped(
        self, measure: Measure, value: float, lower: float, upper: float, standard: float, parts: Contributions
    ) -> Interval:
        least, most = measure.range
        lower, upper = min(max(lower, least), value), max(min(upper, most), value)
        return Interval(value, lower, upper, standard, lower <= least, upper >= most, parts)

    def _straight(self, measure: Measure, gradient: Real, standard: float) -> bool:
        """Whether chi-square grows by 4 within two standard uncertainties, as it does for a linear model."""
        if standard == 0 or self.problem.body.linear:
            return True
        direction = self._direction(gradient) / standard
        for side in (2.0, -2.0):
            theta = self.free.theta + side * direction
            r = self.free.prediction.values - self.problem.body.predict(self.problem.unknowns, theta).values
            white = solve_triangular(self.free.whitener, r, lower=True, check_finite=False)
            if not _STRAIGHT[0] < float(white @ white) / 4 < _STRAIGHT[1]:
                return False
        return True

    def _direction(self, gradient: Real) -> Real:
        """Covariance times gradient: how the unknowns move when the quantity does, (P,)."""
        f, scale = self.free, self.problem.unknowns.scale[self.free.free]
        out = np.zeros(len(f.theta))
        out[f.free] = scale * (f.vt.T @ ((f.vt @ (gradient[f.free] * scale)) / f.s**2))
        return out

    def _where_open(self, measure: Measure) -> Interval | None:
        """Chi-square may bound a coupling that has no linear estimate.

        Either it is at zero and seen only by its square, or something that bears on it (how a loss splits between
        windings) is open, but limited by physics.
        """
        if measure.kind != "coupling" or not self._seen(measure.positions[2]) or not self._open_by_loss(measure):
            return None
        if not self._slopes(measure.positions[2]):
            return self._where_flat(measure)
        return self._from_profile(measure, _OPEN_STEP, None)

    def _open_by_loss(self, measure: Measure) -> bool:
        """Whether a coupling would be determined if all losses were known (or if it had a slope)."""
        u, free = self.problem.unknowns, self.free
        among = free.free < u.entries * u.groups
        _, s, vt = np.linalg.svd(free.jacobian[:, among], full_matrices=False)
        kept = vt[s > max(1 / OPEN_ABOVE, 1e-11 * float(s.max(initial=0.0)))]
        gradient = (measure.gradient(free.theta) * u.scale)[free.free][among]
        if not self._slopes(measure.positions[2]):
            gradient = np.where(free.free[among] == measure.positions[2], 0.0, gradient)
        left = gradient - kept.T @ (kept @ gradient)
        return float(np.linalg.norm(left)) < 1e-6 * max(float(np.linalg.norm(gradient)), 1e-300)

    def _seen(self, position: int) -> bool:
        """Whether an unknown bears on the data away from where its slope may vanish."""
        theta = self.best.theta.copy()
        theta[position] = 0.5 * self.problem.unknowns.scale[position]
        jacobian = self.problem.body.predict(self.problem.unknowns, theta).jacobian[:, position]
        return bool(np.any(jacobian != 0))

    def _slopes(self, position: int) -> bool:
        """Whether chi-square has a slope by an unknown at the minimum."""
        where = np.flatnonzero(self.free.free == position)
        return bool(where.size) and float(np.linalg.norm(self.free.jacobian[:, where[0]])) > 3 / OPEN_ABOVE

    def _where_flat(self, measure: Measure) -> Interval | None:
        """A coupling at zero seen only by its square has no slope there, yet it is bounded."""
        high = self._profile.of_zero(measure)
        if high is None:
            return None
        value = min(self._value(measure), high)
        return Interval(value, 0.0, high, high / float(ndtri((1 + self.coverage) / 2)), True, False, None)

    def _from_profile(self, measure: Measure, standard: float, parts: Contributions | None) -> Interval | None:
        value = self._value(measure)
        least, most = measure.range
        step = max(standard, 1e-9 * abs(value))
        upper = self._profile.crossing(measure, value, step, most)
        lower = self._profile.crossing(measure, value, -step, least)
        if upper is None and lower is None:
            return None
        low = least if lower is None else min(lower, value)
        high = most if upper is None else max(upper, value)
        if not (np.isfinite(low) and np.isfinite(high)):
            return None
        half = (high - low) / 2 / float(ndtri((1 + self.coverage) / 2))
        known = half if parts is None else min(standard, half)
        return Interval(value, low, high, known, lower is None, upper is None, parts)
