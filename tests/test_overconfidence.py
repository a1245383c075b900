"""Nothing overconfident: one-sided where the data are, open where they are, and no number made up.

Readings here are perfect unless said otherwise, so that the truth must lie within every bound: no chance is involved.
Truth comes from `references.Pair`; what a nuisance leaves open is worked out here by hand.
"""

from __future__ import annotations

import math
from itertools import combinations, pairwise
from typing import Any

import numpy as np
import pytest
from bench import codes, estimate, formula, inductance, known, quantities, recording
from references import Pair
from scipy.special import ndtr, ndtri

import mutual
from mutual.result import Estimate, Quantity

L_ROWS = "across,tied,frequency [Hz],inductance [H]"
LR_ROWS = "across,tied,frequency [Hz],inductance [H],resistance [ohm]"
SERIES, OTHER_SERIES = ("A-D", "B-C"), ("A-C", "B-D")
FIRST, SECOND = ("A-B", ""), ("C-D", "")
FIRST_SHORT, SECOND_SHORT = ("A-B", "C-D"), ("C-D", "A-B")
PARALLEL, OTHER_PARALLEL = ("A-B", "A-C B-D"), ("A-B", "A-D B-C")


def read(pair: Pair, *hookups: tuple[str, str], resistance: bool = False) -> list[tuple[Any, ...]]:
    """What a perfect meter shows."""
    found = []
    for hookup in hookups:
        z = pair.hookups()[(*hookup, "")]
        found.append((*hookup, pair.frequency, z.imag / pair.omega, *([z.real] if resistance else [])))
    return found


def pair_of(k: float, q1: float, q2: float, shared: float = 0.0) -> Pair:
    """An invented pair at 100 kHz: 100 and 40 uH, Q of each (infinite: no loss), Rm as a part of sqrt(R1 R2)."""
    l1, l2, omega = 100e-6, 40e-6, 2 * math.pi * 1e5
    r1, r2 = omega * l1 / q1, omega * l2 / q2
    return Pair(l1, l2, k * math.sqrt(l1 * l2), r1, r2, shared * math.sqrt(r1 * r2), 1e5)


def holds(q: Quantity, truth: float, slack: float = 1e-6) -> bool:
    """Whether the bounds enclose the truth, but for rounding."""
    room = slack * abs(truth) + 1e-15
    return (q.lower is None or q.lower <= truth + room) and (q.upper is None or truth - room <= q.upper)


# Tight pairs.


def test_tight_pair_read_slightly_above_one() -> None:
    """k read as 1.0004 +- 0.001: the shortest 95 % region within physics is k >= 0.9983, 1.0004 + 0.001 z.

    z is the quantile of 5 % of what the normal has below 1. M was read with noise, L1 and L2 with next to none.
    """
    columns = "across,sense,instrument,inductance [mH],transfer inductance [mH]"
    rows = [("A-B", "", "", 1, None), ("C-D", "", "", 1, None), ("A-B", "C-D", "coarse", None, 1.0004)]
    found = estimate(columns, rows, meter={"noise": "1 pH"}, coarse={"noise": "1 uH"})
    k = known(found.pairs[0].coupling)
    expected = 1.0004 + 1e-3 * ndtri(0.05 * ndtr(-0.4))
    assert expected == pytest.approx(0.9983, abs=5e-5)
    # 5e-5 is half a printed digit, and four standard deviations of a bound made of 7 000 draws or more.
    assert k.lower == pytest.approx(expected, abs=5e-5)
    assert k.bound == "lower" and k.upper in (None, 1.0) and k.value == pytest.approx(1, abs=1e-6)
    less = known(found.pairs[0].one_minus_coupling)
    assert less.bound == "upper" and less.lower == 0 and less.upper == pytest.approx(1 - expected, abs=5e-5)
    assert known(found.pairs[0].short_circuit_inductance[0]).lower == 0
    assert found.pairs[0].polarity.verdict == "same"


