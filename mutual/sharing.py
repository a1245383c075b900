"""Losses that windings share and the data leave open: how far they may carry a quantity."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from mutual.bounds import Interval
from mutual.engine import Fit, Problem
from mutual.nuisance import Shared
from mutual.physics import Region
from mutual.posterior import Posterior
from mutual.profile import Profile
from mutual.quantities import Measure

# Less than this part of a standard uncertainty is not followed.
_NOTABLE = 0.02
# Along a valley that the border of physics ends, a profile stops a little short.
_MARGIN = 1.03


@dataclass(frozen=True)
class Sharing:
    """Mutual resistances that the data leave open, free within their bounds.

    Attributes
    ----------
    problem : Problem
        With those resistances free.
    shared : tuple of Shared
    part : float
        Bound as a fraction of sqrt(R1 R2) where no other is known.
    coverage : float
    """

    problem: Problem
    shared: tuple[Shared, ...]
    part: float
    coverage: float

    def region(self, at: Fit, part: float | None = None) -> Region:
        """The physical region with every open mutual resistance below its bound, or below a part of sqrt(R1 R2)."""
        u = self.problem.unknowns
        limits = []
        for s in self.shared:
            r1, r2 = (abs(float(at.theta[u.resistance(s.state, k, k)])) for k in (s.i, s.j))
            stated = self.part if s.most is None else s.most / max(np.sqrt(r1 * r2), 1e-300)
            limits.append((s.state, s.i, s.j, float(np.clip(stated if part is None else part, 1e-6, 1.0))))
        return Region(u, tuple(limits))

    def widened(
        self, best: Fit, posterior: Posterior, measure: Measure, found: Interval, part: float | None
    ) -> tuple[Interval, str]:
        """Bounds that enclose what the open resistances may do, and which side they bound."""
        region = self.region(best, part)
        standard = found.standard or (found.upper - found.lower) / 4
        if not self._bears(best, posterior, region, measure, standard):
            return found, "both"
        profile = Profile(self.problem, best, region, self.coverage)
        least = max(measure.limits[0], 0.0) if measure.folded else measure.limits[0]
        ends = []
        for step, limit in ((-standard, least), (standard, measure.limits[1])):
            end = profile.crossing(measure, found.value, step, limit)
            ends.append(None if end is None else found.value + _MARGIN * (end - found.value))
        lower, upper = ends
        wide = replace(
            found,
            lower=least if lower is None else max(min(found.lower, lower), least),
            upper=measure.limits[1] if upper is None else min(max(found.upper, upper), measure.limits[1]),
        )
        if (lower is None) == (upper is None):
            return wide, "both"
        return replace(wide, standard=None), "lower" if upper is None else "upper"

    def _bears(self, best: Fit, posterior: Posterior, region: Region, measure: Measure, standard: float) -> bool:
        """Whether an open mutual resistance at its bound would move a quantity notably."""
        u = self.problem.unknowns
        weight = (measure.gradient(best.theta)[best.free] * u.scale[best.free]) @ posterior.gain
        for f, i, j, part in region.shared:
            r1, r2 = (abs(float(best.theta[u.resistance(f, k, k)])) for k in (i, j))
            column = best.prediction.jacobian[:, u.resistance(f, i, j)] * part * np.sqrt(r1 * r2)
            if abs(float(weight @ column)) > _NOTABLE * standard:
                return True
        return False
