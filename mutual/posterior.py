"""What the fit says of the unknowns: linear propagation by named source, and draws within the physical region."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import solve_triangular
from scipy.special import ndtri, stdtrit

from mutual.distribution import Spread
from mutual.engine import Fit, Problem
from mutual.physics import Region

Real = NDArray[np.float64]

# A physical limit matters when it lies within this many standard uncertainties.
NEAR = 6.0
_DETERMINED = 1e-6
_RELATED = 0.05
_DRAWS = 20_000
_ENOUGH = 2_000
_RECTANGLES = 40


@dataclass(frozen=True)
class Contributions:
    """How one quantity depends on every error, one standard deviation each (signed).

    Attributes
    ----------
    noise, rounding : (m,) float
    sources : (s,) float
    """

    noise: Real
    rounding: Real
    sources: Real

    @property
    def variance(self) -> float:
        """Variance of the quantity."""
        return float(np.sum(self.noise**2) + np.sum(self.rounding**2) + np.sum(self.sources**2))


class Posterior:
    """Linearised posterior about a fit.

    Parameters
    ----------
    problem : Problem
    fit : Fit
        Unconstrained.
    region : Region
    """

    def __init__(self, problem: Problem, fit: Fit, region: Region) -> None:
        self.problem, self.fit, self.region = problem, fit, region
        self._own = np.sqrt(problem.body.own_variance(fit.prediction))
        self._rectangular = np.array([s.rectangular for s in problem.body.sources], dtype=bool)

    @cached_property
    def gain(self) -> Real:
        """(Q, m) change of the free unknowns (natural sizes) by each value as read."""
        f = self.fit
        middle = f.vt.T @ (f.u / f.s).T
        return np.asarray(solve_triangular(f.whitener, middle.T, lower=True, trans="T", check_finite=False).T)

    def _scaled(self, gradient: Real) -> Real:
        free = self.fit.free
        return gradient[free] * self.problem.unknowns.scale[free]

    def determined(self, gradient: Real) -> bool:
        """Whether a quantity with this gradient (P,) is determined by the data."""
        g = self._scaled(gradient)
        size = float(np.linalg.norm(g))
        if size == 0:
            return False
        left = g - self.fit.vt.T @ (self.fit.vt @ g)
        return float(np.linalg.norm(left)) < _DETERMINED * size

    @cached_property
    def elsewhere(self) -> Real | None:
        """Another vector that explains the data as well, where they leave inductances open; None where they do not."""
        from mutual.engine import fit as find

        f, u = self.fit, self.problem.unknowns
        entries = len(u.first)
        among = f.free < entries * u.groups
        null = np.eye(len(f.free)) - f.vt.T @ f.vt
        null[:, ~among] = 0.0
        step = null @ (0.3 * np.cos(1.0 + np.arange(len(f.free))))
        if float(np.max(np.abs(step), initial=0.0)) < 1e-3:
            return None
        theta = f.theta.copy()
        theta[f.free] += step * u.scale[f.free]
        # Where the fit is a device that can be, only another that can be speaks against it.
        found = find(self.problem, theta, self.region if self.region.contains(f.theta) else None)
        return found.theta if found.chi_square <= f.chi_square + 0.01 else None

    def feigned(self, value: Callable[[Real], Real], standard: float) -> bool:
        """Whether a quantity only seems determined, its slope being nil where the fit happens to stand."""
        if self.elsewhere is None:
            return False
        here, there = float(value(self.fit.theta)), float(value(self.elsewhere))
        return abs(here - there) > standard + 1e-3 * abs(here)

    def contributions(self, gradient: Real) -> Contributions:
        """How a quantity with this gradient depends on every error."""
        weight = self._scaled(gradient) @ self.gain
        body = self.problem.body
        rounding = weight * body.rounding
        noise = weight * np.sqrt(np.maximum(self._own**2 - body.rounding**2, 0.0))
        return Contributions(noise, rounding, weight @ self.fit.prediction.effects)

    def spread(self, parts: Contributions) -> Spread:
        """Distribution of the error of a quantity."""
        source = parts.sources
        sigma = np.sqrt(np.sum(parts.noise**2) + np.sum(source[~self._rectangular] ** 2))
        halves = np.sqrt(3) * np.abs(np.concatenate([source[self._rectangular], parts.rounding]))
        return Spread(float(sigma), halves[halves > 0])

    def widening(self, parts: Contributions, coverage: float) -> float:
        """Student's t over the normal quantile, for the effective degrees of freedom (GUM G.4, Welch-Satterthwaite)."""
        body = self.problem.body
        freedom = np.concatenate([body.freedom, [s.freedom for s in body.sources]])
        squares = np.concatenate([parts.noise**2, parts.sources**2])
        # Sources of one type A evaluation share their degrees of freedom: their variances add up first.
        total = 0.0
        for degrees in np.unique(freedom[np.isfinite(freedom)]):
            total += float(np.sum(squares[freedom == degrees])) ** 2 / degrees
        if total == 0 or parts.variance == 0:
            return 1.0
        effective = max(parts.variance**2 / total, 1.0)
        return float(stdtrit(effective, (1 + coverage) / 2) / ndtri((1 + coverage) / 2))

    @cached_property
    def _near(self) -> list[Contributions]:
        """Physical limits within reach."""
        found = []
        for value, row in self.region.directions(self.fit.theta):
            gradient = row / self.problem.unknowns.scale
            parts = self.contributions(gradient)
            if self.determined(gradient) and parts.variance > 0 and value < NEAR * np.sqrt(parts.variance):
                found.append(parts)
        return found

    @cached_property
    def _open_limits(self) -> frozenset[int]:
        """Limits that the data do not reach: what they leave open can always give way."""
        rows = enumerate(self.region.directions(self.fit.theta))
        return frozenset(k for k, (_, row) in rows if not self.determined(row / self.problem.unknowns.scale))

    def limited(self, parts: Contributions) -> bool:
        """Whether a physical limit within reach bears on a quantity."""
        for other in self._near:
            shared = parts.sources @ other.sources + parts.noise @ other.noise + parts.rounding @ other.rounding
            if abs(shared) > _RELATED * np.sqrt(parts.variance * other.variance):
                return True
        return False

    @cached_property
    def draws(self) -> Real | None:
        """(N, P) draws of the unknowns within the physical region; None where none could be found."""
        rng = np.random.default_rng(20)
        theta = self.fit.theta
        kept: list[Real] = []
        for _ in range(8):
            every = self._anywhere(rng)
            inside = every[self.region.inside(every, self._open_limits)]
            kept.append(inside)
            if len(inside) > 0.9 * len(every) or sum(map(len, kept)) >= _DRAWS:
                break
        found = np.concatenate(kept)
        if len(found) >= _ENOUGH:
            return found
        return self._walk(rng, theta)

    def _anywhere(self, rng: np.random.Generator) -> Real:
        """Draws of the linear posterior, each with its mirror image."""
        effects = self.fit.prediction.effects
        large = np.sum((self.gain @ effects) ** 2, axis=0) * self._rectangular
        order = np.argsort(large)[::-1][:_RECTANGLES]
        order = order[large[order] > 0]
        rest = np.setdiff1d(np.arange(effects.shape[1]), order)
        own = np.diag(self._own**2) if rest.size == 0 else np.diag(self._own**2) + effects[:, rest] @ effects[:, rest].T
        covariance = self.gain @ own @ self.gain.T
        values, vectors = np.linalg.eigh(covariance)
        factor = vectors * np.sqrt(np.maximum(values, 0.0))
        half = _DRAWS // 2
        errors = rng.standard_normal((half, len(values))) @ factor.T
        errors += (rng.uniform(-np.sqrt(3), np.sqrt(3), (half, len(order)))) @ (self.gain @ effects[:, order]).T
        out = np.tile(self.fit.theta, (2 * half, 1))
        free = self.fit.free
        out[:, free] += np.concatenate([errors, -errors]) * self.problem.unknowns.scale[free]
        return out

    def _walk(self, rng: np.random.Generator, theta: Real) -> Real | None:
        """Elliptical slice sampling (Murray, Adams and MacKay 2010) where few draws fall within the region.

        All errors are taken for normal here: so far outside, the shape of a rectangle is not what matters.
        """
        from mutual.engine import fit as find

        inner = find(self.problem, theta, self.region).theta
        if not self.region.contains(inner):
            return None
        covariance = self.gain @ (self.fit.whitener @ self.fit.whitener.T) @ self.gain.T
        values, vectors = np.linalg.eigh(covariance)
        factor = vectors * np.sqrt(np.maximum(values, 0.0))
        free, scale = self.fit.free, self.problem.unknowns.scale[self.fit.free]
        middle = theta[free] / scale
        # The chains start a trace inside the region: on its border rounding would hold them.
        diagonal = self.problem.unknowns.first == self.problem.unknowns.second
        chains = np.tile(inner, (400, 1))
        blocks = len(inner) // len(diagonal)
        chains[:, np.tile(diagonal, blocks)] *= 1 + 1e-9
        state = chains[:, free] / scale - middle
        kept = []
        for turn in range(80):
            ellipse = rng.standard_normal(state.shape) @ factor.T
            angle = rng.uniform(0, 2 * np.pi, len(state))
            low, high = angle - 2 * np.pi, angle.copy()
            waiting = np.ones(len(state), dtype=bool)
            fresh = state.copy()
            for _ in range(60):
                tried = state * np.cos(angle)[:, None] + ellipse * np.sin(angle)[:, None]
                full = chains.copy()
                full[:, free] = (tried + middle) * scale
                good = waiting & self.region.inside(full, self._open_limits)
                fresh[good] = tried[good]
                waiting &= ~good
                if not waiting.any():
                    break
                low, high = np.where(angle < 0, angle, low), np.where(angle >= 0, angle, high)
                angle = np.where(waiting, rng.uniform(low, high), angle)
            state = fresh
            if turn >= 30:
                full = chains.copy()
                full[:, free] = (state + middle) * scale
                kept.append(full)
        return np.concatenate(kept)

