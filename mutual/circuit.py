"""Coupled windings in any hookup: impedance, transfer and their exact sensitivities.

The windings are branches with the impedance matrix ``Z = R + j omega L``; leads joined by
ties are one node; one node of every floating part is grounded. With node voltages v and
branch currents i, Kirchhoff's laws for a current of 1 A into the first lead are the
symmetric system ::

    [ 0    A ] [v]   [J]
    [ A^T -Z ] [i] = [0]

(modified nodal analysis: it needs no inverse of Z, so ideal coupling is no special case).
A second right-hand side with 1 A at the sensed leads gives the adjoint currents i', and
with them ``dZ/dZ_mn = i_m i'_n`` exactly, because the system is symmetric.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from mutual.device import Device, Hookup, merged_nodes

Real = NDArray[np.float64]
Complex = NDArray[np.complex128]

# Where direct current meets a loop without resistance nothing divides the current: a trace of it does.
_LEAST_RESISTANCE = 1e-13


@dataclass(frozen=True)
class Compiled:
    """Hookups as arrays, padded to one size. H hookups, N nodes, B branches (windings, then ties with impedance).

    Attributes
    ----------
    incidence : (H, N, B) float
        +1 where a branch current leaves a node; rows of grounded and absent nodes are zero.
    source, sense : (H, N) float
        Injected currents of the two right-hand sides; equal where nothing else is sensed.
    grounded : (H, N) bool
        Nodes held at zero, and padding.
    wires : (H, B - n) bool
        Which of the tie branches are present.
    loops : (H,) int
        Number of independent closed loops, meter not counted.
    tie_resistance, tie_inductance : float
        Nominal impedance of a tie: the middle of what was stated.
    """

    windings: int
    incidence: Real
    source: Real
    sense: Real
    grounded: NDArray[np.bool_]
    wires: NDArray[np.bool_]
    loops: NDArray[np.int64]
    tie_resistance: float
    tie_inductance: float


@dataclass(frozen=True)
class Response:
    """What instruments show, for U cases.

    Attributes
    ----------
    impedance : (U,) complex
        Voltage on the sensed leads per ampere into the first `across` lead, ohm.
    drive, adjoint : (U, B) complex
        Branch currents per ampere at `across`, and per ampere at `sense`.
    """

    impedance: Complex
    drive: Complex
    adjoint: Complex

    def sensitivity(self, first: NDArray[np.int64], second: NDArray[np.int64]) -> Complex:
        """Derivative of the impedance by the matrix entries (first, second) and their mirror images.

        Parameters
        ----------
        first, second : (T,) int
            Rows and columns of the entries, `first` <= `second`.

        Returns
        -------
        (U, T) complex
            dZ/dZ_mn, counting both entries of a symmetric pair.
        """
        direct = self.drive[:, first] * self.adjoint[:, second]
        mirror = self.drive[:, second] * self.adjoint[:, first]
        return np.where(first == second, direct, direct + mirror)


def compile_hookups(device: Device, hookups: Sequence[Hookup]) -> Compiled:
    """Turn hookups into incidence arrays.

    Parameters
    ----------
    device : Device
    hookups : sequence of Hookup
        Each passed `check_hookup`.
    """
    with_impedance = device.tie_resistance > 0 or device.tie_inductance > 0
    n, nodes = len(device.windings), len(device.leads)
    ties = max((len(h.tied) for h in hookups), default=0) if with_impedance else 0
    shape = (len(hookups), nodes)
    incidence = np.zeros((*shape, n + ties))
    source, sense = np.zeros(shape), np.zeros(shape)
    grounded = np.ones(shape, dtype=bool)
    wires = np.zeros((len(hookups), ties), dtype=bool)
    loops = np.zeros(len(hookups), dtype=np.int64)
    ends = [(w.first, w.second) for w in device.windings]
    for h, hookup in enumerate(hookups):
        branches = ends + (list(hookup.tied) if with_impedance else [])
        node = merged_nodes(device.leads, () if with_impedance else hookup.tied)
        part = merged_nodes(device.leads, hookup.tied + tuple(ends))
        grounded[h, list(node.values())] = False
        _ground(grounded[h], node, part, hookup.across[1])
        for b, (first, second) in enumerate(branches):
            incidence[h, node[first], b] += 1.0
            incidence[h, node[second], b] -= 1.0
        wires[h, : len(branches) - n] = True
        present, parts = len(set(node.values())), len(set(part.values()))
        loops[h] = len(branches) - present + parts
        for target, pair in ((source, hookup.across), (sense, hookup.sense or hookup.across)):
            target[h, node[pair[0]]] += 1.0
            target[h, node[pair[1]]] -= 1.0
    keep = ~grounded
    return Compiled(
        windings=n,
        incidence=incidence * keep[:, :, None],
        source=source * keep,
        sense=sense * keep,
        grounded=grounded,
        wires=wires,
        loops=loops,
        tie_resistance=device.tie_resistance / 2,
        tie_inductance=device.tie_inductance / 2,
    )


def _ground(grounded: NDArray[np.bool_], node: dict[str, int], part: dict[str, int], reference: str) -> None:
    """Ground the reference lead's node and the first node of every other part."""
    done = {part[reference]}
    grounded[node[reference]] = True
    for lead, number in node.items():
        if part[lead] not in done:
            done.add(part[lead])
            grounded[number] = True


