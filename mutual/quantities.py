"""Quantities that people ask for, as functions of the unknowns with exact gradients."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from mutual.unknowns import Unknowns

Real = NDArray[np.float64]


@dataclass(frozen=True)
class Measure:
    """One quantity.

    Attributes
    ----------
    name : str
        As the budget and `[limits]` name it, e.g. "coupling pad latch".
    kind : str
        "entry" (an unknown as it is), "root" (of a squared resistance), "coupling" (signed),
        "short" (L1 - M^2/L2) or "ratio" (M/L1, signed).
    positions : tuple of int
        Unknowns it depends on: (entry) or (own, other, mutual).
    limits : (float, float)
        What physics allows for its magnitude.
    folded : bool
        Whether people ask for the magnitude.
    """

    name: str
    kind: str
    positions: tuple[int, ...]
    limits: tuple[float, float] = (-np.inf, np.inf)
    folded: bool = False

    def value(self, theta: Real) -> Real:
        """Value for unknowns (..., P)."""
        if self.kind == "entry":
            return theta[..., self.positions[0]]
        if self.kind == "root":
            return np.sqrt(np.maximum(theta[..., self.positions[0]], 0.0))
        own, other, m = (theta[..., p] for p in self.positions)
        if self.kind == "coupling":
            return m / np.sqrt(np.abs(own * other))
        if self.kind == "short":
            return own - m * m / other
        return m / own

    @property
    def range(self) -> tuple[float, float]:
        """What physics allows for what people ask for: no magnitude is negative."""
        least, most = self.limits
        return (max(least, 0.0) if self.folded else least), most

    def size(self, theta: Real) -> Real:
        """What people ask for: the magnitude where that is all they ask for."""
        return np.abs(self.value(theta)) if self.folded else self.value(theta)

    def gradient(self, theta: Real) -> Real:
        """Derivatives (P,) by the unknowns."""
        out = np.zeros(len(theta))
        where = list(self.positions)
        if self.kind == "entry":
            out[where] = 1.0
        elif self.kind == "root":
            out[where] = 0.5 / max(float(self.value(theta)), 1e-300)
        else:
            own, other, m = (float(theta[p]) for p in where)
            if self.kind == "coupling":
                root = np.sqrt(abs(own * other))
                out[where] = [-m / root / own / 2, -m / root / other / 2, 1 / root]
            elif self.kind == "short":
                out[where] = [1.0, m * m / other**2, -2 * m / other]
            else:
                out[where] = [-m / own**2, 0.0, 1 / own]
        return out


def self_inductance(u: Unknowns, names: list[str], group: int, i: int) -> Measure:
    """L of winding i, H."""
    return Measure(f"inductance {names[i]}", "entry", (u.inductance(group, i, i),), (0.0, np.inf))


def resistance(u: Unknowns, names: list[str], state: int, i: int) -> Measure:
    """R of winding i at one frequency, ohm."""
    position = u.resistance(state, i, i)
    kind = "root" if u.squared[position] else "entry"
    return Measure(f"resistance {names[i]}", kind, (position,), (0.0, np.inf))


def mutual_resistance(u: Unknowns, names: list[str], state: int, i: int, j: int) -> Measure:
    """Resistance that windings i and j share at one frequency, ohm."""
    return Measure(f"mutual resistance {names[i]} {names[j]}", "entry", (u.resistance(state, i, j),))


@dataclass(frozen=True)
class PairMeasures:
    """The quantities of windings i and j: M (signed), k (signed), and each side's shorted L and ratio."""

    mutual: Measure
    coupling: Measure
    short: tuple[Measure, Measure]
    ratio: tuple[Measure, Measure]


def pair_measures(u: Unknowns, names: list[str], group: int, i: int, j: int) -> PairMeasures:
    """All quantities of a pair that derive from inductances."""
    own, other, m = u.inductance(group, i, i), u.inductance(group, j, j), u.inductance(group, i, j)
    a, b = names[i], names[j]
    return PairMeasures(
        mutual=Measure(f"mutual {a} {b}", "entry", (m,), folded=True),
        coupling=Measure(f"coupling {a} {b}", "coupling", (own, other, m), (0.0, 1.0), folded=True),
        short=(
            Measure(f"short-circuit inductance {a} ({b} shorted)", "short", (own, other, m), (0.0, np.inf)),
            Measure(f"short-circuit inductance {b} ({a} shorted)", "short", (other, own, m), (0.0, np.inf)),
        ),
        ratio=(
            Measure(f"open voltage ratio {b} over {a}", "ratio", (own, other, m), (0.0, np.inf), folded=True),
            Measure(f"open voltage ratio {a} over {b}", "ratio", (other, own, m), (0.0, np.inf), folded=True),
        ),
    )
