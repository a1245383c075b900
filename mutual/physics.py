"""The physical region: inductances and resistances positive semidefinite, as linear cuts and as a test."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from mutual.unknowns import Unknowns

Real = NDArray[np.float64]

# Eigenvalues in natural sizes that still count as zero.
TOLERANCE = 1e-10
_SMALL = 1e-3


@dataclass
class Cuts:
    """Linear limits rows . (theta/scale) >= 0, collected as steps run into them."""

    rows: list[Real] = field(default_factory=list)

    def nearest(self, step: Real, jacobian: Real, relative: Real, free: NDArray[np.int64]) -> Real:
        """The step closest to `step`, in the metric of chi-square, that keeps all cuts.

        A least-distance problem turned into non-negative least squares (Lawson and Hanson, ch. 23).
        """
        from scipy.linalg import qr, solve_triangular
        from scipy.optimize import nnls

        table = np.array(self.rows)
        stacked = np.vstack([jacobian, _SMALL * np.eye(len(free))])
        r = qr(stacked, mode="economic")[1][: len(free)]
        g = solve_triangular(r.T, table[:, free].T, lower=True).T
        position = relative.copy()
        position[free] += step
        missing = -(table @ position)
        if np.all(missing <= 0):
            return step
        size = np.maximum(np.linalg.norm(g, axis=1), 1e-300)
        g, missing = g / size[:, None], missing / size
        e = np.vstack([g.T, missing])
        f = np.zeros(len(e))
        f[-1] = 1.0
        weights, _ = nnls(e, f)
        left = e @ weights - f
        if abs(left[-1]) < 1e-14:
            return step
        return np.asarray(step + solve_triangular(r, -left[:-1] / left[-1]))


@dataclass(frozen=True)
class Region:
    """Where a passive device can be.

    Attributes
    ----------
    unknowns : Unknowns
    """

    unknowns: Unknowns

    def cuts(self) -> Cuts:
        """A fresh, empty collection."""
        return Cuts()

    def blocks(self, theta: Real) -> list[tuple[int, Real, NDArray[np.int64]]]:
        """Matrices in natural sizes that must be positive semidefinite.

        Returns
        -------
        list of (offset, (w, w) matrix, (w,) windings)
            `offset` is the position of the block's first unknown.
        """
        u = self.unknowns
        out = []
        relative = theta / u.scale
        everyone = np.arange(u.windings)
        for g in range(u.groups):
            out.append((g * u.entries, u.symmetric(relative[g * u.entries :][: u.entries]), everyone))
        for f in range(len(u.omegas)):
            offset = (u.groups + f) * u.entries
            matrix = u.symmetric(relative[offset : offset + u.entries])
            read = np.array(u.read[f], dtype=bool)
            if u.omegas[f] == 0:
                read = np.zeros_like(read)
            if read.any():
                out.append((offset, matrix[np.ix_(read, read)], everyone[read]))
            out += [(offset, matrix[i : i + 1, i : i + 1], everyone[i : i + 1]) for i in everyone[~read]]
        return out

    def directions(self, theta: Real) -> list[tuple[float, Real]]:
        """Smallest eigenvalue of each block (natural sizes) and the row (P,) of its derivative."""
        found = []
        for offset, matrix, windings in self.blocks(theta):
            values, vectors = np.linalg.eigh(matrix)
            found.append((float(values[0]), self._row(offset, vectors[:, 0], windings)))
        return found

    def violated(self, theta: Real, cuts: Cuts) -> bool:
        """Add a cut for every negative eigenvalue; whether there was any."""
        fresh = False
        for offset, matrix, windings in self.blocks(theta):
            values, vectors = np.linalg.eigh(matrix)
            for value, vector in zip(values, vectors.T, strict=True):
                if value < -TOLERANCE * max(1.0, float(values[-1])):
                    cuts.rows.append(self._row(offset, vector, windings))
                    fresh = True
        return fresh

    def contains(self, theta: Real) -> bool:
        """Whether a vector of unknowns is physical."""
        return all(value >= -TOLERANCE * 10 for value, _ in self.directions(theta))

    def inside(self, thetas: Real) -> NDArray[np.bool_]:
        """(N,) which of many vectors (N, P) are physical."""
        u = self.unknowns
        keep = np.ones(len(thetas), dtype=bool)
        relative = thetas / u.scale
        for offset, _, windings in self.blocks(thetas[0]):
            matrices = u.symmetric(relative[:, offset : offset + u.entries])[:, windings[:, None], windings[None, :]]
            if len(windings) <= 2:
                keep &= np.all(np.einsum("nii->ni", matrices) >= 0, axis=1)
                if len(windings) == 2:
                    keep &= matrices[:, 0, 1] ** 2 <= matrices[:, 0, 0] * matrices[:, 1, 1]
            else:
                keep &= np.linalg.eigvalsh(matrices)[:, 0] >= 0
        return keep

    def _row(self, offset: int, vector: Real, windings: NDArray[np.int64]) -> Real:
        u = self.unknowns
        full = np.zeros(u.windings)
        full[windings] = vector
        row = np.zeros(u.size)
        weight = np.where(u.first == u.second, 1.0, 2.0) * full[u.first] * full[u.second]
        row[offset : offset + u.entries] = weight
        return row
