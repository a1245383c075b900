"""Textbook formulas on the readings as they stand, with the uncertainty that the stated errors give them."""

from __future__ import annotations

import numpy as np

from mutual.collect import Collected
from mutual.joint import Joint
from mutual.methods.readings import ReadingsEvidence
from mutual.methods.textbook import Candidate, find
from mutual.result import Formula, Quantity

_COVERAGE_95 = 1.959964


def formulas(collected: Collected, joint: Joint) -> tuple[Formula, ...]:
    """All formulas that the rows allow, evaluated on what was read."""
    rows = [item.row for item in collected.items]
    evidence = next((p for p in joint.main.main.problem.body.pieces if isinstance(p, ReadingsEvidence)), None)
    if evidence is None:
        return ()
    position = {where: v for v, where in enumerate(evidence.position)}
    many = len(collected.device.windings) > 2
    out = []
    for candidate in find(collected.device, rows):
        values = [rows[r].values[column].value for r, column in candidate.uses]
        mutual, coupling = candidate.evaluate(values)
        if mutual is None and coupling is None:
            continue
        where = [position[use] for use in candidate.uses]
        spread = _spread(candidate, values, _covariance(joint, where))
        name = f"{candidate.name} ({' and '.join(candidate.pair)})" if many else candidate.name
        out.append(Formula(name, candidate.expression, _q(mutual, spread[0]), _q(coupling, spread[1])))
    return tuple(out)


def _covariance(joint: Joint, where: list[int]) -> np.ndarray:
    factor = joint.main.main.free.whitener[where]
    return np.asarray(factor @ factor.T)


def _spread(candidate: Candidate, values: list[float], covariance: np.ndarray) -> tuple[float, float]:
    """Standard uncertainties of M and k by first-order propagation (GUM 5.2.2), derivatives by differences."""
    slopes = np.zeros((2, len(values)))
    for k, value in enumerate(values):
        step = 1e-6 * abs(value) or 1e-12
        ends = []
        for side in (step, -step):
            moved = list(values)
            moved[k] += side
            ends.append(candidate.evaluate(moved))
        for q in (0, 1):
            high, low = ends[0][q], ends[1][q]
            slopes[q, k] = (high - low) / (2 * step) if high is not None and low is not None else 0.0
    squares = np.einsum("qi,ij,qj->q", slopes, covariance, slopes)
    return float(np.sqrt(squares[0])), float(np.sqrt(squares[1]))


def _q(value: float | None, standard: float) -> Quantity | None:
    if value is None:
        return None
    half = _COVERAGE_95 * standard
    return Quantity(value, standard, value - half, value + half)
