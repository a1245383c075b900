"""A fit of changed readings, and how probable it makes what was read."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from mutual.engine import Fit, Problem, fit
from mutual.joint import IMPROBABLE

Real = NDArray[np.float64]
Ints = NDArray[np.int64]

# Two fits differ where an inductance does by this part of its natural size.
_SAME = 0.02


@dataclass(frozen=True)
class Mended:
    """A physical fit of changed readings.

    Attributes
    ----------
    freedom : float
        Values left over to test with, what is determined but in part counted in part.
    cost : float
        -2 ln of the probability of the readings, all unknowns averaged over a normal prior as wide as their natural
        sizes: what the freedom of an explanation costs is in it.
    """

    problem: Problem
    fit: Fit
    freedom: float
    p_value: float
    cost: float

    @property
    def good(self) -> bool:
        """Whether the readings can be true together."""
        return self.p_value >= IMPROBABLE


def judged(problem: Problem, theta: Real, loose: Ints) -> Mended:
    """Judge unknowns (P,) at a minimum; `loose` are those that show by their squares alone.

    The first piece of evidence are the readings, others are what is usual.
    """
    from scipy.special import chdtrc

    found = fit(problem, theta, steps=0)
    data = len(problem.body.pieces[0].values)
    misfit = float(np.sum(found.residual[:data] ** 2))
    # What the usual losses determine is no freedom of the readings.
    freedom = data - float(np.sum(found.u[:data] ** 2))
    p = float(chdtrc(freedom, misfit)) if freedom > 0.5 else float(misfit < 4)
    # What shows by its square alone is no measure of what an explanation leaves free.
    told = ~np.isin(found.free, loose)
    freed = np.linalg.svd(found.jacobian[:, told], compute_uv=False)
    cost = found.chi_square + 2 * float(np.sum(np.log(np.diag(found.whitener))))
    cost += len(found.residual) * float(np.log(2 * np.pi)) + float(np.sum(np.log1p(freed**2)))
    return Mended(problem, found, freedom, p, cost)


def alike(a: Mended, b: Mended) -> bool:
    """Whether two fits found about the same inductances."""
    u = a.problem.unknowns
    size = u.groups * u.entries
    return bool(np.all(np.abs(a.fit.theta[:size] - b.fit.theta[:size]) < _SAME * u.scale[:size]))
