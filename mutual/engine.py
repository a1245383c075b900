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
    for _ in range(steps):
        whitened = _whiten(problem, theta, free)
        step = _step(problem, theta, whitened, free, cuts, pin)
        largest = float(np.max(np.abs(step), initial=0.0))
        if cuts is not None and cuts.rows:
            moved = largest >= _CONVERGED
            theta = theta.copy()
            theta[free] += step * problem.unknowns.scale[free]
        else:
            theta, moved = _line_search(problem, theta, step, free, whitened, pin)
        still = float(np.linalg.norm(whitened.jacobian @ step)) < _STILL and largest < _STILL
        fresh = region.violated(theta, cuts) if region is not None and cuts is not None else False
        if (largest < _CONVERGED or still or not moved) and not fresh:
            break
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
    problem: Problem, theta: Real, white: _Whitened, free: NDArray[np.int64], cuts: Cuts | None, pin: Pin | None
) -> Real:
    """Step in natural sizes, within the cuts."""
    scale = problem.unknowns.scale[free]
    jacobian, residual = white.jacobian, white.residual
    if pin is not None:
        jacobian = np.vstack([jacobian, pin.measure.gradient(theta)[free] * scale / pin.width])
        residual = np.append(residual, pin.missing(theta))
    u, s, vt = _determined(jacobian)
    step = vt.T @ ((u.T @ residual) / s)
    if cuts is None or not len(cuts.rows):
        return step
    return cuts.nearest(step, jacobian, theta / problem.unknowns.scale, free)


def _line_search(
    problem: Problem, theta: Real, step: Real, free: NDArray[np.int64], white: _Whitened, pin: Pin | None
) -> tuple[Real, bool]:
    """Halve the step until chi-square, V held, does not grow."""

    def merit(at: Real) -> float:
        prediction = problem.body.predict(problem.unknowns, at)
        r = solve_triangular(white.whitener, problem.body.values - prediction.values, lower=True, check_finite=False)
        extra = 0.0 if pin is None else pin.missing(at)
        return float(r @ r + extra**2)

    if (problem.body.linear and pin is None) or not len(step):
        out = theta.copy()
        out[free] += step * problem.unknowns.scale[free]
        return out, bool(len(step))
    before = float(white.residual @ white.residual) + (0.0 if pin is None else pin.missing(theta) ** 2)
    length = 1.0
    for _ in range(12):
        out = theta.copy()
        out[free] += length * step * problem.unknowns.scale[free]
        after = merit(out)
        if after <= before * (1 + 1e-9) + 1e-12:
            return out, length * float(np.max(np.abs(step))) > _CONVERGED
        length /= 2
    return theta, False


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
