"""Published uncertainty: the GUM's impedance, sums of rectangles, conformance; and the same through another program.

JCGM 100:2008 is the GUM, JCGM 101:2008 its Supplement 1, JCGM 106:2012 the guide to conformity assessment.
"""

from __future__ import annotations

import math

import GTC
import numpy as np
import pytest
from bench import estimate, inductance, known, recording
from GTC import type_a
from scipy.special import ndtri
from scipy.stats import foldnorm

import mutual
from mutual.collect import collect
from mutual.distribution import Spread
from mutual.joint import Joint, explain
from mutual.quantities import resistance, self_inductance

# JCGM 100:2008, H.2, table H.2: five sets of simultaneous observations.
VOLTS = np.array([5.007, 4.994, 5.005, 4.990, 4.999])
AMPERES = np.array([19.663, 19.639, 19.640, 19.685, 19.678]) * 1e-3
RADIANS = np.array([1.0456, 1.0438, 1.0468, 1.0428, 1.0433])
MODULUS = VOLTS / AMPERES
# Any frequency serves: X is omega L.
OMEGA = 2 * math.pi * 1e3
AS_READ = ("impedance and phase", "resistance and inductance")


def sets(as_read: str) -> tuple[str, list[tuple[float, ...]]]:
    """The five sets as repeated rows of one winding: as |Z| and phase, or (the GUM's second approach) as R and X."""
    if as_read == "impedance and phase":
        return "across,frequency [kHz],impedance [ohm],phase [rad]", [
            ("A-B", 1.0, float(z), float(p)) for z, p in zip(MODULUS, RADIANS, strict=True)
        ]
    r, x = MODULUS * np.cos(RADIANS), MODULUS * np.sin(RADIANS)
    return "across,frequency [kHz],resistance [ohm],inductance [H]", [
        ("A-B", 1.0, float(a), float(b / OMEGA)) for a, b in zip(r, x, strict=True)
    ]


