"""Profile of chi-square: how far a quantity can go while everything else makes the best of it."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtri

from mutual.engine import Fit, Pin, Problem, fit
from mutual.physics import Region
from mutual.posterior import NEAR
from mutual.quantities import Measure

Real = NDArray[np.float64]
_UPRIGHT = 3.0
_HALVINGS, _NO_NEARER = 20, 0.98
# A crossing is near enough when the root of the rise is right to this part.
_CLOSE = 3e-3
# Width of a pin in steps: the fit may rest a little beside it, and is taken where it rests.
_SOFT = 0.03
# A coupling that the data do not keep below this is taken for not determined.
_HARDLY_BOUNDED = 0.9


class Profile:
    """Profiles about one fit.

    Parameters
    ----------
    problem : Problem
    best : Fit
        Minimum within the physical region.
    region : Region
    coverage : float
    """

    def __init__(self, problem: Problem, best: Fit, region: Region, coverage: float) -> None:
        self._problem, self._best, self._region, self._coverage = problem, best, region, coverage

    def of_zero(self, measure: Measure) -> float | None:
        """Upper bound of a coupling whose best value is zero; None where there is hardly any."""
        sign = -1.0 if float(measure.value(self._best.theta)) < 0 else 1.0
        pin = Pin(measure, sign * _HARDLY_BOUNDED, 1e-4)
        pinned = fit(self._problem, self._best.theta, self._region, pin, steps=25)
        if pinned.chi_square - self._best.chi_square < float(ndtri((1 + self._coverage) / 2)) ** 2:
            return None
        return self.crossing(measure, 0.0, 0.05, 1.0)

    def crossing(self, measure: Measure, value: float, step: float, limit: float) -> float | None:
        """Where the profile of chi-square crosses its quantile; None where it never does before the limit.

        The root of the rise is nearly linear in the quantity, so a secant finds the crossing in a few fits.
        """
        wanted = float(ndtri((1 + self._coverage) / 2))
        if abs(value) < NEAR * abs(step) and measure.folded:
            # At zero coupling the other winding's loss loses its meaning: a second degree of freedom is open there.
            wanted = float(np.sqrt(-2 * np.log(1 - self._coverage)))
        sign = -1.0 if float(measure.value(self._best.theta)) < 0 and measure.folded else 1.0
        theta = self._best.theta

        def profile(at: float) -> tuple[float, float, Real]:
            """Where the fit came to rest near `at` (a soft pin converges fast), the root of its rise, its unknowns."""
            return self._pinned(measure, sign, at, value, step, theta)

        near, low, target = value, 0.0, value + 2 * step
        for _ in range(30):
            beyond = (target - limit) * np.sign(step) >= 0
            far, high, moved = profile(limit if beyond else target)
            if high >= wanted:
                break
            if beyond:
                return None
            near, low, theta = far, high, moved
            target = value + (target - value) * float(np.clip(1.1 * wanted / max(high, 1e-9), 1.5, 4.0))
        else:
            return None
        for _ in range(_HALVINGS):
            # A wall of physics stands upright: there only halving comes near it.
            part = 0.5 if high > _UPRIGHT * wanted else float(np.clip((wanted - low) / (high - low), 0.05, 0.95))
            middle, rise, moved = profile(near + (far - near) * part)
            if abs(rise - wanted) < _CLOSE * wanted:
                return middle
            left = abs(far - near)
            if rise > wanted:
                far, high = middle, rise
            else:
                near, low, theta = middle, rise, moved
            # A fit that does not come to rest where it is pinned gets no nearer.
            if abs(far - near) < _CLOSE * abs(far - value) or abs(far - near) > _NO_NEARER * left:
                return far
        return far

    def _pinned(
        self, measure: Measure, sign: float, at: float, value: float, step: float, start: Real
    ) -> tuple[float, float, Real]:
        width = _SOFT * abs(step)
        for _ in range(4):
            pinned = fit(self._problem, start, self._region, Pin(measure, sign * at, width), steps=40)
            reached = sign * float(measure.value(pinned.theta))
            if abs(reached - at) < 0.2 * abs(at - value):
                break
            width /= 30
        return reached, float(np.sqrt(max(pinned.chi_square - self._best.chi_square, 0.0))), pinned.theta
