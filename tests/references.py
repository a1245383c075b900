"""Closed forms for two coupled windings and for coaxial circles; they share nothing with the package under test.

Windings A-B and C-D have impedances z1 = R1 + j omega L1 and z2, and the mutual impedance zm = Rm + j omega M, positive
for like first leads. Every formula is Kirchhoff's laws for that one hookup, worked by hand.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

MU_0 = 4e-7 * math.pi  # H/m; the value of 1912, when Rosa and Grover wrote, and good to 1e-9 today


@dataclass(frozen=True)
class Pair:
    """Two windings at one frequency: H, ohm, Hz."""

    l1: float
    l2: float
    m: float
    r1: float = 0.0
    r2: float = 0.0
    rm: float = 0.0
    frequency: float = 1e3

    @property
    def omega(self) -> float:
        """Angular frequency, rad/s."""
        return 2 * math.pi * self.frequency

    @property
    def z1(self) -> complex:
        """A-B, all else open."""
        return complex(self.r1, self.omega * self.l1)

    @property
    def z2(self) -> complex:
        """C-D, all else open."""
        return complex(self.r2, self.omega * self.l2)

    @property
    def zm(self) -> complex:
        """Voltage on C-D per ampere into A."""
        return complex(self.rm, self.omega * self.m)

    @property
    def coupling(self) -> float:
        """Signed M / sqrt(L1 L2)."""
        return self.m / math.sqrt(self.l1 * self.l2)

    def hookups(self) -> dict[tuple[str, str, str], complex]:
        """Impedance (or, with `sense`, transfer impedance) of `across`, `tied`, `sense`; ohm."""
        z1, z2, zm = self.z1, self.z2, self.zm
        cross = z1 * z2 - zm * zm
        return {
            ("A-B", "", ""): z1,
            ("C-D", "", ""): z2,
            ("A-D", "B-C", ""): z1 + z2 + 2 * zm,
            ("A-C", "B-D", ""): z1 + z2 - 2 * zm,
            ("A-B", "C-D", ""): z1 - zm * zm / z2,
            ("C-D", "A-B", ""): z2 - zm * zm / z1,
            ("A-B", "A-C B-D", ""): cross / (z1 + z2 - 2 * zm),
            ("A-B", "A-D B-C", ""): cross / (z1 + z2 + 2 * zm),
            ("A-B", "", "C-D"): zm,
            ("A-B", "", "D-C"): -zm,
            ("B-A", "", "C-D"): -zm,
            ("C-D", "", "A-B"): zm,
            ("A-B", "B-C", "A-D"): z1 + zm,
            ("A-B", "B-D", "A-C"): z1 - zm,
            ("A-D", "B-C", "C-D"): z2 + zm,
        }

    def case(self, across: str, tied: str = "", sense: str = "") -> dict[str, object]:
        """The hookup as plain data for `loops` and `netlists`."""
        return {
            "windings": [["w1", "A", "B"], ["w2", "C", "D"]],
            "L": [[self.l1, self.m], [self.m, self.l2]],
            "R": [[self.r1, self.rm], [self.rm, self.r2]],
            "frequency": self.frequency,
            "across": across.split("-"),
            "tied": [pair.split("-") for pair in tied.split()],
            "sense": sense.split("-") if sense else None,
        }

    def energy(self, i1: float, i2: float) -> float:
        """Stored energy in J with currents (A) into the first leads."""
        return self.l1 * i1**2 / 2 + self.l2 * i2**2 / 2 + self.m * i1 * i2


def mutual_from_series(one_way: float, other_way: float) -> float:
    """M from the two series inductances, A-D tied B-C and A-C tied B-D; H."""
    return (one_way - other_way) / 4


def coupling_from_open_and_short(opened: complex, shorted: complex) -> float:
    """|k| from the impedances (ohm) of one winding with the other open and shorted, mutual resistance nil."""
    return math.sqrt(1 / (opened.imag * (1 / (shorted - opened)).imag))


def coupling_from_inductances(opened: float, shorted: float) -> float:
    """The bare formula sqrt(1 - Ls/Lo), right only where the short has no loss."""
    return math.sqrt(1 - shorted / opened)


def coaxial_circles(first: float, second: float, distance: float) -> float:
    """Mutual inductance (H) of two coaxial circular filaments, radii and distance in m.

    Maxwell's formula; Rosa and Grover, Bulletin of the Bureau of Standards 8(1), 1912 (S169).
    """
    from scipy.special import ellipe, ellipk

    m = 4 * first * second / ((first + second) ** 2 + distance**2)  # the modulus squared, as scipy takes it
    k = math.sqrt(m)
    return float(MU_0 * math.sqrt(first * second) * ((2 / k - k) * ellipk(m) - 2 / k * ellipe(m)))
