"""An independent answer for any hookup, by loop currents; it shares nothing with the package under test.

With p the path (a unit flow along windings, +1 from first to second lead) that carries 1 A from one `across` lead to
the other, N the loops of the hookup and Z = R + j omega L, the winding currents are i = p + N y with N' Z i = 0, and
the voltage along any other path s is s' Z i. Nodes never appear, so nothing is lost where Z is nearly singular.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from fractions import Fraction
from typing import Any

import numpy as np

Case = Mapping[str, Any]


def paths(case: Case) -> tuple[np.ndarray, np.ndarray | None, np.ndarray]:
    """Path across (n,), path of the sensed voltage (n,) or None, and the loops (n, loops); entries -1, 0, 1."""
    names = dict.fromkeys(lead for _, a, b in case["windings"] for lead in (a, b))
    node = {lead: i for i, lead in enumerate(names)}
    for a, b in case["tied"]:
        node = {lead: node[a] if n == node[b] else n for lead, n in node.items()}
    count = len(case["windings"])
    # to_root[v] is the flow from node v to the root of its part, grown one winding at a time.
    to_root = {n: np.zeros(count, dtype=int) for n in node.values()}
    part = {n: n for n in node.values()}
    loops = []
    for w, (_, first, second) in enumerate(case["windings"]):
        a, b = node[first], node[second]
        step = np.zeros(count, dtype=int)
        step[w] = 1
        if part[a] == part[b]:
            loops.append(step + to_root[b] - to_root[a])
            continue
        # Hang the part of b below a: from any v there to b, backwards through the winding to a, and on.
        moved, way, drop = to_root[b].copy(), to_root[a].copy(), part[b]
        for v in [v for v, root in part.items() if root == drop]:
            to_root[v] = to_root[v] - moved - step + way
            part[v] = part[a]

    def path(pair: Sequence[str]) -> np.ndarray:
        a, b = (node[lead] for lead in pair)
        if part[a] != part[b]:
            raise ValueError(f"nothing joins {pair}")
        return to_root[a] - to_root[b]

    sense = case.get("sense")
    matrix = np.array(loops, dtype=int).reshape(-1, count).T
    return path(case["across"]), None if sense is None else path(sense), matrix


def currents(case: Case, path: np.ndarray, loops: np.ndarray) -> np.ndarray:
    """Current in every winding, first to second lead, shape (n,), with 1 A through `path`; complex A."""
    z = impedances(case)
    if loops.shape[1] == 0:
        return path.astype(complex)
    return path - loops @ np.linalg.solve(loops.T @ z @ loops, loops.T @ z @ path)


def impedances(case: Case) -> np.ndarray:
    """The matrix R + j omega L (n, n), ohm."""
    return np.asarray(case["R"]) + 2j * math.pi * case["frequency"] * np.asarray(case["L"])


def solve(case: Case) -> tuple[complex, complex | None]:
    """Impedance across and transfer impedance to `sense` (None without), ohm."""
    across, sense, loops = paths(case)
    drop = impedances(case) @ currents(case, across, loops)
    return complex(across @ drop), None if sense is None else complex(sense @ drop)


def solve_exactly(case: Case) -> tuple[complex, complex | None]:
    """The same in rational arithmetic: no rounding but that of omega and of the last step."""
    across, sense = _exactly(case)
    return _rounded(*across), None if sense is None else _rounded(*sense)


def slope_exactly(case: Case, kind: str, i: int, j: int) -> tuple[complex, complex | None]:
    """Derivative of `solve` by kind[i][j] (= kind[j][i]), kind "L" or "R"; per H or per ohm.

    A central difference in rational arithmetic, where a step of 1e-25 of the element costs no digits.
    """
    step = Fraction(1, 10**25) * Fraction(math.sqrt(case[kind][i][i] * case[kind][j][j]))
    moved = []
    for sign in (1, -1):
        matrix = [[Fraction(v) for v in row] for row in case[kind]]
        matrix[i][j] += sign * step
        matrix[j][i] = matrix[i][j]
        moved.append(_exactly({**case, kind: matrix}))
    slopes = [
        None if up is None or down is None else _rounded(*((a - b) / (2 * step) for a, b in zip(up, down, strict=True)))
        for up, down in zip(*moved, strict=True)
    ]
    assert slopes[0] is not None
    return slopes[0], slopes[1]


def _exactly(case: Case) -> tuple[list[Fraction], list[Fraction] | None]:
    """Real and imaginary part of the impedance, and of the transfer impedance."""
    across, sense, loops = paths(case)
    omega = Fraction(2 * math.pi * case["frequency"])
    r = [[Fraction(v) for v in row] for row in case["R"]]
    x = [[omega * Fraction(v) for v in row] for row in case["L"]]
    columns = [[int(c) for c in column] for column in loops.T]
    path = [int(c) for c in across]
    # (N' R N + j N' X N) y = -(N' R p + j N' X p), as one real system of twice the size.
    rr = [[_form(a, r, b) for b in columns] for a in columns]
    xx = [[_form(a, x, b) for b in columns] for a in columns]
    rows = [p + [-v for v in q] for p, q in zip(rr, xx, strict=True)]
    rows += [q + p for p, q in zip(rr, xx, strict=True)]
    y = _eliminate(rows, [-_form(a, z, path) for z in (r, x) for a in columns])
    real, imag = [Fraction(p) for p in path], [Fraction(0)] * len(path)
    for k, column in enumerate(columns):
        real = [a + y[k] * c for a, c in zip(real, column, strict=True)]
        imag = [a + y[len(columns) + k] * c for a, c in zip(imag, column, strict=True)]

    def along(s: list[int]) -> list[Fraction]:
        return [_form(s, r, real) - _form(s, x, imag), _form(s, r, imag) + _form(s, x, real)]

    return along(path), None if sense is None else along([int(c) for c in sense])


def _form(a: Sequence[Any], z: Sequence[Sequence[Fraction]], b: Sequence[Any]) -> Fraction:
    """a' z b, leaving out what is nil."""
    return sum(
        (p * q * z[i][j] for i, p in enumerate(a) if p for j, q in enumerate(b) if q),
        Fraction(0),
    )


def _rounded(real: Fraction, imag: Fraction) -> complex:
    return complex(float(real), float(imag))


def _eliminate(rows: list[list[Fraction]], right: list[Fraction]) -> list[Fraction]:
    """Solve a regular system of fractions (Gauss)."""
    rows = [[*row, value] for row, value in zip(rows, right, strict=True)]
    n = len(rows)
    for i in range(n):
        pivot = next(k for k in range(i, n) if rows[k][i] != 0)
        rows[i], rows[pivot] = rows[pivot], rows[i]
        for k in range(n):
            if k != i and rows[k][i] != 0:
                factor = rows[k][i] / rows[i][i]
                rows[k] = [a - factor * b for a, b in zip(rows[k], rows[i], strict=True)]
    return [rows[i][n] / rows[i][i] for i in range(n)]
