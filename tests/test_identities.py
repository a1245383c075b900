"""What must hold whatever the device: closed forms, reciprocity, exchange of leads, order, scale, energy, gains.

Truth comes from `references.Pair` (Kirchhoff's laws worked by hand), uncertainty from the GTC library.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any

import GTC
import numpy as np
import pytest
from bench import THREE, TWO, codes, estimate, formula, inductance, known, quantities
from references import Pair, mutual_from_series

from mutual.result import Estimate

ROWS = "across,tied,frequency [Hz],inductance [H]"
LOSSY = "across,tied,sense,frequency [Hz],inductance [H],resistance [ohm]"
SERIES, OTHER_SERIES = ("A-D", "B-C"), ("A-C", "B-D")
FREQUENCY = 1e3


def random_pairs(count: int, seed: int) -> list[Pair]:
    """Invented pairs of all sizes and couplings, with and without shared loss."""
    rng = np.random.default_rng(seed)
    out = []
    for _ in range(count):
        l1, l2 = 10.0 ** rng.uniform(-6, 0, 2)
        k = float(rng.uniform(0.05, 0.97) * rng.choice([-1, 1]))
        r1, r2 = 2 * math.pi * FREQUENCY * np.array([l1, l2]) / 10.0 ** rng.uniform(0.5, 2, 2)
        rm = float(rng.uniform(-0.1, 0.1)) * math.sqrt(r1 * r2)
        out.append(Pair(l1, l2, k * math.sqrt(l1 * l2), r1, r2, rm, FREQUENCY))
    return out


def read(pair: Pair, hookups: Sequence[tuple[str, str, str]]) -> list[tuple[Any, ...]]:
    """What a perfect meter shows of the hookups, as rows of `LOSSY`."""
    found = []
    for across, tied, sense in hookups:
        z = pair.hookups()[across, tied, sense]
        found.append((across, tied, sense, pair.frequency, z.imag / pair.omega, z.real))
    return found


FULL = [
    ("A-B", "", ""), ("C-D", "", ""), ("A-D", "B-C", ""), ("A-C", "B-D", ""), ("A-B", "C-D", ""), ("C-D", "A-B", ""),
    ("A-B", "A-C B-D", ""), ("A-B", "A-D B-C", ""),
]  # fmt: skip
METER = {"gain_common": "0.1 %", "gain_each": "0.05 %", "phase_common": "0.5 mrad", "phase_each": "0.2 mrad"}


@pytest.mark.parametrize("pair", random_pairs(8, seed=401))
def test_series_both_ways_is_a_quarter_of_the_difference(pair: Pair) -> None:
    """(La - Lo)/4, to the last digits and whatever the windings alone are read as.

    With noise alone, equal in all readings, M is orthogonal to L1 and L2: no contradiction among them moves it.
    """
    la, lo = (pair.hookups()[(*h, "")].imag / pair.omega for h in (SERIES, OTHER_SERIES))
    noise = {"noise": f"{float(1e-4 * min(pair.l1, pair.l2))!r} H"}
    bare = estimate(ROWS, [(*SERIES, FREQUENCY, la), (*OTHER_SERIES, FREQUENCY, lo)], meter=noise)
    off = 3e-3 * min(pair.l1, pair.l2)
    alone = [("A-B", "", FREQUENCY, pair.l1 + off), ("C-D", "", FREQUENCY, pair.l2 - 2 * off)]
    whole = estimate(ROWS, [*alone, (*SERIES, FREQUENCY, la), (*OTHER_SERIES, FREQUENCY, lo)], meter=noise)
    for found in (bare, whole):
        m = known(found.pairs[0].mutual)
        assert m.value == pytest.approx(mutual_from_series(la, lo), rel=1e-9)
        assert m.value == pytest.approx(known(formula(found, "series both ways").mutual).value, rel=1e-9)
        assert m.standard_uncertainty == pytest.approx(math.sqrt(2) / 4 * 1e-4 * min(pair.l1, pair.l2), rel=1e-6)


@pytest.mark.parametrize("pair", random_pairs(12, seed=402))
def test_perfect_readings_give_the_device_back(pair: Pair) -> None:
    """All hookups of two windings: L, R, M, Rm and k come out as they went in, and no reading is out of place."""
    found = estimate(LOSSY, read(pair, FULL), meter=METER)
    (result,) = found.pairs
    assert inductance(found, "one").value == pytest.approx(pair.l1, rel=1e-6)
    assert inductance(found, "two").value == pytest.approx(pair.l2, rel=1e-6)
    assert known(found.windings["one"].resistance).value == pytest.approx(pair.r1, rel=1e-6)
    assert known(found.windings["two"].resistance).value == pytest.approx(pair.r2, rel=1e-6)
    root = math.sqrt(pair.l1 * pair.l2)
    assert known(result.mutual).value == pytest.approx(pair.m, abs=1e-6 * root)
    assert known(result.mutual_resistance).value == pytest.approx(pair.rm, abs=1e-6 * pair.omega * root)
    assert known(result.coupling).value == pytest.approx(abs(pair.coupling), abs=1e-6)
    assert found.consistency.chi_square < 1e-6 and found.consistency.verdict == "consistent"
    assert result.polarity.verdict == ("same" if pair.m > 0 else "opposite")


@pytest.mark.parametrize("pair", random_pairs(6, seed=403))
def test_reciprocity(pair: Pair) -> None:
    """The transfer inductance is M whichever winding is driven, and with its leads exchanged -M."""
    columns = "across,sense,frequency [Hz],inductance [H],transfer inductance [H]"
    alone = [("A-B", "", FREQUENCY, pair.l1, None), ("C-D", "", FREQUENCY, pair.l2, None)]
    found = [
        estimate(columns, [*alone, (across, sense, FREQUENCY, None, sign * pair.m)], meter=METER)
        for across, sense, sign in (("A-B", "C-D", 1), ("C-D", "A-B", 1), ("B-A", "C-D", -1), ("D-C", "B-A", 1))
    ]
    first = quantities(found[0].pairs[0])
    assert known(first["mutual"]).value == pytest.approx(pair.m, rel=1e-9)
    for other in found[1:]:
        for name, q in quantities(other.pairs[0]).items():
            assert_equal(q, first[name], name)


def assert_equal(found: Any, expected: Any, name: str, factor: float = 1.0, part: float = 1e-6) -> None:
    """Two quantities the same (one `factor` times the other) to a part of their uncertainty; mirrored if negative."""
    assert (found is None) == (expected is None), name
    if expected is None:
        return
    ends = (expected.lower, expected.upper)
    lower, upper = ends if factor > 0 else ends[::-1]
    scale = abs(factor) * (expected.standard_uncertainty or abs(expected.value))
    assert found.value == pytest.approx(factor * expected.value, abs=part * scale), name
    for mine, other in ((found.lower, lower), (found.upper, upper)):
        assert mine == (None if other is None else pytest.approx(factor * other, abs=part * scale)), name
    if expected.standard_uncertainty is not None:
        assert found.standard_uncertainty == pytest.approx(abs(factor) * expected.standard_uncertainty, rel=part), name


# One-sided quantities, sets that draws are needed for, and those with none.
SETS = {
    "series": [("A-B", "", ""), ("C-D", "", ""), ("A-D", "B-C", ""), ("A-C", "B-D", "")],
    "shorts": [("A-B", "", ""), ("C-D", "", ""), ("A-B", "C-D", ""), ("C-D", "A-B", ""), ("A-D", "B-C", "")],
    "full": FULL,
}


@pytest.mark.parametrize("name", SETS)
@pytest.mark.parametrize("pair", random_pairs(3, seed=404))
def test_exchanged_leads_turn_m_and_nothing_else(pair: Pair, name: str) -> None:
    """The same rows, the second winding declared from D to C: only signs change, and the dots stay on their wires."""
    rows = read(pair, SETS[name])
    found = estimate(LOSSY, rows, meter=METER)
    turned = estimate(LOSSY, rows, windings={"one": ("A", "B"), "two": ("D", "C")}, meter=METER)
    before, after = quantities(found.pairs[0]), quantities(turned.pairs[0])
    assert_equal(after.pop("mutual"), before.pop("mutual"), "mutual", -1.0)
    for each, q in before.items():
        assert_equal(after[each], q, each)
    assert_equal(turned.pairs[0].mutual_resistance, found.pairs[0].mutual_resistance, "mutual resistance", -1.0)
    for winding in TWO:
        assert_equal(turned.windings[winding].inductance, found.windings[winding].inductance, winding)
        assert_equal(turned.windings[winding].resistance, found.windings[winding].resistance, winding)
    assert found.dots is not None and turned.dots == found.dots
    assert {found.pairs[0].polarity.verdict, turned.pairs[0].polarity.verdict} == {"same", "opposite"}
    assert turned.consistency.chi_square == pytest.approx(found.consistency.chi_square, abs=1e-6)


def test_order_of_windings_and_rows_changes_nothing() -> None:
    """Three windings, noisy readings (invented), listed in another order: the same numbers under the same names."""
    henry = {"one": 4e-3, "two": 1e-3, "three": 2.5e-3}
    mutual = {("one", "two"): 1.2e-3, ("two", "three"): -0.4e-3, ("one", "three"): -0.9e-3}
    leads = {name: "-".join(pair) for name, pair in THREE.items()}
    rng = np.random.default_rng(405)
    rows = [(leads[name], "", FREQUENCY, value) for name, value in henry.items()]
    for (a, b), m in mutual.items():
        (a1, a2), (b1, b2) = THREE[a], THREE[b]
        rows.append((f"{a1}-{b2}", f"{a2}-{b1}", FREQUENCY, henry[a] + henry[b] + 2 * m))
        rows.append((f"{a1}-{b1}", f"{a2}-{b2}", FREQUENCY, henry[a] + henry[b] - 2 * m))
    rows = [(*row[:3], row[3] * (1 + 3e-4 * rng.standard_normal())) for row in rows]
    meter = {"gain_common": "0.1 %", "gain_each": "0.05 %", "noise": "1 uH"}
    found = estimate(ROWS, rows, windings=THREE, meter=meter)
    order = [int(i) for i in rng.permutation(len(rows))]
    other = dict(reversed(THREE.items()))
    moved = estimate(ROWS, [rows[i] for i in order], windings=other, meter=meter)
    assert list(moved.windings) == list(other)
    for name in THREE:
        assert_equal(moved.windings[name].inductance, found.windings[name].inductance, name)
    for a, b in mutual:
        one, two = quantities(found.pair(a, b)), quantities(moved.pair(a, b))
        for kind in ("mutual", "mutual magnitude", "coupling", "one minus coupling"):
            assert_equal(two[kind], one[kind], f"{kind} {a} {b}")
        assert moved.pair(a, b).polarity.verdict == found.pair(a, b).polarity.verdict
    assert moved.consistency.chi_square == pytest.approx(found.consistency.chi_square, rel=1e-6)
    assert {b.source for b in moved.budget} == {b.source for b in found.budget}
    assert found.dots is not None and moved.dots is not None
    assert {frozenset(side) for side in moved.dots} == {frozenset(side) for side in found.dots}


@pytest.mark.parametrize("factor", [1e-4, 1e3])
@pytest.mark.parametrize("pair", random_pairs(3, seed=406))
def test_scaling_all_impedances_scales_m_and_leaves_k(pair: Pair, factor: float) -> None:
    """Relative errors only, so that a device of another size is as well known."""
    scaled = Pair(*(factor * x for x in (pair.l1, pair.l2, pair.m, pair.r1, pair.r2, pair.rm)), pair.frequency)
    small, large = (estimate(LOSSY, read(p, FULL), meter=METER) for p in (pair, scaled))
    before, after = quantities(small.pairs[0]), quantities(large.pairs[0])
    for name, q in before.items():
        grows = name.startswith(("mutual", "shorted"))
        assert_equal(after[name], q, name, factor if grows else 1.0)


def energies(found: Estimate, rng: np.random.Generator) -> np.ndarray:
    """Stored energy over that without the cross term, for currents in all directions and the worst one."""
    l1, l2 = inductance(found, "one").value, inductance(found, "two").value
    m = known(found.pairs[0].mutual).value
    angle = np.append(rng.uniform(0, 2 * math.pi, 1000), [-math.pi / 4, math.pi / 4])
    i1, i2 = np.cos(angle) / math.sqrt(l1), np.sin(angle) / math.sqrt(l2)
    plain = l1 * i1**2 / 2 + l2 * i2**2 / 2
    return np.asarray((plain + m * i1 * i2) / plain)


@pytest.mark.parametrize("excess", [-0.02, -1e-3, 0.0, 1e-3, 2e-3])
@pytest.mark.parametrize("sign", [1, -1])
def test_stored_energy_is_never_negative(excess: float, sign: int) -> None:
    """L1 i1^2/2 + L2 i2^2/2 + M i1 i2 >= 0 for any currents, also where a tight pair was read as k = 1 and above."""
    l1, l2 = 4e-3, 1e-3
    m = sign * (1 + excess) * 2e-3
    rows = [("A-B", "", FREQUENCY, l1), ("C-D", "", FREQUENCY, l2), (*SERIES, FREQUENCY, l1 + l2 + 2 * m)]
    found = estimate(ROWS, rows, meter={"gain_common": "0.1 %", "noise": "2 uH"})
    least = np.min(energies(found, np.random.default_rng(407)))
    assert least >= -1e-9
    if excess < 0:
        assert least == pytest.approx(-excess, rel=1e-3)


@pytest.mark.parametrize("pair", random_pairs(5, seed=408))
def test_reflected_impedance(pair: Pair) -> None:
    """A shorted winding adds -zm^2/Z2 to the other, zm = Rm + j omega M: the estimate's own parts must give it back."""
    hookups = [("A-B", "", ""), ("C-D", "", ""), ("A-B", "C-D", ""), ("C-D", "A-B", ""), ("A-D", "B-C", "")]
    found = estimate(LOSSY, read(pair, hookups), meter=METER)
    result, second = found.pairs[0], found.windings["two"]
    zm = complex(known(result.mutual_resistance).value, pair.omega * known(result.mutual).value)
    z2 = complex(known(second.resistance).value, pair.omega * known(second.inductance).value)
    reflected = pair.hookups()["A-B", "C-D", ""] - pair.z1
    assert abs(-(zm**2) / z2 - reflected) < 1e-6 * abs(pair.z1)
    # Without loss a short leaves L1 - M^2/L2.
    short = known(result.short_circuit_inductance[0]).value
    assert short == pytest.approx(pair.l1 * (1 - pair.coupling**2), rel=1e-5)


