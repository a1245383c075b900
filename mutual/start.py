"""Starting values: the open-circuit readings are linear in L and R, the rest is tried.

Every hookup without a closed loop gives one linear equation between inductances, whatever its
name in the textbooks (series one way and the other, a tap, a transfer); their least-squares
solution is the textbook's ((La - Lo)/4 and the like). Couplings that only closed loops show
are tried at several sizes.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import product

import numpy as np
from numpy.typing import NDArray

from mutual.circuit import solve
from mutual.evidence import Hints
from mutual.unknowns import Unknowns

Real = NDArray[np.float64]
# Couplings tried for pairs that no open-circuit reading shows.
TRIED = (0.5, 0.95, 0.1)
_SIGN_PATTERNS_UP_TO = 3
_UNEVEN = (5.0, 0.2)
_UNEVEN_UP_TO = 2


@dataclass(frozen=True)
class Start:
    """Layout and vectors to start from.

    Attributes
    ----------
    unknowns : Unknowns
    thetas : list of (P,) float
    """

    unknowns: Unknowns
    thetas: list[Real]


def make_start(hints: Sequence[Hints], windings: int, groups: int, omegas: tuple[float, ...]) -> Start:
    """Layout of the unknowns and vectors to start from.

    Parameters
    ----------
    hints : sequence of Hints
    windings, groups : int
    omegas : tuple of float
        rad/s, one for each set of resistances.
    """
    read = _losses_read(hints, windings, len(omegas))
    shape = Unknowns(windings, groups, omegas, read, np.ones(0))
    sets = [_inductances(hints, g, shape) for g in range(groups)]
    scales = [tries[0][shape.first, shape.second] for tries in sets]
    own = np.sqrt(np.mean([np.diag(tries[0]) ** 2 for tries in sets], axis=0))
    starts, r_scales = [], []
    for f, omega in enumerate(omegas):
        start, scale = _resistances(hints, f, omega, own, shape, np.array(read[f]))
        starts.append(start)
        r_scales.append(scale)
    unknowns = Unknowns(windings, groups, omegas, read, np.concatenate([*scales, *r_scales]))
    blocks = [[matrix[shape.first, shape.second] for matrix in tries[1:]] for tries in sets]
    most = max(len(b) for b in blocks)
    thetas = [np.concatenate([*(b[k % len(b)] for b in blocks), *starts]) for k in range(most)]
    return Start(unknowns, thetas)


def _losses_read(hints: Sequence[Hints], n: int, states: int) -> tuple[tuple[bool, ...], ...]:
    """Whether a resistance of each winding shows in anything read at each frequency."""
    read = np.zeros((states, n), dtype=bool)
    rng = np.random.default_rng(1)
    for h in hints:
        # Currents in a made-up device of middling coupling tell what depends on what.
        kappa = 0.3 * np.eye(n) + 0.2 + 0.02 * rng.standard_normal((n, n))
        made = np.broadcast_to(kappa + kappa.T, (len(h.index), n, n))
        response = solve(h.compiled, h.index, made, 0.01 * made, np.ones(len(h.index)))
        used = np.abs(response.drive * response.adjoint)[:, :n] > 1e-9
        for case in np.flatnonzero(h.shows_loss):
            read[h.state[case]] |= used[case]
    return tuple(tuple(bool(x) for x in row) for row in read)


def _typical(hints: Sequence[Hints]) -> float:
    seen = [np.abs(h.inductance[np.isfinite(h.inductance) & (h.inductance != 0)]) for h in hints]
    every = np.concatenate(seen) if seen else np.zeros(0)
    return float(np.exp(np.mean(np.log(every)))) if every.size else 1.0


def _fill(diagonal: Real, typical: float) -> float:
    known = diagonal[np.isfinite(diagonal)]
    return float(np.exp(np.mean(np.log(known)))) if known.size else typical


def _equations(hints: Sequence[Hints], shape: Unknowns, chosen: str, number: int) -> tuple[Real, Real]:
    """Linear equations of the open-circuit cases of one set: coefficients (e, T) and right sides (e,)."""
    rows, right = [np.zeros((0, shape.entries))], [np.zeros(0)]
    for h in hints:
        wanted = h.group if chosen == "inductance" else h.state
        value = h.inductance if chosen == "inductance" else h.resistance
        mask = (wanted == number) & (h.compiled.loops[h.index] == 0) & np.isfinite(value)
        if chosen == "inductance":
            mask &= h.omega > 0
        index = h.index[mask]
        unit = np.broadcast_to(np.eye(shape.windings), (len(index), shape.windings, shape.windings))
        response = solve(h.compiled, index, unit, unit, np.ones(len(index)))
        rows.append(response.sensitivity(shape.first, shape.second).real.round(6))
        right.append(value[mask])
    return np.concatenate(rows), np.concatenate(right)


def _inductances(hints: Sequence[Hints], group: int, shape: Unknowns) -> list[Real]:
    """Natural sizes as a matrix (n, n), then matrices to start from."""
    rows, right = _equations(hints, shape, "inductance", group)
    diagonal = shape.first == shape.second
    rough = _rough(rows, right, diagonal)
    known = np.where(np.isnan(rough), _fill(rough, _typical(hints)), rough)
    solution, shown = _least_norm(rows, right, known, shape)
    own = np.where(shown[diagonal] & (solution[diagonal] > 0), solution[diagonal], known)
    tries = [np.sqrt(np.outer(own, own))]
    # A sum of two inductances says little of either: it is also split unevenly, one way and the other.
    summed = np.flatnonzero(~shown[diagonal] & (np.abs(rows[:, diagonal]).sum(axis=0) > 0))
    for factor, winding in [(1.0, 0), *product(_UNEVEN, summed[:_UNEVEN_UP_TO])]:
        weight = known.copy()
        weight[winding] *= factor
        solution, shown = _least_norm(rows, right, weight, shape)
        positive = solution[diagonal] > 0
        each = np.where(positive & (shown[diagonal] | (factor != 1.0)), solution[diagonal], known)
        root = np.sqrt(np.outer(each, each))[shape.first, shape.second]
        kappa = np.where(shown, solution, np.nan) / root
        tries += [shape.symmetric(root * filled) for filled in _tries(kappa, diagonal)]
    return tries


def _rough(rows: Real, right: Real, diagonal: NDArray[np.bool_]) -> Real:
    """Rough self-inductances (n,): a winding's own reading, or its share of those it is part of; nan where none."""
    rough = np.full(int(diagonal.sum()), np.nan)
    for coefficients, value in zip(rows, right, strict=True):
        here = np.abs(coefficients[diagonal]) > 0.5
        share = abs(value) / max(here.sum(), 1)
        rough[here] = np.fmax(np.where(share > 0, share, np.nan), np.where(here.sum() == 1, np.nan, rough[here]))
    return rough


