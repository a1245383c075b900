"""Damped least squares for many fits that resemble one another: quick, and never lost far from the minimum.

Levenberg and Marquardt: (J' J + d I) step = J' r in natural sizes, the damping d raised until chi-square falls. The
least damping keeps directions that the readings leave open where they are. A fit that gets nowhere is given up.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import cho_factor, cho_solve, solve_triangular

from mutual.engine import OPEN_ABOVE, Problem
from mutual.evidence import Prediction

Real = NDArray[np.float64]

_LEAST_DAMPING = 1 / OPEN_ABOVE**2
_MOST_DAMPING = 1e12
# A gain in chi-square below this, or below that part of it, is the end; the larger part holds far from any agreement.
_GAIN, _GAIN_PART, _HOPELESS_PART = 1e-4, 1e-3, 0.04
_HOPELESS = 30.0
# No step leads to couplings beyond this, where no device is; a little room for errors of tight pairs.
_TIGHTEST = 1.05


@dataclass(frozen=True)
class Descent:
    """Where a descent ended: unknowns (P,) and chi-square."""

    theta: Real
    chi_square: float


def chi_square(problem: Problem, theta: Real) -> float:
    """Chi-square of unknowns as they stand."""
    prediction = problem.body.predict(problem.unknowns, theta)
    white = _white(problem, problem.body.whitener(prediction), prediction)
    return float(white @ white)


def descend(problem: Problem, start: Real, steps: int, patient: bool = False) -> Descent:
    """Go to the minimum of chi-square below a vector of unknowns, or as far as `steps` lead.

    Parameters
    ----------
    problem : Problem
    start : (P,) float
    steps : int
        Most predictions made.
    patient : bool
        Whether to go on where gains are small although chi-square is still large.
    """
    free = np.flatnonzero(~problem.held)
    scale = problem.unknowns.scale[free]
    theta, damping = start, _LEAST_DAMPING
    tightest = max(_tightness(problem, theta), _TIGHTEST)
    prediction = problem.body.predict(problem.unknowns, theta)
    whitener = problem.body.whitener(prediction)
    residual = _white(problem, whitener, prediction)
    hopeless = np.inf if patient else _HOPELESS * len(residual)
    while steps > 0:
        slope = prediction.jacobian[:, free] * scale
        jacobian = solve_triangular(whitener, slope, lower=True, check_finite=False)
        normal, gradient = jacobian.T @ jacobian, jacobian.T @ residual
        before = float(residual @ residual)
        accepted = False
        while steps > 0 and damping < _MOST_DAMPING:
            try:
                factor = cho_factor(normal + damping * np.eye(len(free)), check_finite=False)
            except np.linalg.LinAlgError:
                damping *= 30
                continue
            step = cho_solve(factor, gradient)
            expected = float(step @ (2 * gradient - normal @ step))
            if expected < _least_gain(before, hopeless):
                return Descent(theta, before)
            tried = theta.copy()
            tried[free] += step * scale
            steps -= 1
            if _tightness(problem, tried) <= tightest:
                prediction = problem.body.predict(problem.unknowns, tried)
                merit = _white(problem, whitener, prediction)
                if float(merit @ merit) < before:
                    accepted = True
                    break
            damping *= 30
        if not accepted:
            return Descent(theta, before)
        theta, damping = tried, max(damping / 30, _LEAST_DAMPING)
        whitener = problem.body.whitener(prediction)
        residual = _white(problem, whitener, prediction)
        after = float(residual @ residual)
        if abs(before - after) < _least_gain(after, hopeless):
            return Descent(theta, after)
    return Descent(theta, float(residual @ residual))


def _least_gain(chi_square: float, hopeless: float) -> float:
    """A gain in chi-square that is worth a further step."""
    return max(_GAIN, (_HOPELESS_PART if chi_square > hopeless else _GAIN_PART) * chi_square)


def _white(problem: Problem, whitener: Real, prediction: Prediction) -> Real:
    return np.asarray(
        solve_triangular(whitener, problem.body.values - prediction.values, lower=True, check_finite=False)
    )


def _tightness(problem: Problem, theta: Real) -> float:
    """Largest coupling; infinite where a self-inductance is not positive, from where no step leads back."""
    u = problem.unknowns
    blocks = theta[: u.groups * u.entries].reshape(u.groups, u.entries)
    own = np.zeros((u.groups, u.windings))
    own[:, u.first[u.first == u.second]] = blocks[:, u.first == u.second]
    if np.any(own <= 0):
        return float(np.inf)
    apart = u.first != u.second
    product = own[:, u.first[apart]] * own[:, u.second[apart]]
    return float(np.sqrt(np.max(blocks[:, apart] ** 2 / product, initial=0.0)))