@pytest.mark.parametrize("gain", [0.99, 1.001, 1.05])
@pytest.mark.parametrize("set_name", SETS)
def test_a_gain_common_to_all_readings_stays_out_of_k(gain: float, set_name: str) -> None:
    """Noise-free readings, all wrong by one factor: k moves by less than 1e-6, M by that factor."""
    pair = Pair(24.3e-6, 18.9e-6, 2.575e-6, 0.3, 0.25, 0.004, 100e3)
    meter = {"gain_common": "1 %", "phase_common": "0.5 mrad", "noise": ["1 nH", "1 mohm"]}
    rows = read(pair, SETS[set_name])
    wrong = [(*row[:4], gain * row[4], gain * row[5]) for row in rows]
    right, moved = (estimate(LOSSY, r, meter=meter).pairs[0] for r in (rows, wrong))
    assert known(moved.coupling).value == pytest.approx(known(right.coupling).value, rel=1e-6)
    assert known(moved.mutual).value == pytest.approx(gain * known(right.mutual).value, rel=1e-6)


def budget(found: Estimate, quantity: str) -> dict[str, float]:
    """Standard uncertainties by source."""
    return {line.source: line.standard_uncertainty for line in found.budget if line.quantity == quantity}


def test_budget_lines_of_common_errors() -> None:
    """A common gain is in M (its limit over root 3 times M), not in k; a common phase is a line of its own."""
    pair = Pair(24.3e-6, 18.9e-6, 2.575e-6, 3.0, 2.4, 0.05, 100e3)
    meter = {"gain_common": "0.1 %", "gain_each": "0.03 %", "phase_common": "2 mrad"}
    found = estimate(LOSSY, read(pair, SETS["series"]), meter=meter)
    m, k = budget(found, "mutual one two"), budget(found, "coupling one two")
    assert m["meter gain, common"] == pytest.approx(1e-3 * pair.m / math.sqrt(3), rel=1e-3)
    assert k.get("meter gain, common", 0.0) < 1e-6 * k["meter gain, each"]
    # M' = Im((Rm + j omega M)(1 + j p))/omega = M + p Rm/omega; so for L1 and L2, which is what k then feels.
    assert m["meter phase, common"] == pytest.approx(2e-3 / math.sqrt(3) * pair.rm / pair.omega, rel=1e-2)
    slope = pair.coupling * (pair.rm / pair.m - (pair.r1 / pair.l1 + pair.r2 / pair.l2) / 2) / pair.omega
    assert k["meter phase, common"] == pytest.approx(abs(2e-3 / math.sqrt(3) * slope), rel=1e-2)
    shares = sum(line.share for line in found.budget if line.quantity == "coupling one two")
    assert shares == pytest.approx(1, abs=1e-4)
    total = known(found.pairs[0].coupling).standard_uncertainty
    assert math.sqrt(sum(u**2 for u in k.values())) == pytest.approx(total, rel=1e-4)


