"""One explanation of all evidence: the fit, what it leaves open, and the bounds of every quantity.

An explanation belongs to one choice of what data sheets leave open; `union` joins those of all choices.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray
from scipy.special import chdtrc

from mutual.bounds import Bounds, Interval
from mutual.engine import Fit, Problem, fit, linearised
from mutual.evidence import Body, Evidence
from mutual.nuisance import Shared, bounded, open_shared, with_loss
from mutual.physics import Region
from mutual.quantities import Measure
from mutual.sharing import Sharing
from mutual.start import make_start

Real = NDArray[np.float64]

_AS_GOOD = 1e-6
_BETTER = 1e-3
_ALLOWED = 4.0
# Losses of windings of which none was read, as R/(omega L).
_LOSSES = (0.03, 0.1, 0.3, 1.0, 3.0, 10.0, 30.0)


@dataclass(frozen=True)
class Setting:
    """One way of settling what is open: a problem with its fits and bounds."""

    problem: Problem
    free: Fit
    best: Fit
    bounds: Bounds


class Explanation:
    """Fit of all evidence.

    Parameters
    ----------
    pieces : sequence of Evidence
    windings, groups : int
    omegas : tuple of float
    coverage : float
    shared_loss : float
        Bound of mutual resistance as a fraction of sqrt(R1 R2) where the data leave it open.
    """

    def __init__(
        self,
        pieces: Sequence[Evidence],
        windings: int,
        groups: int,
        omegas: tuple[float, ...],
        coverage: float,
        shared_loss: float,
    ) -> None:
        start = make_start([p.hints() for p in pieces], windings, groups, omegas)
        self.unknowns, self.coverage, self.part = start.unknowns, coverage, shared_loss
        self.region = Region(start.unknowns)
        problem = Problem(Body(pieces), start.unknowns, start.unknowns.fixed.copy())
        free, best = self._least(problem, start.thetas)
        self.shared: list[Shared] = []
        self._sharing: Sharing | None = None
        hidden = open_shared(problem, free)
        if hidden:
            self.shared = [bounded(problem, free, where) for where in hidden]
            free, best, problem = self._with_shared(problem, start.thetas)
        self.main = self._setting(problem, free, best)
        self._lossy: list[tuple[float, Setting]] | None = None

    def _with_shared(self, problem: Problem, thetas: Sequence[Real]) -> tuple[Fit, Fit, Problem]:
        """Hold the open mutual resistances at nil, or where they have to be within their bounds."""
        places = np.array([self.unknowns.resistance(s.state, s.i, s.j) for s in self.shared])
        held = problem.holding(places)
        free, best = self._least(held, thetas)
        self._sharing = Sharing(problem, tuple(self.shared), self.part, self.coverage)
        within = fit(problem, best.theta, self._sharing.region(best))
        if within.chi_square < best.chi_square - _BETTER:
            free, best = self._least(held, [within.theta])
        return free, best, held

    def _least(self, problem: Problem, thetas: Sequence[Real]) -> tuple[Fit, Fit]:
        """Lowest of the fits from all starts; a physical one where others are no better."""
        fits = [fit(problem, theta) for theta in thetas]
        least = min(f.chi_square for f in fits)
        good = [f for f in fits if f.chi_square <= least + 1e-3]
        physical = [f for f in good if self.region.contains(f.theta)]
        if physical:
            # Of explanations that are equally good the one with the least unread loss is the textbook's.
            free = min(physical, key=self._loss)
            return free, free
        free = good[0]
        best = fit(problem, free.theta, self.region)
        for theta in thetas:
            if best.chi_square <= free.chi_square + _AS_GOOD:
                break
            best = min(best, fit(problem, theta, self.region), key=lambda f: f.chi_square)
        if best.chi_square <= free.chi_square + _AS_GOOD:
            # Where the data leave a direction open, a physical point may explain them as well as one that is not.
            return best, best
        return (free if problem.body.linear else linearised(problem, best)), best

    def _loss(self, found: Fit) -> float:
        """Unread losses in natural sizes, in steps that rounding does not decide."""
        relative = found.theta[self.unknowns.squared] / self.unknowns.scale[self.unknowns.squared]
        return round(float(np.sum(np.abs(relative))), 6)

    def _setting(self, problem: Problem, free: Fit, best: Fit) -> Setting:
        return Setting(problem, free, best, Bounds(problem, free, best, self.region, self.coverage))

    @property
    def chi_square(self) -> float:
        """At the best physical point."""
        return self.main.best.chi_square

    @property
    def degrees_of_freedom(self) -> int:
        """Values left over to test with."""
        return self.main.free.degrees_of_freedom

    @property
    def p_value(self) -> float | None:
        """Probability of a chi-square at least as large; None where nothing is left over."""
        if self.degrees_of_freedom < 1:
            # A fit pressed against the border of physics is a test all the same.
            gap = self.chi_square - self.main.free.chi_square
            return float(chdtrc(1, gap)) if gap > 1e-6 else None
        return float(chdtrc(self.degrees_of_freedom, self.chi_square))

    def interval(self, measure: Measure) -> tuple[Interval | None, str]:
        """Bounds of a quantity and which side they bound: "both", "lower" or "upper"."""
        unread = self._unread()
        found = self.main.bounds.interval(measure, flat=not unread.size)
        side = "both"
        if found is None and unread.size:
            found, side = self._over_losses(measure, unread)
        if found is None or self._sharing is None:
            return found, side
        return self.over_shared(measure, found, None)

    def _unread(self) -> NDArray[np.int64]:
        """Squared resistances that bear on the data."""
        u, free = self.unknowns, self.main.free
        bearing = np.zeros(u.size, dtype=bool)
        bearing[free.free] = np.linalg.norm(free.jacobian, axis=0) > 1e-9
        return np.flatnonzero(u.squared & bearing & ~self.main.problem.held)

    def _over_losses(self, measure: Measure, unread: NDArray[np.int64]) -> tuple[Interval | None, str]:
        """Union over the losses of windings of which none was read, from none upward."""
        if self._lossy is None:
            self._lossy = self._losses(unread)
        lossless = self._lossy[0][1]
        if lossless.best.chi_square > self.chi_square + _ALLOWED:
            # Some loss there must be: chi-square says how little and how much.
            found = self.main.bounds.interval(measure)
            side = "both"
            if found is not None and found.at_lower != found.at_upper:
                side = "lower" if found.at_upper else "upper"
            return (found if found is None or side == "both" else replace(found, standard=None)), side
        least = self._lossy[0][1].bounds.interval(measure)
        if least is None:
            return None, "both"
        values = [float(measure.value(setting.best.theta)) for _, setting in self._lossy]
        if measure.folded:
            values = [abs(v) for v in values]
        rise, fall = max(values) - values[0], values[0] - min(values)
        if max(rise, fall) < 0.02 * (least.upper - least.lower) / 2:
            return least, "both"
        floor = max(measure.limits[0], 0.0) if measure.folded else measure.limits[0]
        if rise >= fall:
            found, side, idle = replace(least, upper=measure.limits[1], standard=None), "lower", least.lower <= floor
        else:
            found, side, idle = replace(least, lower=floor, standard=None), "upper", least.upper >= measure.limits[1]
        return (None if idle else found), side

    def _losses(self, unread: NDArray[np.int64]) -> list[tuple[float, Setting]]:
        """Settings with the unread resistances held: at nothing, then rising while the readings allow it."""
        lossless = self.main.problem.holding(unread)
        out: list[tuple[float, Setting]] = []
        for loss in (0.0, *_LOSSES):
            theta = self.main.free.theta.copy() if not out else out[-1][1].free.theta.copy()
            theta[unread] = loss**2 * self.unknowns.scale[unread]
            starts = [theta]
            if not out:
                starts += [self._with(t, theta, unread) for t in self._flipped(theta)]
            problem = with_loss(self.main.problem, unread, loss) if out else lossless
            free, best = self._least(problem, starts)
            if out and best.chi_square > out[0][1].best.chi_square + _ALLOWED:
                break
            out.append((loss, self._setting(problem, free, best)))
        return out

    def _with(self, theta: Real, values: Real, positions: NDArray[np.int64]) -> Real:
        out = theta.copy()
        out[positions] = values[positions]
        return out

    def _flipped(self, theta: Real) -> list[Real]:
        """The same unknowns with all couplings at half, as a second start."""
        u = self.unknowns
        out = theta.copy()
        off = np.tile(u.first != u.second, u.groups)
        out[: len(off)][off] = 0.5 * u.scale[: len(off)][off]
        return [out]

    def over_shared(self, measure: Measure, found: Interval, part: float | None) -> tuple[Interval, str]:
        """Widen bounds to what open mutual resistances may do, within their bounds or a part of sqrt(R1 R2)."""
        assert self._sharing is not None
        return self._sharing.widened(self.main.best, self.main.bounds.posterior, measure, found, part)
