"""The references that other tests lean on, against published figures and against one another."""

from __future__ import annotations

import cmath
import math

import loops
import numpy as np
import pytest
from references import (
    Pair,
    coaxial_circles,
    coupling_from_inductances,
    coupling_from_open_and_short,
    mutual_from_series,
)

LOSSY = Pair(l1=5.2e-3, l2=1.3e-3, m=-2.4e-3, r1=2.1, r2=0.58, rm=-0.07, frequency=120.0)


@pytest.mark.parametrize("hookup", LOSSY.hookups())
def test_loop_equations_give_the_closed_forms(hookup: tuple[str, str, str]) -> None:
    case, expected = LOSSY.case(*hookup), LOSSY.hookups()[hookup]
    for solve in (loops.solve, loops.solve_exactly):
        assert solve(case)[1 if hookup[2] else 0] == pytest.approx(expected, rel=1e-13)


def test_slope_of_the_short() -> None:
    """d(z1 - zm^2/z2): by M -2 zm j omega/z2, by R2 zm^2/z2^2."""
    case, z2, zm, omega = LOSSY.case("A-B", "C-D"), LOSSY.z2, LOSSY.zm, LOSSY.omega
    assert loops.slope_exactly(case, "L", 0, 1)[0] == pytest.approx(-2 * zm * 1j * omega / z2, rel=1e-13)
    assert loops.slope_exactly(case, "L", 1, 0)[0] == pytest.approx(-2 * zm * 1j * omega / z2, rel=1e-13)
    assert loops.slope_exactly(case, "R", 1, 1)[0] == pytest.approx((zm / z2) ** 2, rel=1e-13)
    assert loops.slope_exactly(case, "L", 0, 0)[0] == pytest.approx(1j * omega, rel=1e-13)


def test_parts_that_nothing_joins_have_no_answer() -> None:
    with pytest.raises(ValueError, match="nothing joins"):
        loops.solve(LOSSY.case("A-C"))


def test_open_and_short_impedance_give_k_without_the_other_winding() -> None:
    pair = Pair(l1=5.2e-3, l2=1.3e-3, m=2.561e-3, r1=2.1, r2=0.58, frequency=120.0)
    opened, shorted = (pair.hookups()["A-B", tied, ""] for tied in ("", "C-D"))
    assert coupling_from_open_and_short(opened, shorted) == pytest.approx(pair.coupling, rel=1e-12)
    bare = coupling_from_inductances(opened.imag / pair.omega, shorted.imag / pair.omega)
    assert bare < 0.87 * pair.coupling  # the Q of the short is 1.7


@pytest.mark.parametrize(
    ("first", "second", "distance", "nanohenry"),
    [(25, 25, 10, 337.684718), (25, 20, 10, 248.787359), (25, 25, 100, 6.4996124)],
)
def test_coaxial_circles(first: float, second: float, distance: float, nanohenry: float) -> None:
    """Rosa and Grover, Bulletin of the Bureau of Standards 8(1), 1912, S169: their formula and radii, in cm.

    The figures are computed (they are checked here by Neumann's integral), not printed in the source.
    """
    got = coaxial_circles(first / 100, second / 100, distance / 100)
    digits = len(str(nanohenry).partition(".")[2])
    assert got * 1e9 == pytest.approx(nanohenry, abs=0.5 * 10.0**-digits)
    # Neumann: M = mu0/2 integral of a b cos(t) / |r| over the angle; the trapezoid rule on a period is exact here.
    angle = 2 * np.pi * np.arange(4096) / 4096
    a, b, d = first / 100, second / 100, distance / 100
    gap = np.sqrt(a * a + b * b + d * d - 2 * a * b * np.cos(angle))
    neumann = 4e-7 * math.pi / 2 * np.mean(a * b * np.cos(angle) / gap) * 2 * math.pi
    assert got == pytest.approx(float(neumann), rel=1e-10)


def inductance(pair: Pair, *hookup: str) -> float:
    """Apparent series inductance of a hookup, H."""
    return loops.solve(pair.case(*hookup))[0].imag / pair.omega


def test_bird_chapter_43() -> None:
    """J. Bird, Electrical Circuit Theory and Technology, 2nd ed., ch. 43, examples 3, 5, 7, 11."""
    assert Pair(0.25, 0.4, 0.08).coupling == pytest.approx(0.253, abs=5e-4)
    # Example 5: 40 and 10 mH give 60 mH in series aiding.
    five = Pair(40e-3, 10e-3, (60e-3 - 40e-3 - 10e-3) / 2)
    assert (five.m, five.coupling) == pytest.approx((5e-3, 0.25), rel=1e-12)
    # Example 7: k 0.7, series inductances 15 and 10 mH; the two windings are 12.24 and 0.26 mH.
    assert mutual_from_series(15e-3, 10e-3) == pytest.approx(1.25e-3, rel=1e-12)
    seven = Pair(12.24e-3, 0.26e-3, 1.25e-3)
    assert seven.coupling == pytest.approx(0.7, abs=5e-3)
    assert inductance(seven, "A-D", "B-C") == pytest.approx(15e-3, rel=1e-12)
    assert inductance(seven, "A-C", "B-D") == pytest.approx(10e-3, rel=1e-12)
    # Example 11: omega 500; the capacitor of the second circuit makes its reactance negative.
    z1, z2, zm = 300 + 350j, 500 - 250j, 1j * 500 * 0.2
    reflected = -zm * zm / z2
    i1 = 50 / (z1 + reflected)
    i2 = zm * i1 / z2
    assert reflected == pytest.approx(16 + 8j, rel=1e-12)
    assert z1 + reflected == pytest.approx(316 + 358j, rel=1e-12)
    assert (abs(i1), math.degrees(cmath.phase(i1))) == pytest.approx((0.1047, -48.57), abs=5e-3)
    assert abs(i1) == pytest.approx(0.1047, abs=5e-5)
    assert abs(i2) == pytest.approx(0.01873, abs=5e-6)
    assert math.degrees(cmath.phase(i2)) == pytest.approx(68.0, abs=0.05)


