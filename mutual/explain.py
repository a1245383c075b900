"""One explanation of all evidence: the fit, what it leaves open, and the bounds of every quantity.

An explanation belongs to one choice of what data sheets leave open; `union` joins those of all choices.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray
from scipy.special import chdtrc

from mutual.bounds import Interval
from mutual.engine import Fit, Problem, fit, linearised
from mutual.evidence import Body, Evidence
from mutual.minimum import Minimum
from mutual.nuisance import Shared, bounded, open_shared, with_sizes
from mutual.others import other_explanations
from mutual.physics import Region
from mutual.quantities import Measure
from mutual.sharing import Sharing
from mutual.start import make_start
from mutual.valleys import anchored, open_losses
from mutual.walking import idle

Real = NDArray[np.float64]

_AS_GOOD = 1e-6
_BETTER = 1e-3
_INSIDE = 1e-6


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
        self.main = self._minimum(problem, free, best)
        found = other_explanations(problem, best, self.region, start.thetas)
        self.others = [self._minimum(problem, f, f) for f in found]

    def _with_shared(self, problem: Problem, thetas: Sequence[Real]) -> tuple[Fit, Fit, Problem]:
        """Hold the open mutual resistances at nil, or where they have to be within their bounds."""
        places = np.array([self.unknowns.resistance(s.state, s.i, s.j) for s in self.shared])
        held = problem.holding(places)
        free, best = self._least(held, thetas)
        sized = with_sizes(problem, best)
        losses = open_losses(problem, self.shared, best.theta)
        self._sharing = Sharing(sized, tuple(self.shared), tuple(losses), self.part, self.coverage)
        region = self._sharing.region(best)
        within = min((fit(sized, theta, region) for theta in (best.theta, *thetas)), key=lambda f: f.chi_square)
        if within.chi_square < best.chi_square - _BETTER:
            # The readings cannot do without some shared loss: what leads along its valley is held, not the ohms of it.
            held = anchored(problem, self.shared, losses, within.theta)
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
            within = self.region.contains(best.theta, _INSIDE)
            if within and best.chi_square <= free.chi_square + _AS_GOOD:
                break
            other = fit(problem, theta, self.region)
            # A fit that ran out of steps outside of physics is the last resort.
            if (not self.region.contains(other.theta, _INSIDE), other.chi_square) < (not within, best.chi_square):
                best = other
        if best.chi_square <= free.chi_square + _AS_GOOD:
            # Where the data leave a direction open, a physical point may explain them as well as one that is not.
            return best, best
        return (free if problem.body.linear else linearised(problem, best)), best

    def _loss(self, found: Fit) -> float:
        """Unread losses in natural sizes, in steps that rounding does not decide."""
        relative = found.theta[self.unknowns.squared] / self.unknowns.scale[self.unknowns.squared]
        return round(float(np.sum(np.abs(relative))), 6)

    def _minimum(self, problem: Problem, free: Fit, best: Fit) -> Minimum:
        return Minimum(problem, free, best, self.region, self.coverage, self._least)

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
        found, side = self._with_others(measure, *self.main.interval(measure))
        if found is None or self._sharing is None:
            return found, side
        wide, side = self.over_shared(measure, found, None)
        return (None, "both") if idle(wide, side, measure) else (wide, side)

    def _with_others(self, measure: Measure, found: Interval | None, side: str) -> tuple[Interval | None, str]:
        """Bounds that hold what other explanations say as well."""
        for other in self.others:
            if found is None:
                break
            value = float(measure.size(other.best.theta))
            room = _BETTER * (found.upper - found.lower) if np.isfinite(found.upper - found.lower) else 0.0
            if found.lower - room <= value <= found.upper + room:
                continue
            there, other_side = other.interval(measure)
            if there is None:
                return None, "both"
            lower, upper = min(found.lower, there.lower, value), max(found.upper, there.upper, value)
            found = replace(found, lower=lower, upper=upper, standard=None)
            side = side if side == other_side else next(s for s in ("lower", "upper") if s in (side, other_side))
        return (None, "both") if found is not None and idle(found, side, measure) else (found, side)

    def over_shared(self, measure: Measure, found: Interval, part: float | None) -> tuple[Interval, str]:
        """Widen bounds to what open mutual resistances may do, within their bounds or a part of sqrt(R1 R2)."""
        assert self._sharing is not None
        return self._sharing.widened(self.main.best, self.main.bounds.posterior, measure, found, part)
