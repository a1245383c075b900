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
# That of R/(omega L): inductances alone are read of windings that have some Q, resistances of poorer ones too.
_UNREAD, _READ = 0.3, 2.0
_LEAST = 1e-3


class UsualLosses:
    """Mutual resistances are about nil, give or take half of sqrt(R1 R2), and resistances no larger than omega L.

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
        states = [f for f, omega in enumerate(unknowns.omegas) if omega > 0]
        own = [(f, i) for f in states for i in range(unknowns.windings)]
        self._own = np.array([unknowns.resistance(f, i, i) for f, i in own], dtype=np.int64)
        reactance = [unknowns.omegas[f] * unknowns.scale[unknowns.inductance(0, i, i)] for f, i in own]
        self._reactance: Real = np.array(reactance, dtype=float)
        self._shared = [
            tuple(unknowns.resistance(f, *ij) for ij in ((i, i), (j, j), (i, j)))
            for f in range(len(unknowns.omegas))
            for i, j in combinations(range(unknowns.windings), 2)
            if not held[unknowns.resistance(f, i, j)]
        ]
        count = len(own) + len(self._shared)
        widths = np.where(np.isin(self._own, unread), _UNREAD, _READ)
        self.values: Real = np.zeros(count)
        self.noise: Real = np.concatenate([widths, np.full(len(self._shared), _SHARED)])
        self.freedom: Real = np.full(count, np.inf)
        self.rounding: Real = np.zeros(count)
        self.sources: Sequence[Source] = ()
        self.labels: Sequence[str] = ("usual losses",) * count
        self.straight = np.ones(count, dtype=bool)
        self.closed = False

    def predict(self, unknowns: Unknowns, theta: Real) -> Prediction:
        """R/(omega L), and Rm/sqrt(R1 R2), which is not to pull at R1 and R2 themselves."""
        jacobian = np.zeros((len(self.values), unknowns.size))
        jacobian[np.arange(len(self._own)), self._own] = 1 / self._reactance
        for k, (own, other, m) in enumerate(self._shared, len(self._own)):
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