# A random but seeded set of readings of an invented pair; each as (L1, L2, M) coefficients.
COEFFICIENTS = {
    ("A-B", ""): (1, 0, 0), ("C-D", ""): (0, 1, 0), SERIES: (1, 1, 2), OTHER_SERIES: (1, 1, -2),
}  # fmt: skip
GAIN_COMMON, GAIN_EACH, FLOOR = 1e-3, 5e-4, 4e-9


@pytest.mark.parametrize("seed", range(6))
@pytest.mark.parametrize("count", [3, 4], ids=["three readings", "four readings"])
@pytest.mark.parametrize("stated_as", ["limit", "standard", "expanded"])
def test_linear_propagation_beside_another_program(count: int, seed: int, stated_as: str) -> None:
    """u(M) and u(k) from the GTC library, in which every error is a quantity of its own, to 1e-6.

    Three readings are worked by the closed formula; four by weighted least squares, covariance at the fitted values,
    made here by fixed-point steps, and GTC carries all errors through its weights.
    """
    rng = np.random.default_rng([409, seed])
    l1, l2 = 10.0 ** rng.uniform(-5, -3, 2)
    m = rng.uniform(0.1, 0.8) * math.sqrt(l1 * l2) * rng.choice([-1, 1])
    noise = 2e-4 * min(l1, l2)
    hookups = list(COEFFICIENTS)[:count]
    table = np.array([COEFFICIENTS[h] for h in hookups], dtype=float)
    exact = table @ [l1, l2, m]
    read_as = exact * (1 + GAIN_EACH * 0.3 * rng.standard_normal(count)) + noise * rng.standard_normal(count)
    divisor = {"limit": math.sqrt(3), "standard": 1.0, "expanded": 2.0}[stated_as]
    gain_common, gain_each, floor = (x / divisor for x in (GAIN_COMMON, GAIN_EACH, FLOOR))

    fitted = read_as
    weights = np.linalg.inv(table) if count == 3 else np.zeros((3, count))
    for _ in range(30 if count == 4 else 0):
        v = gain_common**2 * np.outer(fitted, fitted) + np.diag((gain_each * fitted) ** 2 + noise**2) + floor**2
        inverse = np.linalg.inv(v)
        weights = np.linalg.solve(table.T @ inverse @ table, table.T @ inverse)
        fitted = table @ weights @ read_as
    common, offset = GTC.ureal(0, gain_common), GTC.ureal(0, floor)
    errors = [f * (common + GTC.ureal(0, gain_each)) + offset + GTC.ureal(0, noise) for f in fitted]
    shown = [y + e for y, e in zip(read_as, errors, strict=True)]
    a, b, c = (sum((w * x for w, x in zip(row, shown, strict=True)), GTC.ureal(0, 0)) for row in weights)
    k = c / GTC.sqrt(a * b)

    rows = [(*hookup, FREQUENCY, float(y)) for hookup, y in zip(hookups, read_as, strict=True)]
    meter = {
        "gain_common": GAIN_COMMON, "gain_each": GAIN_EACH, "floor": f"{FLOOR} H", "noise": f"{float(noise)!r} H",
        "stated_as": stated_as,
    }  # fmt: skip
    found = estimate(ROWS, rows, meter=meter)
    (pair,) = found.pairs
    for mine, theirs in ((known(pair.mutual), c), (known(pair.coupling), k)):
        assert abs(mine.value) == pytest.approx(abs(theirs.x), rel=1e-6)
        assert mine.standard_uncertainty == pytest.approx(theirs.u, rel=1e-6)
    for name, theirs in (("one", a), ("two", b)):
        assert inductance(found, name).standard_uncertainty == pytest.approx(theirs.u, rel=1e-6)
    assert "gain split unknown" not in codes(found)