@pytest.mark.parametrize("excess", [-4e-4, 4e-4, 1.5e-3])
@pytest.mark.parametrize("sign", [1, -1])
def test_tight_pair_in_series(excess: float, sign: int) -> None:
    """A tight pair read aiding in series by a 0.1 % meter: never a k above 1, never an upper bound below it.

    u(k) is some 1.3e-3, so that 1 is well within reach of all three readings.
    """
    across, tied = SERIES if sign > 0 else OTHER_SERIES
    rows = [(*FIRST, 1e3, 1e-3), (*SECOND, 1e3, 1e-3), (across, tied, 1e3, 2e-3 + 2 * (1 + excess) * 1e-3)]
    found = estimate(L_ROWS, rows, meter={"gain_each": "0.1 %", "noise": "0.2 uH"})
    k = known(found.pairs[0].coupling)
    assert k.bound == "lower" and k.upper == 1.0 and 0.99 < k.lower < k.value <= 1
    assert found.consistency.verdict != "inconsistent"
    assert known(found.pairs[0].mutual).value * sign > 0


# Open and short.


@pytest.mark.parametrize("q", [math.inf, 30.0, 3.0, 0.5])
@pytest.mark.parametrize("count", [2, 3, 4], ids=["open and short", "both open, one short", "both open, both short"])
@pytest.mark.parametrize("k", [0.12, 0.6, 0.98])
def test_open_and_short_inductances_alone_bound_k_from_below(k: float, q: float, count: int) -> None:
    """Nothing is known of the short's resistance: k >= sqrt(1 - Ls/Lo) and no more, and the truth is there."""
    pair = pair_of(k, 20.0, q)
    hookups = (FIRST, FIRST_SHORT, SECOND, SECOND_SHORT)[:count]
    found = estimate(L_ROWS, read(pair, *hookups), meter={"gain": "0.05 %"})
    bound = known(found.pairs[0].coupling)
    bare = math.sqrt(1 - read(pair, FIRST_SHORT)[0][3] / pair.l1)
    assert holds(bound, k)
    if count < 4:
        assert bound.bound == "lower" and bound.upper in (None, 1.0) and bound.standard_uncertainty is None
        assert bound.value == pytest.approx(bare, abs=1e-4)
    assert 0.97 * bare - 0.01 < bound.lower
    assert "resistive short" in codes(found, "caution")
    for name, truth in (("one", pair.l1), ("two", pair.l2)):
        q_own = found.windings[name].inductance
        assert q_own is None or holds(q_own, truth)
    assert found.pairs[0].mutual is None


@pytest.mark.parametrize("ls", [1.97e-6, 10e-6, 30e-6])
@pytest.mark.parametrize(
    ("meter", "u", "factor"),
    [({"noise": "30 nH"}, 30e-9, 1.96), ({"gain_each": "0.1 %"}, 43.7e-9 / math.sqrt(3), 1.645)],
)
def test_a_short_does_not_sharpen_the_winding_alone(ls: float, meter: dict[str, str], u: float, factor: float) -> None:
    """As many readings as unknowns: L1 is known as its own reading is, +-1.96 sigma or 95 % of a rectangle (1.645 u).

    A bound that takes the rectangle for a normal (1.96 u) is wide, not wrong.
    """
    rows = [(*FIRST, 1e5, 43.7e-6), (*SECOND, 1e5, 43.7e-6), (*FIRST_SHORT, 1e5, ls)]
    found = estimate(L_ROWS, rows, meter=meter)
    for name in ("one", "two"):
        own = inductance(found, name)
        for half in (known(own).upper - own.value, own.value - own.lower):
            assert 0.97 * factor * u < half < 1.05 * 1.96 * u


# Losses that two windings share.


def one_side(pair: Pair, part: float) -> tuple[float, float]:
    """Least and largest k that open and short impedance from one side leave, |Rm| <= part sqrt(R1 R2).

    Of -zm^2/Z2 only the value is known: zm^2 = D (R2 + j omega L2). With zm = omega sqrt(L1 L2) (r/sqrt(Q1 Q2) + j k)
    and d = D/(omega L1), (r/sqrt(Q1 Q2) + j k)^2 = -d (1/Q2 + j), a curve that Q2 runs along.
    """
    change = pair.hookups()["A-B", "C-D", ""] - pair.z1
    d = -change / (pair.omega * pair.l1)
    q1 = pair.omega * pair.l1 / pair.r1
    q2 = np.geomspace(1e-4, 1e7, 400_001)
    root = np.sqrt(d * (1 / q2 + 1j))
    root = np.where(root.imag < 0, -root, root)
    k, r = root.imag, root.real * np.sqrt(q1 * q2)
    possible = (np.abs(r) <= part * (1 + 1e-9)) & (k <= 1)
    return float(k[possible].min()), float(k[possible].max())


