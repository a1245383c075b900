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
class Block:
    """One matrix that must be positive semidefinite.

    Attributes
    ----------
    offset : int
        Position of the first unknown of its set.
    matrix : (w, w) float
        In natural sizes.
    windings : (w,) int
    factor : float
        What entries off the diagonal are multiplied by.
    """

    offset: int
    matrix: Real
    windings: NDArray[np.int64]
    factor: float = 1.0


@dataclass(frozen=True)
class Region:
    """Where a passive device can be.

    Attributes
    ----------
    unknowns : Unknowns
    shared : tuple of (state, i, j, part)
        Mutual resistances that stay below a part of sqrt(R1 R2).
    """

    unknowns: Unknowns
    shared: tuple[tuple[int, int, int, float], ...] = ()

    def cuts(self) -> Cuts:
        """A fresh, empty collection."""
        return Cuts()

    def blocks(self, theta: Real) -> list[Block]:
        """Matrices in natural sizes that must be positive semidefinite."""
        u = self.unknowns
        out = []
        relative = theta / u.scale
        everyone = np.arange(u.windings)
        for g in range(u.groups):
            out.append(Block(g * u.entries, u.symmetric(relative[g * u.entries :][: u.entries]), everyone))
        for f in range(len(u.omegas)):
            offset = (u.groups + f) * u.entries
            matrix = u.symmetric(relative[offset : offset + u.entries])
            read = np.array(u.read[f], dtype=bool)
            if u.omegas[f] == 0:
                read = np.zeros_like(read)
            if read.any():
                out.append(Block(offset, matrix[np.ix_(read, read)], everyone[read]))
            out += [Block(offset, matrix[i : i + 1, i : i + 1], everyone[i : i + 1]) for i in everyone[~read]]
        for f, i, j, part in self.shared:
            offset, pair = (u.groups + f) * u.entries, np.array([i, j])
            matrix = u.symmetric(relative[offset : offset + u.entries])[np.ix_(pair, pair)]
            out.append(Block(offset, matrix * np.array([[1.0, 1 / part], [1 / part, 1.0]]), pair, 1 / part))
        return out

    def directions(self, theta: Real) -> list[tuple[float, Real]]:
        """Smallest eigenvalue of each block (natural sizes) and the row (P,) of its derivative."""
        found = []
        for block in self.blocks(theta):
            values, vectors = np.linalg.eigh(block.matrix)
            found.append((float(values[0]), self._row(block, vectors[:, 0])))
        return found

    def violated(self, theta: Real, cuts: Cuts) -> bool:
        """Add a cut for every negative eigenvalue; whether there was any."""
        fresh = False
        for block in self.blocks(theta):
            values, vectors = np.linalg.eigh(block.matrix)
            for value, vector in zip(values, vectors.T, strict=True):
                if value < -TOLERANCE * max(1.0, float(values[-1])):
                    cuts.rows.append(self._row(block, vector))
                    fresh = True
        return fresh

    def contains(self, theta: Real, tolerance: float = TOLERANCE * 10) -> bool:
        """Whether a vector of unknowns is physical."""
        return all(value >= -tolerance for value, _ in self.directions(theta))

    def inside(self, thetas: Real, skipped: frozenset[int] = frozenset()) -> NDArray[np.bool_]:
        """(N,) which of many vectors (N, P) are physical, some of the limits (numbered as in `directions`) left out."""
        u = self.unknowns
        keep = np.ones(len(thetas), dtype=bool)
        relative = thetas / u.scale
        for k, block in enumerate(self.blocks(thetas[0])):
            if k in skipped:
                continue
            windings, entries = block.windings, relative[:, block.offset : block.offset + u.entries]
            matrices = u.symmetric(np.where(u.first == u.second, 1.0, block.factor) * entries)
            matrices = matrices[:, windings[:, None], windings[None, :]]
            if len(windings) <= 2:
                keep &= np.all(np.einsum("nii->ni", matrices) >= 0, axis=1)
                if len(windings) == 2:
                    keep &= matrices[:, 0, 1] ** 2 <= matrices[:, 0, 0] * matrices[:, 1, 1]
            else:
                keep &= np.linalg.eigvalsh(matrices)[:, 0] >= 0
        return keep

    def _row(self, block: Block, vector: Real) -> Real:
        u = self.unknowns
        full = np.zeros(u.windings)
        full[block.windings] = vector
        row = np.zeros(u.size)
        weight = np.where(u.first == u.second, 1.0, 2.0 * block.factor) * full[u.first] * full[u.second]
        row[block.offset : block.offset + u.entries] = weight
        return row
