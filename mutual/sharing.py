"""Losses that windings share and the data leave open: how far they may carry a quantity."""

from __future__ import annotations

from dataclasses import dataclass, field, replace

import numpy as np
from scipy.special import ndtri

from mutual.bounds import Interval
from mutual.engine import Fit, Problem
from mutual.nuisance import Shared
from mutual.physics import Region
from mutual.posterior import Posterior
from mutual.quantities import Measure
from mutual.valleys import Valleys
from mutual.walking import Station, enclosed, turning

# Less than this part of a standard uncertainty is not followed.
_NOTABLE = 0.02


@dataclass(frozen=True)
class Sharing:
    """Mutual resistances that the data leave open, free within their bounds.

    Attributes
    ----------
    problem : Problem
        With those resistances free.
    shared : tuple of Shared
    losses : tuple of (state, winding)
        Losses that the data leave open with them.
    part : float
        Bound as a fraction of sqrt(R1 R2) where no other is known.
    coverage : float
    """

    problem: Problem
    shared: tuple[Shared, ...]
    losses: tuple[tuple[int, int], ...]
    part: float
    coverage: float
    _known: dict[float | None, list[Station]] = field(default_factory=dict, compare=False)

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
        region, scale = self.region(best, part), self.problem.unknowns.scale
        here = float(np.sqrt(posterior.contributions(measure.gradient(best.theta)).variance))
        if not self._bears(best, posterior, region, measure, here or (found.upper - found.lower) / 4):
            return found, "both"
        low, high = found.lower, found.upper
        stations = self._stations(best, region, part)
        values = turning(stations, np.array([float(measure.size(s.fit.theta)) for s in stations]))[0]
        for station, value in zip(stations, values.tolist(), strict=True):
            left = np.sqrt(max(1 - (station.rise / self._wanted) ** 2, 0.0))
            wide = left * station.standard(measure, scale) / here if here > 0 else left
            low = min(low, value - wide * (found.value - found.lower))
            high = max(high, value + wide * (found.upper - found.value))
        return enclosed(replace(found, lower=low, upper=high), measure)

    @property
    def _wanted(self) -> float:
        return float(ndtri((1 + self.coverage) / 2))

    def _stations(self, best: Fit, region: Region, part: float | None) -> list[Station]:
        if part not in self._known:
            valleys = Valleys(self.problem, self.shared, self.losses, best, region, self._wanted)
            self._known[part] = valleys.stations()
        return self._known[part]

    def _bears(self, best: Fit, posterior: Posterior, region: Region, measure: Measure, standard: float) -> bool:
        """Whether an open mutual resistance at its bound would move a quantity notably."""
        u = self.problem.unknowns
        weight = (measure.gradient(best.theta)[best.free] * u.scale[best.free]) @ posterior.gain
        for f, i, j, part in region.shared:
            if u.resistance(f, i, j) in best.free:
                return True
            r1, r2 = (abs(float(best.theta[u.resistance(f, k, k)])) for k in (i, j))
            column = best.prediction.jacobian[:, u.resistance(f, i, j)] * part * np.sqrt(r1 * r2)
            if abs(float(weight @ column)) > _NOTABLE * standard:
                return True
        return False
