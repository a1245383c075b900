"""The direct-current kick: which way a voltage jumps when a battery is connected or disconnected.

At make the currents have not yet risen, so the jump on the sensed leads has the sign of the
transfer inductance, whatever the resistances; at break it is the opposite (Faraday's law;
common practice with a battery and a centre-zero meter, no source).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from mutual.circuit import compile_hookups, solve
from mutual.device import Device
from mutual.recording.model import KickTable, Row
from mutual.result import Finding

_SIGN = {"+": 1, "-": -1, "0": 0}


@dataclass(frozen=True)
class Kick:
    """One remade connection.

    Attributes
    ----------
    terms : tuple of (i, j, sign)
        Entries of the inductance matrix whose sum the jump has the sign of; i = j for a winding's own.
    seen : int
        +1 or -1: the deflection as it would be at make.
    misread : float
        Probability that it was seen or wired the wrong way round.
    """

    terms: tuple[tuple[int, int, int], ...]
    seen: int
    misread: float


@dataclass(frozen=True)
class Kicks:
    """All kicks of a device, and the chance that the meter's sense is reversed throughout."""

    each: tuple[Kick, ...] = ()
    reversed: float = 0.0001


def kicks(device: Device, rows: Sequence[tuple[Row, str]], table: KickTable) -> tuple[Kicks, list[Finding]]:
    """Deflections as evidence about signs.

    Parameters
    ----------
    device : Device
    rows : sequence of (Row, str)
        Rows with kicks, and how messages name them.
    table : KickTable

    Returns
    -------
    Kicks
    list of Finding
        Rows that say nothing, with the reason.
    """
    used, findings = [], []
    for row, where in rows:
        make = _SIGN[row.kicks.get("kick on make", "0")]
        broke = -_SIGN[row.kicks.get("kick on break", "0")]
        if make and broke and make != broke:
            text = "make and break kicked the same way, so the row says nothing: a kick reverses at break"
            findings.append(Finding("caution", "kick disagrees", text, where))
            continue
        if not (make or broke):
            text = "no deflection seen, so the row says nothing"
            findings.append(Finding("note", "left out", text, where))
            continue
        terms = _terms(device, row)
        if terms is None:
            text = "other windings are shorted in this hookup, so the kick depends on more than signs; it is not used"
            findings.append(Finding("caution", "left out", text, where))
            continue
        used.append(Kick(terms, make or broke, table.misread))
    return Kicks(tuple(used), table.reversed), findings


def _terms(device: Device, row: Row) -> tuple[tuple[int, int, int], ...] | None:
    """Entries of L that make up the transfer inductance; None where closed loops bring in more."""
    compiled = compile_hookups(device, [row.hookup])
    if compiled.loops[0]:
        return None
    n = len(device.windings)
    unit = np.eye(n)[None]
    response = solve(compiled, np.zeros(1, dtype=np.int64), unit, unit, np.ones(1))
    drive, sense = response.drive[0, :n].real.round(6), response.adjoint[0, :n].real.round(6)
    terms = []
    for i in range(n):
        for j in range(i, n):
            factor = drive[i] * sense[j] + (drive[j] * sense[i] if i != j else 0.0)
            if factor:
                terms.append((i, j, int(np.sign(factor))))
    return tuple(terms)