def impedance(joint: Joint) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Values, standard uncertainties and correlations of R, X and |Z| of the first winding, ohm."""
    posterior = joint.main.main.bounds.posterior
    u, names, theta = joint.main.unknowns, joint.names, posterior.fit.theta
    slopes = [resistance(u, names, 0, 0).gradient(theta), self_inductance(u, names, 0, 0).gradient(theta) * OMEGA]
    r, x = float(theta[u.resistance(0, 0, 0)]), OMEGA * float(theta[u.inductance(0, 0, 0)])
    z = math.hypot(r, x)
    slopes.append((r * slopes[0] + x * slopes[1]) / z)
    parts = [posterior.contributions(slope) for slope in slopes]
    table = np.array([np.concatenate([p.noise, p.rounding, p.sources]) for p in parts])
    covariance = table @ table.T
    standard = np.sqrt(np.diag(covariance))
    return np.array([r, x, z]), standard, covariance / np.outer(standard, standard)


@pytest.mark.parametrize("as_read", AS_READ)
def test_gum_h2_values_and_uncertainties(as_read: str) -> None:
    """JCGM 100:2008, H.2.3, table H.3: R 127.732 (0.071), X 219.847 (0.295), Z 254.260 (0.236) ohm.

    u(X) is printed truncated (it is 0.2956 from the means, 0.2955 from the sets), hence its tolerance of a whole digit.
    """
    columns, rows = sets(as_read)
    values, standard, _ = impedance(explain(collect([recording(columns, rows)]), 0.95))
    assert values == pytest.approx([127.732, 219.847, 254.260], abs=0.0005)
    assert standard[[0, 2]] == pytest.approx([0.071, 0.236], abs=0.0005)
    assert standard[1] == pytest.approx(0.295, abs=0.001)


def test_gum_h2_correlations() -> None:
    """JCGM 100:2008, H.2.4, table H.4: r(R, X) -0.588, r(R, Z) -0.485, r(X, Z) 0.993.

    The last is 0.99251 before it is rounded, and 0.99246 where |Z| is propagated linearly from R and X as here, not
    averaged over the sets: it is compared to both, since the two straddle the rounding.
    """
    _, _, correlation = impedance(explain(collect([recording(*sets("resistance and inductance"))]), 0.95))
    assert correlation[0, 1:] == pytest.approx([-0.588, -0.485], abs=0.0005)
    assert correlation[1, 2] == pytest.approx(0.99251, abs=0.0001)


@pytest.mark.parametrize("as_read", AS_READ)
def test_gum_h2_beside_another_program(as_read: str) -> None:
    """The GTC library (type A evaluation and linear propagation) on the very numbers that the rows hold."""
    columns, rows = sets(as_read)
    first, second = type_a.multi_estimate_real([[row[2] for row in rows], [row[3] for row in rows]])
    if as_read == "impedance and phase":
        r, x = first * GTC.cos(second), first * GTC.sin(second)
    else:
        r, x = first, second * OMEGA
    theirs = [r, x, GTC.sqrt(r**2 + x**2)]
    values, standard, correlation = impedance(explain(collect([recording(columns, rows)]), 0.95))
    # A thousandth of u: the two may differ by what is of second order in u / |Z| = 1e-3, and by no more.
    for k, quantity in enumerate(theirs):
        assert values[k] == pytest.approx(quantity.x, abs=1e-3 * quantity.u)
        assert standard[k] == pytest.approx(quantity.u, rel=1e-3)
        for other in range(k):
            assert correlation[k, other] == pytest.approx(GTC.get_correlation(quantity, theirs[other]), abs=2e-3)


@pytest.mark.parametrize("as_read", AS_READ)
def test_gum_h2_public_result_has_the_bounds_of_four_degrees_of_freedom(as_read: str) -> None:
    """JCGM 100:2008, table G.2: t for 95 % and 4 degrees of freedom is 2.78."""
    found = estimate(*sets(as_read))
    ohm = known(found.windings["one"].resistance)
    assert ohm.standard_uncertainty == pytest.approx(0.071, abs=0.0005)
    assert (known(ohm).upper - ohm.lower) / 2 / ohm.standard_uncertainty == pytest.approx(2.78, abs=0.005)
    henry = inductance(found, "one")
    assert (henry.upper - henry.lower) / 2 / henry.standard_uncertainty == pytest.approx(2.78, abs=0.005)
    assert found.consistency.verdict == "not testable"
    assert found.windings["two"].inductance is None and found.pairs[0].coupling is None


@pytest.mark.parametrize(
    ("sigma", "halves", "printed", "digits"),
    [
        # JCGM 101:2008, 9.2.2: four N(0, 1); 9.2.3: four rectangular of variance 1 (Monte Carlo 3.88, exact 3.879407).
        (2.0, [], 3.92, 0.005),
        (0.0, [1, 1, 1, 1], 3.88, 0.005),
        (0.0, [1, 1, 1, 1], 3.879407, 0.5e-4),
        # 9.2.4: the last of them of standard deviation 10; +-17.0 printed (from memory).
        (0.0, [1, 1, 1, 10], 17.0, 0.05),
    ],
)
def test_sums_of_supplement_1(sigma: float, halves: list[float], printed: float, digits: float) -> None:
    """Half widths at 95 %. The exact 3.879407 tests the numerical convolution, which claims no more than 1e-4."""
    spread = Spread(sigma, math.sqrt(3) * np.array(halves, dtype=float))
    assert spread.half_width(0.95) == pytest.approx(printed, abs=digits)


def four_errors(last: float, stated_as: str) -> dict[str, object]:
    """A meter with four independent errors of 1, 1, 1 and `last` nH standard deviation on a reading of 1 uH.

    Rectangles: gains, floor and the display step (one step of 2 sqrt(3) nH). Normal: gains, floor and noise.
    """
    factor = math.sqrt(3) if stated_as == "limit" else 1.0
    gain = f"{0.1 * factor:.15f} %"
    fourth = {"noise": "1 nH"} if stated_as == "standard" else {"resolution": f"{2 * factor:.15f} nH"}
    return {
        "gain_common": gain, "gain_each": gain, "floor": f"{factor * last:.15f} nH", "stated_as": stated_as, **fourth,
    }  # fmt: skip


@pytest.mark.parametrize(
    ("last", "stated_as", "printed", "digits"),
    [(1, "standard", 3.92, 0.005), (1, "limit", 3.88, 0.005), (10, "limit", 17.0, 0.05)],
)
def test_rectangles_stay_rectangular_in_the_bounds(last: float, stated_as: str, printed: float, digits: float) -> None:
    """The same three sums (JCGM 101:2008, 9.2.2 to 9.2.4, the last from memory) through a reading."""
    meter = four_errors(last, stated_as)
    found = inductance(estimate("across,inductance [H]", [("A-B", 1e-6)], meter=meter), "one")
    assert (found.upper - found.lower) / 2 == pytest.approx(printed * 1e-9, abs=digits * 1e-9)
    assert found.standard_uncertainty == pytest.approx(math.sqrt(3 + last**2) * 1e-9, rel=1e-6)


@pytest.mark.parametrize("away", [0.0, 0.5, 1.0, 1.5, 2.2, 3.0])
def test_coupling_near_zero_has_the_shortest_region_of_the_folded_normal(away: float) -> None:
    """k read `away` standard uncertainties from zero, against scipy's folded normal.

    The linear cousin of JCGM 101:2008, 9.4, where a first-order bound would say +-0 at zero. The readings in series
    differ by 4 M, so that u(M) is sqrt(2)/4 of the noise; what L1 and L2 add to u(k) is less than 1e-8 of it.
    """
    noise, own = 1e-9, 1e-4
    u = math.sqrt(2) / 4 * noise
    half = 2 * away * u
    rows = [("A-B", "", own), ("C-D", "", own), ("A-D", "B-C", 2 * own + half), ("A-C", "B-D", 2 * own - half)]
    found = estimate("across,tied,inductance [H]", rows, meter={"noise": f"{noise!r} H"})
    k = known(found.pairs[0].coupling)
    assert k.value == pytest.approx(away * u / own, abs=1e-6 * u / own)
    exact = foldnorm(away, scale=u / own)
    assert exact.cdf(k.upper) - exact.cdf(k.lower) == pytest.approx(0.95, abs=1e-3)
    at = np.linspace(0, (away + 8) * u / own, 200_001)
    below = exact.cdf(at)
    ends = np.interp(below + 0.95, below, at)[below < 0.0499]
    assert k.upper - k.lower == pytest.approx(np.min(ends - at[: len(ends)]), rel=2e-3)
    assert (k.lower == 0) == (k.bound == "upper") == (away < 2)


@pytest.mark.parametrize(
    ("distance", "printed", "digits"),
    # JCGM 106:2012: one-sided z for conformance probabilities (table 1), and its example of y = -5.47 V, u = 0.05 V,
    # upper limit -5.40 V (0.92). All from memory.
    [(0.84, 0.80, 5e-3), (1.28, 0.90, 5e-3), (1.64, 0.95, 5e-3), (2.33, 0.99, 5e-3), (3.09, 0.999, 5e-4),
     ((5.47 - 5.40) / 0.05, 0.92, 5e-3)],
)  # fmt: skip
def test_conformance_probability(distance: float, printed: float, digits: float) -> None:
    row, limit = ("A-B", 5.40 - 0.05 * distance), {"inductance one": {"upper": "5.40 H"}}
    made = recording("across,inductance [H]", [row], meter={"noise": "0.05 H"}, limits=limit)
    for risk in (0.25, 0.025, 0.005):
        (found,) = mutual.estimate(made, risk=risk).limits
        assert found.probability == pytest.approx(printed, abs=digits)
        assert found.verdict == ("met" if ndtri(1 - risk) <= distance else "undecided")
