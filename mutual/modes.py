"""Signs that the data leave open: other minima of chi-square with M of a pair the other way round."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from itertools import combinations

import numpy as np
from numpy.typing import NDArray

from mutual.engine import OPEN_ABOVE, Pin, fit
from mutual.explain import Explanation
from mutual.quantities import Measure, pair_measures

Real = NDArray[np.float64]

_CERTAIN = 700.0
# A minimum this much higher in chi-square decides the sign at odds far beyond 1000 to 1.
_OUT_OF_REACH = 60.0
_DECIDED = 8.0


@dataclass(frozen=True)
class Modes:
    """What numbers say of the signs.

    Attributes
    ----------
    log_odds : (n, n) float
        ln P(M > 0)/P(M < 0).
    double : (n, n) bool
        Whether a separate minimum with the other sign explains the data about as well.
    """

    log_odds: Real
    double: NDArray[np.bool_]


def sign_modes(explanation: Explanation, names: list[str], group: int) -> Modes:
    """Odds of each sign of M in one set of inductances."""
    n = explanation.unknowns.windings
    odds, double = np.zeros((n, n)), np.zeros((n, n), dtype=bool)
    for i, j in combinations(range(n), 2):
        here = _local(explanation, names, group, i, j)
        place = explanation.unknowns.inductance(group, i, j)
        sign = 1.0 if float(explanation.main.best.theta[place]) >= 0 else -1.0
        other = _other_minimum(explanation, group, i, j, sign)
        value = here
        if other is not None:
            # ln of the ratio of exp(-chi^2/2) at both minima, taken where the local odds are beyond doubt.
            value = sign * min(abs(here), other / 2)
            double[i, j] = double[j, i] = other / 2 < np.log(1000.0)
        odds[i, j] = odds[j, i] = float(np.clip(value, -_CERTAIN, _CERTAIN))
    return Modes(odds, double)


def _measures(explanation: Explanation, names: list[str], group: int, i: int, j: int) -> Iterator[Measure]:
    """Quantities with the sign of M, any of which may be determined where others are not."""
    found = pair_measures(explanation.unknowns, names, group, i, j)
    yield from (found.coupling, found.mutual, *found.ratio)


def _local(explanation: Explanation, names: list[str], group: int, i: int, j: int) -> float:
    """Log odds of M > 0 about the minimum found."""
    posterior, theta = explanation.main.bounds.posterior, explanation.main.free.theta
    for measure in _measures(explanation, names, group, i, j):
        gradient = measure.gradient(theta)
        standard = float(np.sqrt(posterior.contributions(gradient).variance))
        if posterior.determined(gradient) and not posterior.feigned(measure.value, standard):
            value = float(measure.value(theta))
            spread = posterior.spread(posterior.contributions(gradient))
            # The prior of the coupling ends at +-1: what lies beyond counts for neither sign.
            most = 1.0 if measure.kind == "coupling" else np.inf
            nearer = spread.below(most - abs(value)) - spread.below(-abs(value))
            farther = spread.below(-abs(value)) - spread.below(-abs(value) - most)
            odds = np.log(max(nearer, 1e-300)) - np.log(max(farther, 1e-300)) if nearer > 0 else _CERTAIN
            return float(odds if value >= 0 else -odds)
    # Not determined: what stands between here and the other sign is chi-square where M is nil.
    best = explanation.main.best
    coupling = next(iter(_measures(explanation, names, group, i, j)))
    at_nil = fit(explanation.main.problem, best.theta, explanation.region, Pin(coupling, 0.0, 1e-4), steps=25)
    rise = max(at_nil.chi_square - best.chi_square, 0.0)
    return (rise if float(coupling.value(best.theta)) >= 0 else -rise) / 2


def _other_minimum(explanation: Explanation, group: int, i: int, j: int, sign: float) -> float | None:
    """How much higher chi-square is at the best minimum with the other sign; None where there is no other minimum."""
    problem = explanation.main.problem
    if problem.body.linear or _settled(explanation, group, i, j):
        return None
    best = None
    for theta in _flipped(explanation, group, i, j):
        found = fit(problem, theta, explanation.region, steps=25)
        if float(found.theta[explanation.unknowns.inductance(group, i, j)]) * sign < 0:
            rise = max(found.chi_square - explanation.chi_square, 0.0)
            best = rise if best is None else min(best, rise)
            if best < 1e-3:
                break
    return None if best is None or best > _OUT_OF_REACH else best


def _settled(explanation: Explanation, group: int, i: int, j: int) -> bool:
    """Whether the values that are linear in the unknowns decide the sign by themselves: then there is one minimum."""
    body, free = explanation.main.problem.body, explanation.main.free
    rows = body.straight
    if not rows.any():
        return False
    v = (free.whitener @ free.whitener.T)[np.ix_(rows, rows)]
    scale = explanation.unknowns.scale[free.free]
    jacobian = np.linalg.solve(np.linalg.cholesky(v), free.prediction.jacobian[rows][:, free.free] * scale)
    _, s, vt = np.linalg.svd(jacobian, full_matrices=False)
    kept = s > max(1 / OPEN_ABOVE, 1e-11 * float(s.max(initial=0.0)))
    place = explanation.unknowns.inductance(group, i, j)
    unit = (free.free == place).astype(float)
    if float(np.linalg.norm(unit - vt[kept].T @ (vt[kept] @ unit))) > 1e-6:
        return False
    standard = float(np.linalg.norm((vt[kept] @ unit) / s[kept])) * float(explanation.unknowns.scale[place])
    return abs(float(free.theta[place])) > _DECIDED * standard


def _flipped(explanation: Explanation, group: int, i: int, j: int) -> Iterator[Real]:
    """Starts with M_ij reversed: with all of winding j's, with all of winding i's, and alone."""
    u = explanation.unknowns
    theta = explanation.main.best.theta
    for turned in (j, i, None):
        out = theta.copy()
        others = [k for k in range(u.windings) if k != turned] if turned is not None else [j]
        for k in others:
            a = turned if turned is not None else i
            out[u.inductance(group, a, k)] *= -1
            for f in range(len(u.omegas)):
                if u.omegas[f] > 0:
                    out[u.resistance(f, a, k)] *= -1
        yield out
