"""What the data leave open of the losses, and how the bounds enclose it.

Two nuisances: losses that two windings share (mutual resistance Rm), bounded by the
resistances where the data do not determine it; and the resistance of a winding of which nothing
was read, which may be anything from zero upward. The value reported has the least of either; the
bounds are the union over the extremes.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from mutual.engine import Fit, Problem
from mutual.evidence import Body
from mutual.physics import Region
from mutual.posterior import Posterior
from mutual.stated import LossAt, SizesAbout, Stated
from mutual.unknowns import Unknowns


@dataclass(frozen=True)
class Shared:
    """One mutual resistance that the data leave open.

    Attributes
    ----------
    state, i, j : int
        Set of resistances and windings.
    most : float or None
        Bound in ohm where the losses above direct current are known (Rm^2 <= dR1 dR2), else None:
        the fraction of sqrt(R1 R2) holds.
    """

    state: int
    i: int
    j: int
    most: float | None


def open_shared(problem: Problem, fit: Fit) -> list[tuple[int, int, int]]:
    """Mutual resistances (state, i, j) that the data do not tell from the bounds of a passive device.

    One counts as determined when its standard uncertainty is below sqrt(R1 R2), what physics allows it anyway.
    """
    u = problem.unknowns
    posterior = Posterior(problem, fit, Region(u))
    found = []
    for f in range(len(u.omegas)):
        for i in range(u.windings):
            for j in range(i + 1, u.windings):
                m = u.resistance(f, i, j)
                if problem.held[m]:
                    continue
                gradient = np.zeros(u.size)
                gradient[m] = 1.0
                r1, r2 = (float(fit.theta[u.resistance(f, k, k)]) for k in (i, j))
                root = np.sqrt(max(r1 * r2, 0.0))
                sure = posterior.determined(gradient)
                if not sure or posterior.contributions(gradient).variance > root**2:
                    found.append((f, i, j))
    return found


def holding(problem: Problem, stated: Stated) -> Problem:
    """The problem with a nuisance held."""
    return Problem(Body((*problem.body.pieces, stated)), problem.unknowns, problem.held)


def with_sizes(problem: Problem, fit: Fit) -> Problem:
    """The problem with the self-inductances that the data leave open about where they are in a fit."""
    u = problem.unknowns
    posterior = Posterior(problem, fit, Region(u))
    every = [u.inductance(g, i, i) for g in range(u.groups) for i in range(u.windings)]
    positions = np.array([p for p in every if not posterior.determined(np.eye(u.size)[p])], dtype=np.int64)
    if not positions.size:
        return problem
    return holding(problem, SizesAbout(positions, fit.theta, u.scale))


def bounded(problem: Problem, fit: Fit, where: tuple[int, int, int]) -> Shared:
    """The bound of an open mutual resistance, from the losses above direct current where those are known."""
    f, i, j = where
    u = problem.unknowns
    if 0.0 not in u.omegas:
        return Shared(f, i, j, None)
    direct = u.omegas.index(0.0)
    posterior = Posterior(problem, fit, Region(u))
    excess = []
    for k in (i, j):
        gradient = np.zeros(u.size)
        gradient[u.resistance(f, k, k)], gradient[u.resistance(direct, k, k)] = 1.0, -1.0
        if not u.read[direct][k] or not posterior.determined(gradient):
            return Shared(f, i, j, None)
        spread = np.sqrt(posterior.contributions(gradient).variance)
        excess.append(max(float(gradient @ fit.theta), 0.0) + 2 * spread)
    return Shared(f, i, j, float(np.sqrt(excess[0] * excess[1])))


def with_loss(problem: Problem, unread: NDArray[np.int64], ratio: float) -> Problem:
    """The problem with the unread resistances at a part of omega L."""
    return holding(problem, LossAt(places_of(problem.unknowns, unread), ratio))


def places_of(unknowns: Unknowns, positions: NDArray[np.int64]) -> list[tuple[int, int]]:
    """(state, winding) of resistances given by their positions."""
    every = [(f, i) for f in range(len(unknowns.omegas)) for i in range(unknowns.windings)]
    return [(f, i) for f, i in every if unknowns.resistance(f, i, i) in positions]
