"""Other explanations of the same readings: devices that explain them as well and are not near the one reported.

A closed loop shows M by its square over an impedance; with few readings quite different devices may show the same.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from mutual.engine import Fit, Problem, fit
from mutual.physics import Region

Real = NDArray[np.float64]

# With this many values left over to test with, a second device that fits by chance is rare.
_TESTED = 2
_TRIES = 16
_AS_GOOD = 0.01
_STEPS = 30
# Two explanations differ where an unknown does by this part of its natural size.
_SAME = 1e-3


def other_explanations(problem: Problem, best: Fit, region: Region, thetas: Sequence[Real]) -> list[Fit]:
    """Fits within physics, found from other starts, that explain the readings as well as the best one does.

    Parameters
    ----------
    problem : Problem
    best : Fit
    region : Region
    thetas : sequence of (P,) float
        Starts made from the readings; others are drawn about them.
    """
    if problem.body.linear or best.degrees_of_freedom >= _TESTED:
        return []
    found: list[Fit] = []
    for theta in [*thetas, *_drawn(problem, best.theta)]:
        other = fit(problem, theta, region, steps=_STEPS)
        if other.chi_square > best.chi_square + _AS_GOOD or not region.contains(other.theta):
            continue
        if not any(_alike(problem, other, f) for f in (best, *found)):
            found.append(other)
    return found


def _alike(problem: Problem, a: Fit, b: Fit) -> bool:
    """Whether two fits are the same device, but for signs."""
    return bool(np.all(np.abs(np.abs(a.theta) - np.abs(b.theta)) < _SAME * problem.unknowns.scale))


def _drawn(problem: Problem, theta: Real) -> list[Real]:
    """Starts all over the place: other sizes of every winding, couplings and losses."""
    u = problem.unknowns
    rng = np.random.default_rng(3)
    own = u.first == u.second
    out = []
    for _ in range(_TRIES):
        drawn = theta.copy()
        for g in range(u.groups):
            block = slice(g * u.entries, (g + 1) * u.entries)
            each = np.abs(theta[block][own]) * 10 ** rng.uniform(-0.8, 0.8, u.windings)
            root = np.sqrt(np.outer(each, each))[u.first, u.second]
            drawn[block] = np.where(own, 1.0, rng.uniform(-0.95, 0.95, u.entries)) * root
        for f in range(len(u.omegas)):
            block = slice((u.groups + f) * u.entries, (u.groups + f + 1) * u.entries)
            loss = 10 ** rng.uniform(-2, 0, u.entries)
            size = np.abs(theta[block]) * 10 ** rng.uniform(-1, 1, u.entries)
            size = np.where(u.squared[block], loss**2 * u.scale[block], size)
            drawn[block] = np.where(own & ~problem.held[block], size, theta[block])
        out.append(drawn)
    return out