def _least_norm(rows: Real, right: Real, known: Real, shape: Unknowns) -> tuple[Real, NDArray[np.bool_]]:
    """Least-norm solution (T,) in natural sizes of the open-circuit equations, and which entries they determine."""
    root = np.sqrt(known[shape.first] * known[shape.second])
    if not len(rows):
        return np.zeros(shape.entries), np.zeros(shape.entries, dtype=bool)
    scaled = rows * root
    size = np.maximum(np.abs(scaled).max(axis=1), 1e-300)
    u, s, vt = np.linalg.svd(scaled / size[:, None])
    rank = int(np.sum(s > 1e-8 * s.max(initial=0.0)))
    fitted = vt[:rank].T @ ((u[:, :rank].T @ (right / size)) / s[:rank]) if rank else np.zeros(shape.entries)
    return fitted * root, np.sum(vt[rank:] ** 2, axis=0) < 1e-12


def _tries(kappa: Real, diagonal: NDArray[np.bool_]) -> list[Real]:
    """Fill in the couplings that no open-circuit reading shows."""
    base = np.where(diagonal, 1.0, kappa)
    hidden = np.flatnonzero(np.isnan(base))
    if not hidden.size:
        return [base]
    patterns = list(product((1.0, -1.0), repeat=min(len(hidden), _SIGN_PATTERNS_UP_TO)))
    if len(hidden) > _SIGN_PATTERNS_UP_TO:
        patterns = [(1.0,) * len(hidden)]
    out = []
    for signs in patterns:
        for size in TRIED:
            filled = base.copy()
            filled[hidden] = size * np.array(signs)
            out.append(filled)
    return out


def _resistances(
    hints: Sequence[Hints], state: int, omega: float, own: Real, shape: Unknowns, read: NDArray[np.bool_]
) -> tuple[Real, Real]:
    """Starting values (T,) and natural sizes (T,) of one set of resistances."""
    rows, right = _equations(hints, shape, "resistance", state)
    diagonal = np.flatnonzero(shape.first == shape.second)
    reactance = omega * own if omega > 0 else np.full(shape.windings, np.nan)
    plain = float(np.median(np.abs(right[right != 0]))) if np.any(right != 0) else 1.0
    fallback = np.where(np.isnan(reactance), plain, reactance / 50)
    found = fallback.copy()
    if len(rows):
        table = rows[:, diagonal]
        shown = np.abs(table).sum(axis=0) > 0
        found[shown] = np.linalg.lstsq(table[:, shown], right, rcond=1e-9)[0]
    small = 1e-6 * np.where(np.isnan(reactance), plain, reactance)
    found = np.where(found > small, found, np.where(np.isnan(reactance), plain, small))
    size = np.where(np.isnan(reactance), found, np.maximum(found, 0.1 * reactance))
    own_scale = np.where(read, size, np.where(np.isnan(reactance), found, reactance) ** 2)
    start, scale = np.zeros(shape.entries), np.sqrt(own_scale[shape.first] * own_scale[shape.second])
    start[diagonal] = np.where(read, found, 0.0)
    return start, scale
