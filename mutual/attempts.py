"""Where fits of changed readings start: other losses, other signs, self-inductances that fit the couplings.

Readings with a slip in them lead a fit astray; so does a closed loop, whose reading depends on M by its square.
Resistances of which nothing was read are unknowns as they are here, not squares.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from dataclasses import replace
from itertools import combinations, product

import numpy as np
from numpy.typing import NDArray

from mutual.descent import chi_square
from mutual.engine import Fit, Problem
from mutual.unknowns import Unknowns

Real = NDArray[np.float64]

# Loss of a winding of which none was read, where a fit starts: R/(omega L).
_LOSS = 0.03
_SMALL_LOSS, _LARGE_LOSS = 0.01, 0.15
# A start with windings tighter than this gets the larger self-inductances that make them looser.
_TIGHT, _LOOSER = 0.97, 0.7
# With more pairs of open sign only one is turned round at a time.
_OPEN_SIGNS = 3
_MOST_TURNED = 15
_ROUNDING = 1e-6
_COUPLINGS = (-0.9, -0.6, -0.3, -0.1, 0.1, 0.3, 0.6, 0.9)


def plain_scale(unknowns: Unknowns) -> Real:
    """Natural sizes (P,) with every resistance as it is."""
    return np.where(unknowns.squared, np.sqrt(unknowns.scale), unknowns.scale)


def plain(unknowns: Unknowns, scale: Real) -> Unknowns:
    """The layout with every resistance as it is."""
    every = tuple((True,) * unknowns.windings for _ in unknowns.omegas)
    return replace(unknowns, read=every, scale=scale)


def from_squares(unknowns: Unknowns, theta: Real) -> Real:
    """A vector of unknowns (P,) with every resistance as it is, and those not read not quite nil."""
    least = _LOSS * plain_scale(unknowns)
    return np.where(unknowns.squared, np.maximum(np.sqrt(np.maximum(theta, 0.0)), least), theta)


def turned_up(unread: NDArray[np.bool_], theta: Real) -> Real:
    """Unread resistances made positive: they show by their squares alone."""
    below = unread & (theta < 0)
    return np.where(below, -theta, theta) if below.any() else theta


def with_losses(unknowns: Unknowns, unread: NDArray[np.int64], theta: Real) -> Iterator[Real]:
    """The same with other losses of windings of which none was read: all small, and each larger than the rest.

    Losses that show only in closed loops, by squares and differences, leave several minima.
    """
    if not unread.size:
        return
    for larger in (None, *unread):
        out = theta.copy()
        out[unread] = _SMALL_LOSS * unknowns.scale[unread]
        if larger is not None:
            out[larger] = _LARGE_LOSS * unknowns.scale[larger]
        yield out


def possible(unknowns: Unknowns, inductances: Real) -> bool:
    """Whether no two windings of sets of inductances (groups * entries,) are coupled more tightly than can be."""
    sets = inductances.reshape(unknowns.groups, unknowns.entries)
    own = sets[:, unknowns.first == unknowns.second]
    product_of_two = own[:, unknowns.first] * own[:, unknowns.second]
    return bool(np.all(own > 0) and np.all(sets**2 <= (1 + _ROUNDING) * product_of_two))


def likeliest(problem: Problem, thetas: Iterable[Real], count: int) -> list[Real]:
    """Those of least chi-square as they stand."""
    return sorted(thetas, key=lambda theta: chi_square(problem, theta))[:count]


def made_passive(u: Unknowns, theta: Real) -> Iterator[Real]:
    """A start, and where it is tighter than can be, starts with either self-inductance of the pair raised."""
    yield theta
    for group in range(u.groups):
        for i, j in combinations(range(u.windings), 2):
            own, other, m = (u.inductance(group, *ij) for ij in ((i, i), (j, j), (i, j)))
            tight = abs(theta[m]) / np.sqrt(abs(theta[own] * theta[other]))
            if tight > _TIGHT:
                for raised in (own, other):
                    out = theta.copy()
                    out[raised] *= (tight / _LOOSER) ** 2
                    yield out


def one_by_one(problem: Problem, start: Real, offset: Real | None = None) -> Real:
    """A start in which every coupling that moves, one after another and twice over, was put where chi-square is least.

    Parameters
    ----------
    problem : Problem
    start : (P,) float
    offset : (P,) float, optional
        What is added to unknowns that are changes, to give what they change.
    """
    u, theta = problem.unknowns, start.copy()
    offset = np.zeros_like(theta) if offset is None else offset
    least = chi_square(problem, theta)
    for _ in range(2):
        for group, (i, j) in product(range(u.groups), combinations(range(u.windings), 2)):
            own, other, m = (u.inductance(group, *ij) for ij in ((i, i), (j, j), (i, j)))
            if problem.held[m]:
                continue
            root = np.sqrt(abs((theta[own] + offset[own]) * (theta[other] + offset[other])))
            for kappa in _COUPLINGS:
                tried = theta.copy()
                tried[m] = kappa * root - offset[m]
                found = chi_square(problem, tried)
                if found < least:
                    theta, least = tried, found
    return theta


def turned_round(u: Unknowns, theta: Real) -> Iterator[Real]:
    """The same with the leads of windings exchanged throughout, but for the first winding."""
    pairs = list(combinations(range(u.windings), 2))
    for turned in list(product((1.0, -1.0), repeat=u.windings - 1))[1 : _MOST_TURNED + 1]:
        s = (1.0, *turned)
        yield _signed(u, theta, pairs, [s[i] * s[j] for i, j in pairs])


def other_signs(problem: Problem, found: Fit) -> Iterator[Real]:
    """Vectors with the signs of M reversed that no reading without a closed loop settles."""
    u = problem.unknowns
    pairs = [p for p in combinations(range(u.windings), 2) if not _settled(problem, found, p)]
    if len(pairs) <= _OPEN_SIGNS:
        patterns = list(product((1.0, -1.0), repeat=len(pairs)))[1:]
    else:
        patterns = [tuple(-1.0 if p == q else 1.0 for q in pairs) for p in pairs]
        patterns += [tuple(-1.0 if w in q else 1.0 for q in pairs) for w in range(u.windings)]
    for pattern in patterns:
        yield _signed(u, found.theta, pairs, pattern)


def _settled(problem: Problem, found: Fit, pair: tuple[int, int]) -> bool:
    """Whether the readings without closed loops determine M of a pair in every set of inductances."""
    rows, u = problem.body.straight, problem.unknowns
    slopes = found.prediction.jacobian[rows][:, found.free] * u.scale[found.free]
    slopes = slopes / np.maximum(np.linalg.norm(slopes, axis=1), 1e-300)[:, None]
    values, directions = np.linalg.svd(slopes)[1:]
    known = directions[: int(np.sum(values > 1e-6))]
    for group in range(u.groups):
        unit = (found.free == u.inductance(group, *pair)).astype(float)
        if np.linalg.norm(unit - known.T @ (known @ unit)) > 1e-6:
            return False
    return True


def _signed(u: Unknowns, theta: Real, pairs: Sequence[tuple[int, int]], pattern: Sequence[float]) -> Real:
    out = theta.copy()
    for (i, j), sign in zip(pairs, pattern, strict=True):
        for group in range(u.groups):
            out[u.inductance(group, i, j)] *= sign
        for f, omega in enumerate(u.omegas):
            if omega > 0:
                out[u.resistance(f, i, j)] *= sign
    return out
