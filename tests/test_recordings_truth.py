"""Every shipped recording against the invented device behind it, which its netlist holds and the estimate never sees.

The recordings are fixed files, so nothing here fails by chance; when they were drawn, one true value in 20 was to lie
outside a 95 % bound. Hence the criterion: within three standard uncertainties (1 in 370 outside for a normal error,
none for a rectangle), within the bounds widened by half, and at most a tenth of all truths outside the bounds.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from functools import cache
from itertools import combinations
from pathlib import Path

import pytest
from bench import quantities
from netlists.scenario import Scenario
from netlists.scenarios import SCENARIOS

import mutual
from mutual.result import Estimate, Quantity

RECORDINGS = Path(__file__).parent.parent / "recordings"
HONEST = [name for name in SCENARIOS if name != "miswired"]


@cache
def estimated(name: str) -> Estimate:
    return mutual.estimate(mutual.read(RECORDINGS / f"{name}.csv"))


def truths(scenario: Scenario, found: Estimate) -> Iterator[tuple[str, Quantity | None, float]]:
    """Name, what was found and what is true, of every quantity that the scenario defines."""
    names = [w[0] for w in scenario.windings]
    henry, ohm = scenario.inductance, scenario.resistance
    for i, name in enumerate(names):
        yield f"L {name}", found.windings[name].inductance, henry[i][i]
        yield f"R {name}", found.windings[name].resistance, ohm[i][i]
        if scenario.direct is not None:
            yield f"R {name} at 0 Hz", found.windings[name].direct_resistance, scenario.direct[i][i]
    for i, j in combinations(range(len(names)), 2):
        pair = found.pair(names[i], names[j])
        m, l1, l2 = henry[i][j], henry[i][i], henry[j][j]
        k = abs(m) / math.sqrt(l1 * l2)
        true = {
            "mutual": m, "mutual magnitude": abs(m), "coupling": k, "one minus coupling": 1 - k,
            "shorted, first": l1 * (1 - k * k), "shorted, second": l2 * (1 - k * k),
            "ratio, first": abs(m) / l1, "ratio, second": abs(m) / l2,
        }  # fmt: skip
        for kind, q in quantities(pair).items():
            yield f"{kind} {names[i]} {names[j]}", q, true[kind]
        yield f"Rm {names[i]} {names[j]}", pair.mutual_resistance, ohm[i][j]


def test_every_recording_has_its_scenario() -> None:
    assert {path.stem for path in RECORDINGS.glob("*.csv")} == set(SCENARIOS)


@pytest.mark.parametrize("name", HONEST)
def test_truth_is_within_reach(name: str) -> None:
    found = estimated(name)
    assert found.consistency.verdict == "consistent" and found.reliable
    far = {}
    for label, q, true in truths(SCENARIOS[name], found):
        if q is None:
            continue
        u = q.standard_uncertainty if q.bound == "both" else None
        if u is not None and abs(q.value - true) > 3 * u:
            far[label] = (q, true)
        # Bounds widened by half; the only criterion where they are one-sided.
        for end, side in ((q.lower, 1), (q.upper, -1)):
            if end is not None and side * (end - true) > abs(q.value - end) / 2 + 1e-15:
                far[label] = (q, true)
    assert not far


def test_bounds_hold_the_truth_about_as_often_as_they_say() -> None:
    """At 95 % and with most quantities of one recording correlated, nine in ten is what eight recordings can show."""
    inside = outside = 0
    for name in HONEST:
        for _, q, true in truths(SCENARIOS[name], estimated(name)):
            if q is not None:
                missed = (q.lower is not None and true < q.lower) or (q.upper is not None and true > q.upper)
                inside, outside = inside + (not missed), outside + missed
    assert inside + outside > 100
    assert outside <= 0.1 * (inside + outside)


@pytest.mark.parametrize("name", HONEST)
def test_couplings_are_known_as_well_as_the_readings_allow(name: str) -> None:
    """So that wide bounds do not pass: every k to a hundredth, the null pair's and that of the low-Q short as well."""
    for pair in estimated(name).pairs:
        k = pair.coupling
        assert k is not None and k.lower is not None and k.upper is not None
        assert k.upper - k.lower < 0.02


@pytest.mark.parametrize("name", HONEST)
def test_polarity(name: str) -> None:
    """Every verdict right; the null pair and what was read open and short have none."""
    scenario, found = SCENARIOS[name], estimated(name)
    names = [w[0] for w in scenario.windings]
    open_ended = name in ("null_pair", "open_short_low_q")
    for i, j in combinations(range(len(names)), 2):
        word = found.pair(names[i], names[j]).polarity.verdict
        assert word == ("undetermined" if open_ended else "same" if scenario.inductance[i][j] > 0 else "opposite")


def test_dots_and_arrangements() -> None:
    limb = estimated("three_on_one_limb")
    assert limb.dots == (("A", "C", "F"), ("B", "D", "E"))
    assert [t.sign_product for t in limb.arrangement.triples] == [1]
    # The second winding is listed finish first: its start is lead 4.
    stator = estimated("six_lead_stator")
    assert stator.dots is None
    assert stator.arrangement.phase_starts == (("1", "4", "5"), ("2", "3", "6"))
    assert [t.sign_product for t in stator.arrangement.triples] == [-1]
    assert estimated("charging_coils").dots == (("A", "C"), ("B", "D"))
    assert estimated("aerial_coils").dots == (("A", "D"), ("B", "C"))
    assert estimated("tapped_choke").dots == (("E", "T"), ("T", "P"))


def test_null_pair_is_bounded_from_zero() -> None:
    (pair,) = estimated("null_pair").pairs
    assert pair.coupling is not None and pair.coupling.lower == 0 and pair.coupling.bound == "upper"
    assert 1e-4 <= (pair.coupling.upper or 0) < 2e-3
    assert pair.mutual is not None and (pair.mutual.lower or 0) < 0 < (pair.mutual.upper or 0)


def test_open_and_short_with_a_low_q() -> None:
    """The bare formula is off by a seventh; the estimate is not, and leaves the sign open."""
    found, true = estimated("open_short_low_q"), 0.985
    (pair,) = found.pairs
    bare = next(f.coupling for f in found.formulas if f.name == "bell shorted")
    assert bare is not None and bare.value < 0.87
    assert pair.coupling is not None and pair.coupling.value == pytest.approx(true, abs=2e-3)
    assert pair.mutual is None and pair.mutual_magnitude is not None
    assert {"resistive short", "sign"} <= {f.code for f in found.findings}


def test_miswired_names_the_true_slip_first_with_the_right_answer() -> None:
    """Row 5 was read with the two ties exchanged, as the scenario says; mended, k and M are those of the device."""
    scenario, found = SCENARIOS["miswired"], estimated("miswired")
    assert found.consistency.verdict == "inconsistent" and not found.reliable
    first = found.consistency.suspects[0]
    assert first.where.endswith("row 5") and first.hookup == "A-B tied A-C B-D"
    assert "ties were exchanged" in first.text
    assert first.p_value >= 1e-3
    m = scenario.inductance[0][1]
    k = m / math.sqrt(scenario.inductance[0][0] * scenario.inductance[1][1])
    for q, true in ((first.mutual, m), (first.coupling, k)):
        assert q is not None and q.standard_uncertainty is not None
        assert abs(q.value - true) < 3 * q.standard_uncertainty
        assert q.lower is not None and q.upper is not None and q.upper - q.lower < 0.02 * true