# As good as a bench has it: a millionth or two of the 100 uH and 63 ohm read.
FINE = {"noise": ["0.1 nH", "0.1 mohm", "1e-4 1"]}


def from_one_side(pair: Pair, part: float, as_quality: bool = False) -> Estimate:
    """Open and short from the first side, by a very good meter."""
    rows = read(pair, FIRST, FIRST_SHORT, resistance=True)
    columns = LR_ROWS
    if as_quality:
        rows = [(*row[:4], pair.omega * row[3] / row[4]) for row in rows]
        columns = f"{L_ROWS},quality"
    return estimate(columns, rows, meter=FINE, shared_loss=part)


@pytest.mark.parametrize("as_quality", [False, True], ids=["R", "Q"])
def test_shared_loss_at_its_default(as_quality: bool) -> None:
    """k 0.12, both windings of Q 30, at most a tenth of sqrt(R1 R2) shared: 0.1200 to 0.1205 remains."""
    pair = pair_of(0.12, 30, 30)
    least, most = one_side(pair, 0.1)
    assert (least, most) == pytest.approx((0.1200, 0.1205), abs=5e-5)
    found = from_one_side(pair, 0.1, as_quality)
    k = known(found.pairs[0].coupling)
    # Beyond the curve lies the noise of both readings, 0.14 nH of k^2 L1, and that of both resistances.
    u = 0.1414e-9 / (2 * 0.12 * pair.l1)
    assert least - 3 * u < k.lower < least - u and most + u < k.upper < most + 4 * u
    assert k.value == pytest.approx(0.12, abs=1e-5)
    assert "losses shared" in codes(found, "note")
    assert known(formula(found, "two shorted, impedances").coupling).value == pytest.approx(0.12, abs=1e-9)


@pytest.mark.parametrize("q", [10.0, 30.0, 100.0])
def test_shared_loss_without_a_bound(q: float) -> None:
    """With shared_loss = 1, open and short from one side leave k = 0.12 anywhere up to 1, whatever the Q."""
    pair = pair_of(0.12, q, q)
    least, most = one_side(pair, 1.0)
    assert least == pytest.approx(0.12, abs=5e-4) and most > 0.999
    k = known(from_one_side(pair, 1.0).pairs[0].coupling)
    assert k.lower <= least + 1e-6 and k.upper in (None, 1.0)
    assert k.bound == "lower"


@pytest.mark.parametrize(
    ("k", "q", "part", "used"),
    [(k, q, part, used)
     for used in (0, 0.9, -0.9, 0.5)
     for k, q, part in ((0.02, 30, 0.1), (0.05, 30, 0.1), (0.12, 10, 0.1), (0.12, 30, 0.3), (0.12, 30, 0.46),
                        (0.3, 30, 0.1), (0.3, 30, 1), (0.5, 100, 1), (0.9, 10, 0.1), (0.9, 10, 1))],
)  # fmt: skip
def test_shared_loss_is_enclosed(k: float, q: float, part: float, used: float) -> None:
    """Whatever part of the allowed loss is really shared, the bounds hold all k that the readings leave."""
    pair = pair_of(k, q, q, used * part)
    least, most = one_side(pair, part)
    assert least - 1e-6 < k < most + 1e-6
    found = known(from_one_side(pair, part).pairs[0].coupling)
    assert found.lower <= least + 1e-6
    assert found.upper is None or found.upper >= most - 1e-6 - 1e-3 * (most - k)
    # Nor may it say nothing where the readings say something: 0.15 nH (noise of both readings) of k^2 L1 is 2 u(k)/k.
    u = k * 0.15e-9 / (2 * k**2 * pair.l1)
    assert found.lower >= least - 0.5 * max(k - least, 0.01 * k) - 4 * u


def test_losses_above_direct_current_bound_the_shared_loss() -> None:
    """Rm^2 <= dR1 dR2: resistances hardly above those at 0 Hz leave nothing to share, whatever `shared_loss` says."""
    pair = pair_of(0.12, 30, 30)
    rows = read(pair, FIRST, FIRST_SHORT, resistance=True)
    widths = []
    for excess in (0.002, 0.3):
        direct = [("A-B", "", 0, None, pair.r1 / (1 + excess)), ("C-D", "", 0, None, pair.r2 / (1 + excess))]
        second = read(pair, SECOND, resistance=True)
        found = estimate(LR_ROWS, [*rows, *second, *direct], meter=FINE, shared_loss=1.0)
        k = known(found.pairs[0].coupling)
        assert holds(k, 0.12, 1e-5)
        widths.append(k.upper - k.lower)
    assert widths[0] < 1e-3


