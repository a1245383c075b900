"""What changes of single rows do to chi-square, by updates of low rank: no fit is made.

The model is taken as linear about the contradicting fit. Where no closed loop was read that is exact; elsewhere it
tells which changes are worth a fit.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import solve_triangular

from mutual.joint import Joint

Real = NDArray[np.float64]


class Leverage:
    """Chi-square of changed rows.

    Parameters
    ----------
    joint : Joint
        The fit that contradicts itself.
    counts : sequence of int
        Values of each row.

    Attributes
    ----------
    total : float
        Chi-square with nothing changed.
    without : (rows,) float
        Chi-square without each row.
    """

    def __init__(self, joint: Joint, counts: Sequence[int]) -> None:
        found = joint.main.main.free
        self.fit = found
        ends = np.cumsum(counts)
        self.parts = [np.arange(end - count, end) for end, count in zip(ends, counts, strict=True)]
        unit = np.eye(len(found.residual))
        self.white = solve_triangular(found.whitener, unit, lower=True, check_finite=False)
        self.left = self.white - found.u @ (found.u.T @ self.white)
        self.residual = found.residual - found.u @ (found.u.T @ found.residual)
        self.total = float(self.residual @ self.residual)
        self.without = np.array([self._freed(self.left[:, part]) for part in self.parts])

    def _freed(self, columns: Real) -> float:
        """Chi-square when the readings may be changed along columns (m, c)."""
        weight, _, _, _ = np.linalg.lstsq(columns, self.residual, rcond=1e-9)
        rest = self.residual - columns @ weight
        return float(rest @ rest)

    def exchanged(self, values: Sequence[Real], first: int, second: int) -> float:
        """Chi-square with the values of two rows exchanged."""
        a, b = self.parts[first], self.parts[second]
        change = values[second] - values[first]
        rest = self.residual + self.left[:, a] @ change - self.left[:, b] @ change
        return float(rest @ rest)

    def shows(self, joint: Joint, winding: int) -> list[bool]:
        """Whether the place of a winding bears on each row."""
        j = np.abs(self.fit.prediction.jacobian[:, self._couplings(joint, winding)]).sum(axis=1)
        return [bool(np.any(j[part] > 0)) for part in self.parts]

    def moves(self, joint: Joint, winding: int) -> list[float]:
        """Chi-square with the couplings of a winding changed from each row on."""
        columns = self._couplings(joint, winding)
        slopes = self.fit.prediction.jacobian[:, columns] * joint.main.unknowns.scale[columns]
        changed, out = np.zeros_like(slopes), []
        for part in reversed(self.parts):
            changed = changed + self.left[:, part] @ slopes[part]
            gain = changed.T @ self.residual
            out.append(self.total - float(gain @ np.linalg.pinv(changed.T @ changed, rcond=1e-9) @ gain))
        return out[::-1]

    def _couplings(self, joint: Joint, winding: int) -> list[int]:
        u = joint.main.unknowns
        others = [k for k in range(u.windings) if k != winding]
        return [u.inductance(g, winding, k) for g in range(u.groups) for k in others]
