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
from mutual.engine import Fit, Problem, fit
from mutual.evidence import Body, Evidence
from mutual.nuisance import Shared, at_corner, bounded, open_shared
from mutual.physics import Region
from mutual.quantities import Measure
from mutual.start import make_start

Real = NDArray[np.float64]

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
        hidden = open_shared(problem, free)
        if hidden:
            self.shared = [bounded(problem, free, where) for where in hidden]
            problem = problem.holding(np.array([start.unknowns.resistance(*w) for w in hidden]))
            free, best = self._least(problem, start.thetas)
        self.main = self._setting(problem, free, best)
        self._corners: dict[tuple[int, float], Fit] = {}
        self._lossy: list[tuple[float, Setting]] | None = None

    def _least(self, problem: Problem, thetas: Sequence[Real]) -> tuple[Fit, Fit]:
        """Lowest of the fits from all starts; a physical one where others are no better."""
        fits = [fit(problem, theta) for theta in thetas]
        least = min(f.chi_square for f in fits)
        good = [f for f in fits if f.chi_square < least + 1e-3]
        free = next((f for f in good if self.region.contains(f.theta)), good[0])
        return free, self._physical(problem, free)

    def _physical(self, problem: Problem, free: Fit) -> Fit:
        return free if self.region.contains(free.theta) else fit(problem, free.theta, self.region)

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
        if found is None:
            return None, side
        return self._over_shared(measure, found), side

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
        # A self-inductance that nothing shows only sets a scale: it stays, or it would make up for the loss.
        scales = [p for p in self._own_inductances() if not self.main.bounds.posterior.determined(self._unit(p))]
        lossless = self.main.problem.holding(unread)
        lossy = lossless.holding(np.array(scales, dtype=np.int64))
        out: list[tuple[float, Setting]] = []
        allowed = np.inf
        for loss in (0.0, *_LOSSES):
            theta = self.main.free.theta.copy() if not out else out[-1][1].free.theta.copy()
            theta[unread] = loss**2 * self.unknowns.scale[unread]
            starts = [theta]
            if not out:
                starts += [self._with(t, theta, unread) for t in self._flipped(theta)]
            problem = lossy if out else lossless
            free, best = self._least(problem, starts)
            if not out:
                allowed = best.chi_square + 4.0
            elif best.chi_square > allowed:
                break
            out.append((loss, self._setting(problem, free, best)))
        return out

    def _own_inductances(self) -> list[int]:
        u = self.unknowns
        return [u.inductance(g, i, i) for g in range(u.groups) for i in range(u.windings)]

    def _unit(self, position: int) -> Real:
        out = np.zeros(self.unknowns.size)
        out[position] = 1.0
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

    def corner(self, k: int, part: float) -> Fit:
        """The fit with one open mutual resistance at a part of its bound, or of sqrt(R1 R2)."""
        if (k, part) not in self._corners:
            shared = self.shared[k]
            problem = at_corner(self.main.problem, shared, part)
            u = self.unknowns
            theta = self.main.best.theta.copy()
            r1, r2 = (abs(float(theta[u.resistance(shared.state, w, w)])) for w in (shared.i, shared.j))
            most = shared.most if shared.most is not None else float(np.sqrt(r1 * r2))
            theta[u.resistance(shared.state, shared.i, shared.j)] = part * most
            self._corners[k, part] = self._least(problem, [theta])[1]
        return self._corners[k, part]

    @staticmethod
    def _at(measure: Measure, found: Fit) -> float:
        value = float(measure.value(found.theta))
        return float(np.clip(abs(value) if measure.folded else value, *measure.limits))

    def _over_shared(self, measure: Measure, found: Interval) -> Interval:
        """Union over the open mutual resistances: what each end of each does to the value is added."""
        lower, upper = found.lower, found.upper
        for k, shared in enumerate(self.shared):
            size = 1.0 if shared.most is not None else self.part
            ends = [self._at(measure, self.corner(k, part)) for part in (size, -size)]
            lower -= max(found.value - min(ends), 0.0)
            upper += max(max(ends) - found.value, 0.0)
        least = max(measure.limits[0], 0.0) if measure.folded else measure.limits[0]
        return replace(found, lower=max(lower, least), upper=min(upper, measure.limits[1]))