def test_both_sides_determine_what_is_shared() -> None:
    """All of open, short and series read with resistance: Rm is measured, so that shared_loss changes nothing."""
    pair = pair_of(0.12, 30, 30, 0.6)
    rows = read(pair, FIRST, SECOND, FIRST_SHORT, SECOND_SHORT, SERIES, OTHER_SERIES, resistance=True)
    meter = {"noise": ["1 nH", "1 mohm"]}
    small, large = (estimate(LR_ROWS, rows, meter=meter, shared_loss=s) for s in (0.0, 1.0))
    for found in (small, large):
        assert known(found.pairs[0].coupling).value == pytest.approx(0.12, abs=1e-6)
        assert known(found.pairs[0].mutual_resistance).value == pytest.approx(pair.rm, rel=1e-6)
        assert "losses shared" not in codes(found)
    assert small.pairs[0].coupling == large.pairs[0].coupling


def test_resistance_of_the_shorted_winding_makes_k_known_from_both_sides() -> None:
    """With L2 and R2 read, open and short inductance of the other side bound k above as well."""
    pair = pair_of(0.6, 20, 3)
    rows = [(*row, None) for row in read(pair, FIRST, FIRST_SHORT)] + read(pair, SECOND, resistance=True)
    found = estimate(LR_ROWS, rows, meter={"gain_each": "0.05 %"})
    k = known(found.pairs[0].coupling)
    assert k.bound == "both" and holds(k, 0.6) and k.upper < 0.65 and k.lower > 0.55


# Signs.


@pytest.mark.parametrize("resistance", [False, True])
@pytest.mark.parametrize("m_sign", [1, -1])
def test_magnitudes_leave_the_sign_open(resistance: bool, m_sign: int) -> None:
    """Shorts know M by its square only."""
    pair = pair_of(0.4 * m_sign, 30, 30)
    rows = read(pair, FIRST, SECOND, FIRST_SHORT, SECOND_SHORT, resistance=resistance)
    found = estimate(LR_ROWS if resistance else L_ROWS, rows, meter={"gain": "0.1 %"})
    (result,) = found.pairs
    assert result.mutual is None
    assert holds(known(result.mutual_magnitude), abs(pair.m))
    assert result.polarity.verdict == "undetermined"
    assert result.polarity.probability_same == pytest.approx(0.5, abs=1e-3)
    assert result.polarity.dot_leads is None and found.dots is None
    assert "sign" in codes(found)
    assert found.reliable  # it is no contradiction
    # One more reading, in series, settles it.
    more = [*rows, *read(pair, SERIES, resistance=resistance)]
    settled = estimate(LR_ROWS if resistance else L_ROWS, more, meter={"gain": "0.1 %"})
    assert known(settled.pairs[0].mutual).value == pytest.approx(pair.m, rel=1e-3)
    assert settled.pairs[0].polarity.verdict == ("same" if m_sign > 0 else "opposite")


@pytest.mark.parametrize("offset", [0.0, 0.3, -1.0])
def test_coupling_near_zero_is_bounded_from_zero(offset: float) -> None:
    """M read within its uncertainty of zero: k from 0 upward, sign undetermined, M with both signs in its bounds."""
    u = math.sqrt(2) / 4 * 10e-9
    m = offset * u
    rows = [(*FIRST, 1e4, 1e-4), (*SECOND, 1e4, 1e-4), (*SERIES, 1e4, 2e-4 + 2 * m), (*OTHER_SERIES, 1e4, 2e-4 - 2 * m)]
    found = estimate(L_ROWS, rows, meter={"gain_common": "0.1 %", "noise": "10 nH"})
    (pair,) = found.pairs
    k = known(pair.coupling)
    assert k.lower == 0 and k.bound == "upper" and 1.5 * u / 1e-4 < k.upper < 3 * u / 1e-4
    assert known(pair.mutual).lower < 0 < known(pair.mutual).upper
    assert pair.polarity.verdict == "undetermined" and found.dots is None
    # The odds are those of the normal: P(M > 0) = Phi(offset), the limits of k being far away.
    assert pair.polarity.probability_same == pytest.approx(ndtr(offset), abs=0.01)