def solve(compiled: Compiled, index: NDArray[np.int64], inductance: Real, resistance: Real, omega: Real) -> Response:
    """Response of U cases at once.

    Parameters
    ----------
    compiled : Compiled
    index : (U,) int
        Which hookup each case has.
    inductance, resistance : (U, n, n) float
        Symmetric matrices, H and ohm.
    omega : (U,) float
        Angular frequency, rad/s; 0 for direct current.
    """
    n = compiled.windings
    incidence = compiled.incidence[index]
    cases, nodes, branches = incidence.shape
    z = np.zeros((cases, branches, branches), dtype=complex)
    z[:, :n, :n] = resistance + 1j * omega[:, None, None] * inductance
    diagonal = np.arange(n, branches)
    # A padded tie is a branch on its own with 1 ohm: it carries nothing.
    tie = compiled.tie_resistance + 1j * omega * compiled.tie_inductance
    z[:, diagonal, diagonal] = np.where(compiled.wires[index], tie[:, None], 1.0)
    own = np.abs(np.einsum("ubb->ub", z))
    floor = _LEAST_RESISTANCE * np.maximum(own.max(axis=1, initial=0.0), _LEAST_RESISTANCE)
    every = np.arange(branches)
    z[:, every, every] += np.where(own > floor[:, None], 0.0, floor[:, None])
    # Scaling both sides by d and e makes all entries of order one, so that windings of nanohenries and of
    # kilohenries in one device cost no digits.
    d = 1 / np.sqrt(np.maximum(own, floor[:, None]))
    e = 1 / np.maximum(np.max(np.abs(incidence) * d[:, None, :], axis=2), 1e-300)
    e = np.where(compiled.grounded[index], 1.0, e)
    size = nodes + branches
    system = np.zeros((cases, size, size), dtype=complex)
    scaled = e[:, :, None] * incidence * d[:, None, :]
    system[:, :nodes, nodes:] = scaled
    system[:, nodes:, :nodes] = scaled.swapaxes(1, 2)
    system[:, nodes:, nodes:] = -d[:, :, None] * z * d[:, None, :]
    held = np.arange(nodes)
    system[:, held, held] = compiled.grounded[index]
    right = np.zeros((cases, size, 2), dtype=complex)
    right[:, :nodes, 0] = e * compiled.source[index]
    right[:, :nodes, 1] = e * compiled.sense[index]
    found = np.linalg.solve(system, right)
    drive, adjoint = (found[:, nodes:, k] * d for k in (0, 1))
    # i'^T Z i has only products of currents in it: no difference of large node voltages, no lost digits.
    impedance = np.einsum("ub,ubc,uc->u", adjoint, z, drive)
    return Response(impedance, drive, adjoint)
