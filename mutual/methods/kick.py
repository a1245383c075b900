"""The direct-current kick: which way a voltage jumps when a battery is connected or disconnected.

At make the currents have not yet risen, so the jump on the sensed leads has the sign of the
transfer inductance, whatever the resistances; at break it is the opposite (Faraday's law;
common practice with a battery and a centre-zero meter, no source).
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from mutual.circuit import Compiled, compile_hookups, solve
from mutual.device import Device
from mutual.recording.model import KickTable, Row
from mutual.result import Finding

Real = NDArray[np.float64]

_SIGN = {"+": 1, "-": -1, "0": 0}
# Kicks of one hookup that differ by more than misreading explains, at this probability or less, are worth a word.
_IMPROBABLE = 1e-3


@dataclass(frozen=True)
class Kick:
    """One remade connection.

    Attributes
    ----------
    terms : tuple of (i, j, sign)
        Entries of the inductance matrix whose sum the jump has the sign of, i <= j; i = j for a winding's own. A jump
        that no coupling can turn round (the sensed leads are those of the battery) is one winding's own.
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
        Rows that say nothing, with the reason, and hookups whose kicks contradict one another.
    """
    used: list[Kick] = []
    findings: list[Finding] = []
    by_hookup: dict[str, list[Kick]] = defaultdict(list)
    for row, where in rows:
        found = _read(device, row, where, table.misread)
        if isinstance(found, Finding):
            findings.append(found)
        else:
            used.append(found)
            by_hookup[str(row.hookup)].append(found)
    return Kicks(tuple(used), table.reversed), [*findings, *_contradicting(by_hookup, table.misread)]


def _read(device: Device, row: Row, where: str, misread: float) -> Kick | Finding:
    """The kick of one row, or why it says nothing."""
    make = _SIGN[row.kicks.get("kick on make", "0")]
    broke = -_SIGN[row.kicks.get("kick on break", "0")]
    if make and broke and make != broke:
        text = "make and break kicked the same way, so the row says nothing: a kick reverses at break"
        return Finding("caution", "kick disagrees", text, where)
    if not (make or broke):
        return Finding("note", "left out", "no deflection seen, so the row says nothing", where)
    compiled = compile_hookups(device, [row.hookup])
    closed = bool(compiled.loops[0])
    driven, sensed = (compiled.source[0], compiled.sense[0]) if closed else _paths(compiled)
    if not sensed.any():
        text = "the ties join the sensed leads, so no kick can show there; the row is not used"
        return Finding("caution", "left out", text, where)
    for sign in (1, -1):
        if np.array_equal(driven, sign * sensed):
            # The source's own leads: what it sees is inductive whatever is coupled or shorted.
            return Kick(((0, 0, sign),), make or broke, misread)
    if closed:
        text = "other windings are shorted in this hookup, so the kick depends on more than signs; it is not used"
        return Finding("caution", "left out", text, where)
    return Kick(_terms(driven, sensed), make or broke, misread)


def _paths(compiled: Compiled) -> tuple[Real, Real]:
    """Currents (n,) in the windings for 1 A through the source and through the voltmeter, without closed loops."""
    n = compiled.windings
    unit = np.eye(n)[None]
    response = solve(compiled, np.zeros(1, dtype=np.int64), unit, unit, np.ones(1))
    return response.drive[0, :n].real.round(6), response.adjoint[0, :n].real.round(6)


def _terms(driven: Real, sensed: Real) -> tuple[tuple[int, int, int], ...]:
    """Entries of L that make up driven' L sensed."""
    factors = np.outer(driven, sensed)
    factors = factors + np.triu(factors.T, 1)
    return tuple((int(i), int(j), int(np.sign(factors[i, j]))) for i, j in np.argwhere(np.triu(factors)))


def _contradicting(by_hookup: dict[str, list[Kick]], misread: float) -> Iterator[Finding]:
    """Hookups whose kicks went both ways more often than misreading explains."""
    from scipy.special import bdtrc

    for hookup, found in by_hookup.items():
        up = sum(kick.seen > 0 for kick in found)
        fewer = min(up, len(found) - up)
        if fewer and float(bdtrc(fewer - 1, len(found), misread)) < _IMPROBABLE:
            text = (
                f"{hookup}: {up} kicks went up at make and {len(found) - up} down, more than a chance of misreading of "
                f"{misread:g} explains. Look at the clamps, and kick again"
            )
            yield Finding("caution", "kick disagrees", text)