def test_coupling_near_zero_by_a_short() -> None:
    """The square of a small k is lost in noise: a short of 100 uH +- 10 nH cannot tell k below about 0.014."""
    pair = pair_of(0.001, math.inf, math.inf)
    rows = [(*row, 0.0) for row in read(pair, FIRST, SECOND, FIRST_SHORT)]
    found = estimate(LR_ROWS, rows, meter={"noise": ["10 nH", "0.1 mohm"]})
    k = found.pairs[0].coupling
    assert k is None or (k.lower == 0 and holds(k, 0.001) and 0.005 < known(k).upper < 0.05)


# What is not known is null, and what is known is physical.


def all_quantities(found: Estimate) -> dict[str, Quantity]:
    """Everything that the estimate gives, by name."""
    every: dict[str, Quantity | None] = {f"L {name}": w.inductance for name, w in found.windings.items()}
    every |= {f"R {name}": w.resistance for name, w in found.windings.items()}
    every |= quantities(found.pairs[0])
    every["Rm"] = found.pairs[0].mutual_resistance
    return {name: q for name, q in every.items() if q is not None}


def truths(pair: Pair) -> dict[str, float]:
    """The true values under the same names."""
    k, size = abs(pair.coupling), abs(pair.m)
    return {
        "L one": pair.l1, "L two": pair.l2, "R one": pair.r1, "R two": pair.r2, "Rm": pair.rm,
        "mutual": pair.m, "mutual magnitude": size, "coupling": k, "one minus coupling": 1 - k,
        "shorted, first": pair.l1 * (1 - k * k), "shorted, second": pair.l2 * (1 - k * k),
        "ratio, first": size / pair.l1, "ratio, second": size / pair.l2,
    }  # fmt: skip


HOOKUPS = (FIRST, SECOND, SERIES, OTHER_SERIES, FIRST_SHORT, SECOND_SHORT, PARALLEL, OTHER_PARALLEL)
SMALL_SETS = [s for n in (1, 2) for s in combinations(HOOKUPS, n)]
LARGER_SETS = [list(combinations(HOOKUPS, n))[i] for n, i in ((3, 0), (3, 9), (3, 17), (3, 26), (3, 33), (3, 41),
               (3, 54), (4, 0), (4, 13), (4, 29), (4, 44), (4, 58), (4, 69), (5, 11), (5, 37), (6, 20))]  # fmt: skip


def label(hookups: tuple[tuple[str, str], ...]) -> str:
    return ", ".join(" tied ".join(part for part in h if part) for h in hookups)


FEW = [(r, s) for r in (False, True) for s in (*SMALL_SETS, *LARGER_SETS)]


@pytest.mark.parametrize(
    ("resistance", "hookups"),
    FEW,
    ids=lambda x: label(x) if isinstance(x, tuple) else "L and R" if x else "L",
)
def test_few_readings_never_say_too_much(resistance: bool, hookups: tuple[tuple[str, str], ...]) -> None:
    """Perfect readings of part of the hookups: the truth is in all bounds, all bounds are physical, the rest is null.

    The windings have a Q of 4 and 6, which nobody who reads inductances alone can know. What they share (5 % of
    sqrt(R1 R2)) is within what the program allows for where resistances are read, and nil where none is, as it states.
    """
    pair = pair_of(-0.45, 4.0, 6.0, 0.05 if resistance else 0.0)
    rows = read(pair, *hookups, resistance=resistance)
    meter = {"gain_each": "0.02 %", "phase_each": "0.2 mrad", "noise": ["1 nH", "1 mohm"]}
    found = estimate(LR_ROWS if resistance else L_ROWS, rows, meter=meter)
    assert found.consistency.verdict != "inconsistent"
    truth, given = truths(pair), all_quantities(found)
    wrong = {name: (q, truth[name]) for name, q in given.items() if not holds(q, truth[name], 1e-5)}
    assert not wrong
    verdict = found.pairs[0].polarity.verdict
    assert verdict in ("opposite", "undetermined")
    check_physical(found, given)
    missing = {"coupling", "mutual magnitude", "L one", "L two"} - set(given)
    assert not missing or "undetermined" in codes(found)
    assert found.pairs[0].coupling is not None or found.pairs[0].one_minus_coupling is None


