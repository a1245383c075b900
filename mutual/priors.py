"""What is known of losses before anything is read, as a piece of evidence."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import combinations

import numpy as np
from numpy.typing import NDArray

from mutual.evidence import Hints, Prediction, Source
from mutual.unknowns import Unknowns

Real = NDArray[np.float64]

# Standard deviation of Rm/sqrt(R1 R2): physics allows -1 to 1, and small values are usual.
_SHARED = 0.5
# That of R/(omega L) of a winding whose loss nobody read: an inductance alone is read of windings that have some Q.
_OWN = 0.3
_LEAST = 1e-3


class UsualLosses:
    """Mutual resistances are about nil, give or take half of sqrt(R1 R2), and resistances not read are small.

    Where the readings determine them, that does not matter; where they do not, it keeps a fit among devices that
    there are.

    Parameters
    ----------
    unknowns : Unknowns
        Every resistance as it is, not as its square.
    held : (P,) bool
        Unknowns that do not move.
    unread : (U,) int
        Resistances of which nothing was read.
    """

    def __init__(self, unknowns: Unknowns, held: NDArray[np.bool_], unread: NDArray[np.int64]) -> None:
        self._unread = unread
        self._entries = [
            tuple(unknowns.resistance(f, *ij) for ij in ((i, i), (j, j), (i, j)))
            for f in range(len(unknowns.omegas))
            for i, j in combinations(range(unknowns.windings), 2)
            if not held[unknowns.resistance(f, i, j)]
        ]
        count = len(unread) + len(self._entries)
        self.values: Real = np.zeros(count)
        self.noise: Real = np.repeat([_OWN, _SHARED], [len(unread), len(self._entries)])
        self.freedom: Real = np.full(count, np.inf)
        self.rounding: Real = np.zeros(count)
        self.sources: Sequence[Source] = ()
        self.labels: Sequence[str] = ("usual losses",) * count
        self.straight = np.ones(count, dtype=bool)
        self.closed = False

    def predict(self, unknowns: Unknowns, theta: Real) -> Prediction:
        """Losses by their natural sizes, shared ones by sqrt(R1 R2); that is not to pull at R1 and R2 themselves."""
        jacobian = np.zeros((len(self.values), unknowns.size))
        first = len(self._unread)
        jacobian[np.arange(first), self._unread] = 1 / unknowns.scale[self._unread]
        for k, (own, other, m) in enumerate(self._entries, first):
            one, two = (max(abs(float(theta[p])), _LEAST * float(unknowns.scale[p])) for p in (own, other))
            jacobian[k, m] = 1 / np.sqrt(one * two)
        values = jacobian @ theta
        return Prediction(values, jacobian, np.zeros((len(values), 0)))

    def hints(self) -> Hints:
        """It has none.

        Raises
        ------
        NotImplementedError
        """
        raise NotImplementedError