def test_guru_and_hiziroglu() -> None:
    """Guru and Hiziroglu, 3rd ed. 2004, examples 2.11 (p. 106) and 2.12."""
    pair = Pair(0.1, 1.6, mutual_from_series(2.38, 1.02))
    assert (pair.m, pair.coupling) == pytest.approx((0.34, 0.85), rel=1e-12)
    assert inductance(pair, "A-D", "B-C") == pytest.approx(2.38, rel=1e-12)
    assert inductance(pair, "A-B", "A-C B-D") == pytest.approx(43.5e-3, abs=0.05e-3)
    assert inductance(pair, "A-B", "A-D B-C") == pytest.approx(18.7e-3, abs=0.05e-3)


def test_kulshreshtha() -> None:
    """D. C. Kulshreshtha (2012), example 7.12: 8 and 6 H, k 0.433 (M is 3 H) in parallel."""
    pair = Pair(8.0, 6.0, 3.0)
    assert pair.coupling == pytest.approx(0.433, abs=5e-4)
    assert inductance(pair, "A-B", "A-C B-D") == pytest.approx(4.875, abs=5e-4)
    assert inductance(pair, "A-B", "A-D B-C") == pytest.approx(1.950, abs=5e-4)


def test_grob_and_gupta() -> None:
    """B. Grob, 19-20; B. R. Gupta, 2.103 (three coils in series)."""
    grob = Pair(250e-6, 250e-6, mutual_from_series(550e-6, 450e-6))
    assert (grob.m, grob.coupling) == pytest.approx((25e-6, 0.1), rel=1e-12)
    gupta = {
        "windings": [["a", "A", "B"], ["b", "C", "D"], ["c", "E", "F"]],
        "L": [[10.0, 2.0, -1.0], [2.0, 5.0, -1.0], [-1.0, -1.0, 6.0]],
        "R": np.zeros((3, 3)),
        "frequency": 1 / (2 * math.pi),
        "across": ["A", "F"],
        "tied": [["B", "C"], ["D", "E"]],
    }
    assert loops.solve(gupta)[0] == pytest.approx(21j, rel=1e-12)


def test_stored_energy() -> None:
    """Alexander and Sadiku, 5th ed., example 13.3; Robertson, 3rd ed., example 5.28.

    The source and the impedances of 13.3 (60 cos(4t + 30 deg) V, 10 ohm, 1/16 F) are from memory; the printed k and
    energy are not. The energy is 20.7366 J and was printed truncated, 20.73.
    """
    pair = Pair(5.0, 4.0, 2.5)
    assert pair.coupling == pytest.approx(0.56, abs=5e-3)
    mesh = np.array([[10 + 20j, 10j], [10j, 16j - 4j]])
    phasors = np.linalg.solve(mesh, [cmath.rect(60, math.radians(30)), 0])
    i1, i2 = (phasors * cmath.exp(4j)).real
    assert math.floor(100 * pair.energy(float(i1), float(i2))) == 2073
    robertson = Pair(25e-3, 40e-3, 0.8 * math.sqrt(25e-3 * 40e-3))
    assert robertson.energy(0.25, 0.25) == pytest.approx(3.61e-3, abs=5e-6)
    assert robertson.energy(0.25, -0.25) == pytest.approx(0.450e-3, abs=5e-7)


@pytest.mark.parametrize(("load", "volts"), [(1e3, 9.962), (200.0, 9.348), (9e12, 9.990)])
def test_kuphaldt_loaded_transformer(load: float, volts: float) -> None:
    """T. Kuphaldt, Lessons in Electric Circuits: 100 and 100 H, k 0.999, 10 V at 60 Hz; the load is a third winding."""
    case = {
        "windings": [["first", "A", "B"], ["second", "C", "D"], ["load", "C", "D"]],
        "L": [[100.0, 99.9, 0.0], [99.9, 100.0, 0.0], [0.0, 0.0, 0.0]],
        "R": np.diag([0.0, 0.0, load]),
        "frequency": 60.0,
        "across": ["A", "B"],
        "tied": [],
        "sense": ["C", "D"],
    }
    driven, sensed = loops.solve(case)
    assert sensed is not None
    assert 10 * abs(sensed / driven) == pytest.approx(volts, abs=5e-4)