def check_physical(found: Estimate, given: dict[str, Quantity]) -> None:
    """No number is huge: all lie within what the readings (at most 300 uH and 60 ohm) could ever mean."""
    for name, q in given.items():
        for end in (q.lower, q.value, q.upper):
            if end is None:
                continue
            assert math.isfinite(end)
            if name.startswith(("L", "shorted", "mutual m")):
                assert 0 <= end < 1e-3, name
            elif name == "mutual":
                assert abs(end) < 1e-3, name
            elif name.startswith(("coupling", "one minus")):
                assert 0 <= end <= 1, name
            elif name.startswith("R "):
                assert 0 <= end < 1e3, name
        assert q.lower is None or q.lower <= q.value, name
        assert q.upper is None or q.value <= q.upper, name
        assert q.bound in ("both", "lower", "upper")
        if name == "coupling" and q.bound == "both":
            assert (q.lower, q.upper) != (0, 1), "a bound that says nothing"
    own = [found.windings[name].inductance for name in found.windings]
    m = found.pairs[0].mutual_magnitude
    if m is not None and m.upper is not None and all(q is not None and q.upper is not None for q in own):
        assert m.upper <= 1.0001 * math.sqrt(known(own[0]).upper * known(own[1]).upper)


def test_series_readings_alone_bound_k_from_below() -> None:
    """La and Lo give L1 + L2 and M: k >= M/((L1 + L2)/2), with equality for equal windings; L1 and L2 are open."""
    pair = pair_of(0.7, math.inf, math.inf)
    found = estimate(L_ROWS, read(pair, SERIES, OTHER_SERIES), meter={"noise": "1 nH"})
    (result,) = found.pairs
    assert known(result.mutual).value == pytest.approx(pair.m, rel=1e-6)
    assert {name for name, w in found.windings.items() if w.inductance is not None} == set()
    if result.coupling is not None:
        assert result.coupling.bound == "lower" and holds(result.coupling, 0.7)
        assert result.coupling.lower == pytest.approx(2 * pair.m / (pair.l1 + pair.l2), rel=1e-3)


def test_slips_that_make_repeats_do_not_mend_what_contradicts_itself() -> None:
    """Exchanging the leads of one row would make it a repeat of another, 70 % away: no 0.3 % meter does that."""
    pair = pair_of(0.25, math.inf, math.inf)
    rows = read(pair, FIRST, SECOND, SERIES, OTHER_SERIES)
    rows[0] = (*rows[0][:3], 1.02 * rows[0][3])
    found = estimate(L_ROWS, [(*row[:3], f"{row[3]:.3e}") for row in rows], meter={"gain": "0.3 %"})
    assert found.consistency.verdict == "inconsistent"
    texts = {(s.hookup, s.text) for s in found.consistency.suspects}
    assert not any("exchanged" in text and hookup in ("A-D tied B-C", "A-C tied B-D") for hookup, text in texts)
    for suspect in found.consistency.suspects:
        ends = [] if suspect.mutual is None else [suspect.mutual.lower, suspect.mutual.upper]
        assert all(abs(end) < 1.1 * math.sqrt(pair.l1 * pair.l2) for end in ends if end is not None), suspect


# Accuracy that is not stated, or not fully.


@pytest.mark.parametrize("meter", [{}, {"gain": "0.1 %"}, {"gain_common": "0.1 %"}])
def test_numbers_that_contradict_themselves_are_answered(meter: dict[str, str]) -> None:
    """Numbers from Python have no last digit: beside a common gain alone half a per cent is 5e6 sigma, and no crash."""
    pair = pair_of(0.25, math.inf, math.inf)
    rows = read(pair, FIRST, SECOND, SERIES, OTHER_SERIES)
    rows[0] = (*rows[0][:3], 1.005 * rows[0][3])
    found = estimate(L_ROWS, rows, meter=meter)
    assert found.consistency.verdict == ("inconsistent" if meter else "not testable")
    assert known(found.pairs[0].mutual).value == pytest.approx(pair.m, rel=0.05)


def test_a_zero_without_digits_is_no_exact_zero() -> None:
    """A resistance of 0 from Python, no accuracy stated: it cannot outweigh all else, and nothing breaks."""
    pair = pair_of(0.6, math.inf, math.inf)
    rows = [(*row, 0.0) for row in read(pair, FIRST, SECOND, FIRST_SHORT)]
    found = estimate(LR_ROWS, rows)
    assert known(found.pairs[0].coupling).value == pytest.approx(0.6, rel=1e-6)


