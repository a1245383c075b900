"""Whitened generalised least squares for the circuit, within what physics allows.

Minimise r' V^-1 r over the unknowns, r = values - predictions, V taken at the *predicted* values
(taken at the measured ones, a common gain would bias the result low: Peelle's puzzle). Steps are
Gauss-Newton in whitened variables by singular values; directions in which the data leave an
unknown open by many times its own size are not followed, and are named afterwards.

Physical limits (inductances and resistances positive semidefinite) are linear cuts w' L w >= 0,
added where a step would violate them; each step then is a least-distance problem (Lawson and
Hanson, Solving Least Squares Problems, ch. 23).
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import solve_triangular

from mutual.evidence import Body, Prediction
from mutual.physics import Cuts, Region
from mutual.quantities import Measure
from mutual.unknowns import Unknowns

Real = NDArray[np.float64]

# A direction is left open when its standard deviation exceeds this many natural sizes of the unknowns.
OPEN_ABOVE = 30.0
_ROUNDING = 1e-11
_STEPS = 60
# A step counts as none when it moves no unknown by this part of its natural size, or the fit by this part of a sigma.
_CONVERGED = 1e-11
_STILL = 1e-7
# Damping of steps that went too far, in units of the least information that counts.
_LEAST_DAMPING, _MOST_DAMPING = 1 / OPEN_ABOVE**2, 1e12
# Tries for each step; a gain in chi-square that is none where a quantity is pinned.
_TRIES, _EASE = 3, 1e-4


@dataclass(frozen=True)
class Pin:
    """A quantity that a fit must keep at a target, to within a small width."""

    measure: Measure
    target: float
    width: float

    def missing(self, theta: Real) -> float:
        """Distance to the target in widths."""
        return (self.target - float(self.measure.value(theta))) / self.width


@dataclass(frozen=True)
class Fit:
    """A minimum of chi-square.

    Attributes
    ----------
    theta : (P,) float
        Unknowns in SI units.
    chi_square : float
    jacobian : (m, Q) float
        Whitened derivatives by the free unknowns, in natural sizes.
    residual : (m,) float
        Whitened.
    whitener : (m, m) float
        Lower Cholesky factor of V.
    prediction : Prediction
    free : (Q,) int
        Positions of the free unknowns.
    u, s, vt : (m, rank), (rank,), (rank, Q) float
        Singular value decomposition of `jacobian`, determined directions only.
    """

    theta: Real
    chi_square: float
    jacobian: Real
    residual: Real
    whitener: Real
    prediction: Prediction
    free: NDArray[np.int64]
    u: Real
    s: Real
    vt: Real

    @property
    def rank(self) -> int:
        """Number of directions that the data determine."""
        return len(self.s)

    @property
    def degrees_of_freedom(self) -> int:
        """Values left over to test with."""
        return len(self.residual) - self.rank


@dataclass(frozen=True)
class Problem:
    """What is fitted: evidence, layout, and which unknowns move.

    Attributes
    ----------
    held : (P,) bool
        Unknowns that keep their starting value.
    """

    body: Body
    unknowns: Unknowns
    held: NDArray[np.bool_]

    def holding(self, positions: NDArray[np.int64]) -> Problem:
        """The same problem with further unknowns held."""
        held = self.held.copy()
        held[positions] = True
        return Problem(self.body, self.unknowns, held)


def fit(
    problem: Problem, start: Real, region: Region | None = None, pin: Pin | None = None, steps: int = _STEPS
) -> Fit:
    """Find the minimum of chi-square next to a starting vector.

    Parameters
    ----------
    problem : Problem
    start : (P,) float
    region : Region, optional
        Physical region to stay in; anywhere if not given.
    pin : Pin, optional
        Equation to keep.
    """
    theta = start.copy()
    free = np.flatnonzero(~problem.held)
    cuts = region.cuts() if region is not None else None
    whitened, damping, fresh, idle = _whiten(problem, theta, free), 0.0, True, 0
    straight = problem.body.linear and pin is None
    for _ in range(_TRIES * steps if steps else 0):
        step = _step(problem, theta, whitened, free, cuts, pin, damping)
        largest = float(np.max(np.abs(step), initial=0.0))
        still = float(np.linalg.norm(whitened.jacobian @ step)) < _STILL and largest < _STILL
        out = theta.copy()
        out[free] += step * problem.unknowns.scale[free]
        gain = np.inf
        # A limit just met may cost chi-square; otherwise a step that does is too long.
        if not (straight or still or (fresh and cuts is not None and cuts.rows)):
            before = _now(whitened, theta, pin)
            gain = before - _merit(problem, whitened, out, pin)
            if gain < -1e-9 * before - 1e-12 and largest >= _CONVERGED and damping < _MOST_DAMPING:
                damping = max(30 * damping, _LEAST_DAMPING)
                continue
        theta, damping = out, damping / 30 if damping > _LEAST_DAMPING else 0.0
        fresh = region.violated(theta, cuts) if region is not None and cuts is not None else False
        idle = idle + 1 if pin is not None and gain < _EASE else 0
        steps -= 1
        if ((largest < _CONVERGED or still or idle > 1 or steps < 1) and not fresh) or steps < -_TRIES:
            break
        whitened = _whiten(problem, theta, free)
    return _finish(problem, theta, free)


@dataclass(frozen=True)
class _Whitened:
    prediction: Prediction
    whitener: Real
    residual: Real
    jacobian: Real


def _whiten(problem: Problem, theta: Real, free: NDArray[np.int64]) -> _Whitened:
    prediction = problem.body.predict(problem.unknowns, theta)
    whitener = problem.body.whitener(prediction)
    scale = problem.unknowns.scale[free]
    stacked = np.column_stack([problem.body.values - prediction.values, prediction.jacobian[:, free] * scale])
    white = solve_triangular(whitener, stacked, lower=True, check_finite=False)
    return _Whitened(prediction, whitener, white[:, 0], white[:, 1:])


def _determined(jacobian: Real) -> tuple[Real, Real, Real]:
    u, s, vt = np.linalg.svd(jacobian, full_matrices=False)
    least = max(1 / OPEN_ABOVE, _ROUNDING * float(s.max(initial=0.0)))
    rank = int(np.sum(s > least))
    return u[:, :rank], s[:rank], vt[:rank]


def _step(
    problem: Problem,
    theta: Real,
    white: _Whitened,
    free: NDArray[np.int64],
    cuts: Cuts | None,
    pin: Pin | None,
    damping: float,
) -> Real:
    """Step in natural sizes, within the cuts."""
    scale = problem.unknowns.scale[free]
    jacobian, residual = white.jacobian, white.residual
    if pin is not None:
        jacobian = np.vstack([jacobian, pin.measure.gradient(theta)[free] * scale / pin.width])
        residual = np.append(residual, pin.missing(theta))
    if damping:
        jacobian = np.vstack([jacobian, np.sqrt(damping) * np.eye(len(free))])
        residual = np.append(residual, np.zeros(len(free)))
    u, s, vt = _determined(jacobian)
    step = vt.T @ ((u.T @ residual) / s)
    if cuts is None or not len(cuts.rows):
        return step
    return cuts.nearest(step, jacobian, theta / problem.unknowns.scale, free)


def _merit(problem: Problem, white: _Whitened, at: Real, pin: Pin | None) -> float:
    """Chi-square of unknowns with V as it is, and what a pin misses."""
    prediction = problem.body.predict(problem.unknowns, at)
    r = solve_triangular(white.whitener, problem.body.values - prediction.values, lower=True, check_finite=False)
    return float(r @ r) + (0.0 if pin is None else pin.missing(at) ** 2)


def _now(white: _Whitened, theta: Real, pin: Pin | None) -> float:
    return float(white.residual @ white.residual) + (0.0 if pin is None else pin.missing(theta) ** 2)


def linearised(problem: Problem, best: Fit) -> Fit:
    """The unconstrained minimum as seen from a fit on the border of physics: one step, nothing evaluated there.

    Where the model is not linear, an unconstrained search beyond the border may end anywhere.
    """
    step = best.vt.T @ ((best.u.T @ best.residual) / best.s)
    theta = best.theta.copy()
    theta[best.free] += step * problem.unknowns.scale[best.free]
    residual = best.residual - best.jacobian @ step
    return replace(best, theta=theta, chi_square=float(residual @ residual), residual=residual)


def _finish(problem: Problem, theta: Real, free: NDArray[np.int64]) -> Fit:
    white = _whiten(problem, theta, free)
    u, s, vt = _determined(white.jacobian)
    return Fit(
        theta=theta,
        chi_square=float(white.residual @ white.residual),
        jacobian=white.jacobian,
        residual=white.residual,
        whitener=white.whitener,
        prediction=white.prediction,
        free=free,
        u=u,
        s=s,
        vt=vt,
    )
