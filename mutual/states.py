"""Which readings share inductances and which share resistances: frequencies and points."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from math import pi
from typing import Any

Point = tuple[tuple[str, Any], ...]

# Stands for a frequency that was left out where nothing depends on it.
NOMINAL_OMEGA = 2 * pi * 1e3


def point_key(point: Mapping[str, Any]) -> Point:
    """A point as something that can be compared."""
    return tuple(sorted(point.items()))


@dataclass(frozen=True)
class States:
    """Numbering of the sets of inductances and of resistances.

    Attributes
    ----------
    apart : bool
        Whether each frequency and point has inductances of its own.
    resistive : tuple of (frequency or None, point)
        Sets of resistances; direct current has one for all points.
    inductive : tuple of (frequency or None, point)
        Sets of inductances; a single one unless `apart`.
    """

    apart: bool
    resistive: tuple[tuple[float | None, Point], ...]
    inductive: tuple[tuple[float | None, Point], ...]

    @property
    def omegas(self) -> tuple[float, ...]:
        """Angular frequency of each set of resistances, rad/s."""
        return tuple(NOMINAL_OMEGA if f is None else 2 * pi * f for f, _ in self.resistive)

    def group(self, frequency: float | None, point: Point) -> int:
        """Number of the set of inductances."""
        if not self.apart or frequency == 0:
            return 0
        return self.inductive.index((frequency, point))

    def state(self, frequency: float | None, point: Point) -> int:
        """Number of the set of resistances."""
        return self.resistive.index((frequency, () if frequency == 0 else point))


def make_states(seen: Iterable[tuple[float | None, Point]], apart: bool) -> States:
    """Number the frequencies and points that were seen, in order of appearance."""
    seen = tuple(dict.fromkeys(seen))
    resistive = tuple(dict.fromkeys((f, () if f == 0 else p) for f, p in seen))
    inductive = tuple((f, p) for f, p in seen if f != 0)
    return States(apart, resistive, inductive if apart and inductive else ((None, ()),))