def test_no_accuracy_stated() -> None:
    """A caution, no test, and bounds from the last printed digit alone, which the basis says."""
    rows = [(*FIRST, "4.71"), (*SECOND, "3.02"), (*SERIES, "9.84"), (*OTHER_SERIES, "5.59")]
    found = estimate("across,tied,inductance [mH]", rows)
    assert "no accuracy" in codes(found, "caution")
    assert found.consistency.verdict == "not testable" and found.consistency.p_value is None
    assert found.consistency.bounds_basis == "repeatability only"
    m = known(found.pairs[0].mutual)
    # Half a digit of each series reading over 4, as rectangles: 5 uH sqrt(2/3)/4.
    assert m.standard_uncertainty == pytest.approx(5e-6 * math.sqrt(2 / 3) / 4, rel=0.01)
    assert found.reliable


def test_no_accuracy_and_a_closure_that_misses() -> None:
    """Contract, section 4: no accuracy stated and a closure that misses by more than 5 % is a caution as well."""
    rows = [(*FIRST, "4.71"), (*SECOND, "3.02"), (*SERIES, "12.3"), (*OTHER_SERIES, "5.59")]
    found = estimate("across,tied,inductance [mH]", rows)
    assert {"no accuracy", "closure"} <= codes(found, "caution")
    assert found.consistency.verdict == "not testable"


@pytest.mark.parametrize("hookups", [(FIRST, SECOND, SERIES, OTHER_SERIES), (FIRST, SECOND, SERIES)], ids=label)
def test_a_gain_of_unknown_split_gives_the_union(hookups: tuple[tuple[str, str], ...]) -> None:
    """Both extremes are fitted: each bound is the wider one, u the larger, and a finding says so."""
    pair = pair_of(0.3, math.inf, math.inf)
    rows = read(pair, *hookups)
    unknown, common, each = (
        estimate(L_ROWS, rows, meter={key: "0.3 %", "noise": "1 nH"}) for key in ("gain", "gain_common", "gain_each")
    )
    assert "gain split unknown" in codes(unknown) and "gain split unknown" not in codes(common) | codes(each)
    for name in ("mutual", "coupling", "ratio, first"):
        found, one, other = (known(quantities(e.pairs[0])[name]) for e in (unknown, common, each))
        tiny = 1e-6 * (found.upper - found.lower)
        assert found.lower == pytest.approx(min(one.lower, other.lower), abs=tiny)
        assert found.upper == pytest.approx(max(one.upper, other.upper), abs=tiny)
        assert found.standard_uncertainty == pytest.approx(
            max(one.standard_uncertainty, other.standard_uncertainty), rel=1e-6
        )
    k_common, k_each = (known(e.pairs[0].coupling).standard_uncertainty for e in (common, each))
    assert k_common < 0.1 * k_each  # a common gain is not in k: that is what the split decides


def test_unknown_split_is_inconsistent_only_if_both_extremes_are() -> None:
    """Readings that a 0.3 % gain of each explains, and a common one does not, are no contradiction."""
    pair = pair_of(0.3, math.inf, math.inf)
    rows = read(pair, FIRST, SECOND, SERIES, OTHER_SERIES)
    rows[2] = (*rows[2][:3], 1.002 * rows[2][3])
    verdicts = [
        estimate(L_ROWS, rows, meter={key: "0.3 %", "noise": "1 nH"}).consistency.verdict
        for key in ("gain", "gain_each", "gain_common")
    ]
    assert verdicts == ["consistent", "consistent", "inconsistent"]


def test_coverage_widens_the_bounds() -> None:
    """From 80 to 99 %: nested bounds, the same value."""
    pair = pair_of(0.3, math.inf, math.inf)
    made = recording(L_ROWS, read(pair, FIRST, SECOND, SERIES, OTHER_SERIES), meter={"gain": "0.3 %", "noise": "5 nH"})
    found = [known(mutual.estimate(made, coverage=c).pairs[0].coupling) for c in (0.8, 0.95, 0.99)]
    for inner, outer in pairwise(found):
        assert outer.lower < inner.lower < inner.value < inner.upper < outer.upper
        assert outer.value == inner.value
