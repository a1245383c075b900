"""Readings some of which were taken with windings standing differently: mutual inductances of their own there."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from mutual.device import Device
from mutual.evidence import Hints, Prediction, Source
from mutual.methods.errors_of_instruments import Choice
from mutual.methods.readings import Item, ReadingsEvidence
from mutual.states import Point, States
from mutual.unknowns import Unknowns

Real = NDArray[np.float64]

# Marks rows in their point; no name of a point has a space at its start.
_MARK = " moved"
# Natural size of a change of M, as part of sqrt(L1 L2): windings move a little, more often than a lot.
_SHIFT = 0.1


@dataclass(frozen=True)
class _Doubled(States):
    """Every set of inductances a second time, for the rows where windings stood differently."""

    def group(self, frequency: float | None, point: Point) -> int:
        """Number of the set of inductances."""
        plain = tuple(item for item in point if item[0] != _MARK)
        return super().group(frequency, plain) + (len(self.inductive) if plain != point else 0)

    def state(self, frequency: float | None, point: Point) -> int:
        """Number of the set of resistances."""
        return super().state(frequency, tuple(item for item in point if item[0] != _MARK))


class MovedEvidence:
    """Evidence whose second half of inductances are *changes*, which hold for the rows that are moved.

    Parameters
    ----------
    device : Device
    items : sequence of Item
    states : States
    choice : Choice
    moved : set of int
        Positions among the items.
    """

    def __init__(
        self, device: Device, items: Sequence[Item], states: States, choice: Choice, moved: frozenset[int]
    ) -> None:
        marked = [
            replace(item, row=replace(item.row, point={**item.row.point, _MARK: 1.0})) if k in moved else item
            for k, item in enumerate(items)
        ]
        doubled = _Doubled(states.apart, states.resistive, states.inductive)
        self._base = ReadingsEvidence(device, marked, doubled, choice)
        self.values, self.noise, self.freedom = self._base.values, self._base.noise, self._base.freedom
        self.rounding, self.labels, self.closed = self._base.rounding, self._base.labels, self._base.closed
        self.sources: Sequence[Source] = self._base.sources
        self.straight = self._base.straight

    def predict(self, unknowns: Unknowns, theta: Real) -> Prediction:
        """Predict all values for unknowns laid out by `doubled`."""
        half = unknowns.groups // 2 * unknowns.entries
        whole = theta.copy()
        whole[half : 2 * half] += theta[:half]
        found = self._base.predict(unknowns, whole)
        jacobian = found.jacobian.copy()
        jacobian[:, :half] += jacobian[:, half : 2 * half]
        return replace(found, jacobian=jacobian)

    def hints(self) -> Hints:
        """Rough impedances, as if nothing had moved."""
        return self._base.hints()


def doubled(unknowns: Unknowns) -> Unknowns:
    """The layout with the changes of all inductances after the inductances."""
    half = unknowns.groups * unknowns.entries
    scale = np.concatenate([unknowns.scale[:half], _SHIFT * unknowns.scale[:half], unknowns.scale[half:]])
    return replace(unknowns, groups=2 * unknowns.groups, scale=scale)


def spread_out(unknowns: Unknowns, vector: NDArray[Any], changes: float | bool) -> NDArray[Any]:
    """A vector (P,) of the plain layout in the doubled one, `changes` in the new places."""
    half = unknowns.groups * unknowns.entries
    return np.concatenate([vector[:half], np.full(half, changes, dtype=vector.dtype), vector[half:]])
