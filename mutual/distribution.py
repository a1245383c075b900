"""Distribution of a sum of one normal and several rectangular errors, and intervals from it.

A Monte Carlo of a linear sum (JCGM 101) is replaced by the convolution itself, which has no
scatter: every rectangle turns a distribution function F into (I(x + a) - I(x - a))/(2a), I its integral.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtr, ndtri

Real = NDArray[np.float64]

_POINTS = 2001
# Rectangles whose variance is less than this part of the whole cannot be told from a normal.
_SMALL_SHARE = 0.02
_MOST = 24
_FLATNESS = 2e-3


@dataclass(frozen=True)
class Spread:
    """Distribution of an error about zero, symmetric.

    Attributes
    ----------
    sigma : float
        Standard deviation of the normal part.
    halves : (r,) float
        Half widths of the rectangles.
    """

    sigma: float
    halves: Real

    @property
    def standard(self) -> float:
        """Standard uncertainty of the whole."""
        return float(np.sqrt(self.sigma**2 + np.sum(self.halves**2) / 3))

    @cached_property
    def _reduced(self) -> tuple[float, Real]:
        """Normal part and the rectangles that matter, both relative to the whole."""
        whole = self.standard
        if whole == 0:
            return 0.0, np.zeros(0)
        share = self.halves**2 / 3 / whole**2
        # Excess kurtosis of a rectangle is -1.2: below the limit the sum is as good as normal.
        if 1.2 * float(np.sum(share**2)) < _FLATNESS:
            return 1.0, np.zeros(0)
        order = np.argsort(share)[::-1][:_MOST]
        kept = order[share[order] > _SMALL_SHARE]
        rest = 1 - float(np.sum(share[kept]))
        return float(np.sqrt(max(rest, 0.0))), self.halves[kept] / whole

    @cached_property
    def table(self) -> tuple[Real, Real]:
        """Points in standard uncertainties and the distribution function there."""
        sigma, halves = self._reduced
        reach = 9 * sigma + float(halves.sum())
        x = np.linspace(-1.05 * reach, 1.05 * reach, _POINTS)
        if sigma > 1e-3:
            f = ndtr(x / sigma)
        else:
            f = np.clip(0.5 + x / (2 * halves[0]), 0.0, 1.0) if len(halves) else np.where(x < 0, 0.0, 1.0)
            halves = halves[1:]
        step = x[1] - x[0]
        for a in halves:
            integral = np.concatenate([[0.0], np.cumsum((f[1:] + f[:-1]) / 2) * step])

            def at(y: Real, integral: Real = integral) -> Real:
                inside = np.interp(y, x, integral)
                return np.where(y > x[-1], integral[-1] + (y - x[-1]), inside)

            f = (at(x + a) - at(x - a)) / (2 * a)
        return x, np.clip(f, 0.0, 1.0)

    def half_width(self, coverage: float) -> float:
        """Half width of the interval about zero with the given coverage probability."""
        halves = self._reduced[1]
        if not len(halves):
            return float(ndtri((1 + coverage) / 2)) * self.standard
        x, f = self.table
        middle = len(x) // 2
        return float(np.interp((1 + coverage) / 2, f[middle:], x[middle:])) * self.standard

    def below(self, limit: float) -> float:
        """Probability that the error is below a limit."""
        whole = self.standard
        if whole == 0:
            return float(limit > 0)
        halves = self._reduced[1]
        if not len(halves):
            return float(ndtr(limit / whole))
        x, f = self.table
        return float(np.interp(limit / whole, x, f, left=0.0, right=1.0))

    def folded(self, value: float, coverage: float, most: float) -> tuple[float, float]:
        """Shortest region of the magnitude of value + error, restricted to at most `most`."""
        x, f = self.table
        whole = self.standard
        grid = np.linspace(0.0, min(most, abs(value) + float(x[-1]) * whole), 4 * _POINTS)

        def cdf(y: Real) -> Real:
            return np.interp((y - abs(value)) / whole, x, f, left=0.0, right=1.0)

        inside = cdf(grid) - cdf(-grid)
        total = float(inside[-1])
        if total <= 0:
            return 0.0, float(grid[-1])
        return shortest(grid, inside / total, coverage)


def shortest(grid: Real, f: Real, coverage: float) -> tuple[float, float]:
    """Shortest interval that holds `coverage` of a distribution function f on a grid."""
    upper = np.interp(np.minimum(f + coverage, 1.0), f, grid)
    width = np.where(f + coverage <= 1.0 + 1e-12, upper - grid, np.inf)
    k = int(np.argmin(width))
    return float(grid[k]), float(upper[k])


def shortest_of_draws(values: Real, coverage: float) -> tuple[float, float, bool, bool]:
    """Shortest interval with `coverage` of the draws, and whether it reaches the lowest and the highest of them."""
    ordered = np.sort(values)
    count = min(max(int(np.ceil(coverage * len(ordered))), 1), len(ordered))
    width = ordered[count - 1 :] - ordered[: len(ordered) - count + 1]
    k = int(np.argmin(width))
    edge = max(len(ordered) // 500, 1)
    return float(ordered[k]), float(ordered[k + count - 1]), k <= edge, k + count >= len(ordered) - edge
