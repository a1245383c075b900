"""Kicks: what a deflection says of the signs, in any hookup. Truth by hand, and paths of currents by tests/loops.py."""

from __future__ import annotations

from itertools import combinations

import loops
import numpy as np
import pytest
from bench import recording

from mutual.device import Device, Hookup, Winding
from mutual.methods.kick import Kick, Kicks, kicks
from mutual.recording.model import KickTable, Row
from mutual.result import Finding

PAIR = Device("invented", (Winding("one", "A", "B"), Winding("two", "C", "D")))
THREE = Device("invented", (*PAIR.windings, Winding("three", "E", "F")))


def struck(
    hookup: Hookup, make: str = "+", broke: str = "", device: Device = PAIR, times: int = 1
) -> tuple[Kicks, list[Finding]]:
    """One hookup, kicked."""
    shown = {name: sign for name, sign in (("kick on make", make), ("kick on break", broke)) if sign}
    rows = [(Row(k + 1, hookup, kicks=shown), f"a.csv row {k + 1}") for k in range(times)]
    return kicks(device, rows, KickTable(misread=0.07, reversed=0.003))


def only(hookup: Hookup, make: str = "+", broke: str = "", device: Device = PAIR) -> Kick:
    """The one kick, about which there is nothing to say."""
    found, findings = struck(hookup, make, broke, device)
    assert findings == []
    (kick,) = found.each
    return kick


def silent(hookup: Hookup, make: str = "+", broke: str = "", device: Device = PAIR) -> Finding:
    """Why a row is not used."""
    found, (finding,) = struck(hookup, make, broke, device)
    assert found.each == () and finding.where == "a.csv row 1"
    return finding


ACROSS = Hookup(("A", "B"), (), ("C", "D"))


@pytest.mark.parametrize(
    ("make", "broke", "seen"),
    [("+", "-", 1), ("+", "", 1), ("", "-", 1), ("0", "-", 1), ("-", "+", -1), ("-", "0", -1), ("", "+", -1)],
)
def test_a_kick_reverses_at_break(make: str, broke: str, seen: int) -> None:
    assert only(ACROSS, make, broke) == Kick(((0, 1, 1),), seen, 0.07)


@pytest.mark.parametrize("signs", ["++", "--"])
def test_make_and_break_that_disagree_say_nothing(signs: str) -> None:
    finding = silent(ACROSS, *signs)
    assert (finding.level, finding.code) == ("caution", "kick disagrees")


@pytest.mark.parametrize(("make", "broke"), [("0", ""), ("", "0"), ("0", "0")])
def test_no_deflection_says_nothing(make: str, broke: str) -> None:
    finding = silent(ACROSS, make, broke)
    assert (finding.level, finding.code) == ("note", "left out")


def test_the_table_gives_the_chances() -> None:
    found, _ = struck(ACROSS)
    assert found.reversed == 0.003 and found.each[0].misread == 0.07
    assert KickTable() == KickTable(misread=0.1, reversed=0.0001)


def test_leads_exchanged_at_either_side_turn_the_kick_round() -> None:
    for across, sense, sign in (("BA", "CD", -1), ("AB", "DC", -1), ("BA", "DC", 1), ("CD", "AB", 1), ("DC", "AB", -1)):
        assert only(Hookup(tuple(across), (), tuple(sense))).terms == ((0, 1, sign),)


@pytest.mark.parametrize("tied", [(), (("C", "D"),)])
def test_the_voltmeter_across_the_battery_shows_its_own_sense_whatever_is_coupled(tied: tuple) -> None:
    assert only(Hookup(("A", "B"), tied, ("A", "B"))).terms == ((0, 0, 1),)
    assert only(Hookup(("A", "B"), tied, ("B", "A"))).terms == ((0, 0, -1),)


def test_the_voltmeter_across_two_in_series_that_are_fed_says_nothing_of_their_coupling() -> None:
    """L1 + L2 + 2 M of a passive pair is never negative."""
    assert only(Hookup(("A", "D"), (("B", "C"),), ("A", "D"))).terms == ((0, 0, 1),)
    assert only(Hookup(("A", "C"), (("B", "D"),), ("C", "A"))).terms == ((0, 0, -1),)
    # Leads that a wire joins to the battery's are the battery's.
    assert only(Hookup(("A", "B"), (("A", "C"), ("E", "B")), ("C", "E")), device=THREE).terms == ((0, 0, 1),)


def test_shorted_windings_make_a_kick_useless_for_signs() -> None:
    finding = silent(Hookup(("A", "B"), (("E", "F"),), ("C", "D")), device=THREE)
    assert finding.level == "caution" and "shorted" in finding.text
    delta = Device("invented", (Winding("u", "A", "B"), Winding("v", "B", "C"), Winding("w", "C", "A")))
    assert silent(Hookup(("A", "B"), (), ("B", "C")), device=delta).level == "caution"


def test_sensed_leads_that_a_wire_joins_show_nothing() -> None:
    finding = silent(Hookup(("A", "B"), (("C", "E"),), ("C", "E")), device=THREE)
    assert finding.level == "caution" and "join the sensed leads" in finding.text


def test_wires_with_an_impedance_of_their_own_change_nothing() -> None:
    stiff = Device("invented", THREE.windings, tie_resistance=0.01, tie_inductance=1e-7)
    joined = (("B", "E"),)
    assert only(Hookup(("A", "B"), joined, ("C", "D")), device=stiff).terms == ((0, 1, 1),)
    # Leads that a wire joins to the battery's are the battery's; between the ends of a wire nothing is induced.
    assert only(Hookup(("A", "B"), joined, ("A", "E")), device=stiff).terms == ((0, 0, 1),)
    assert "join the sensed leads" in silent(Hookup(("A", "B"), joined, ("B", "E")), device=stiff).text


def test_a_sum_has_one_term_for_each_m_and_l_in_it() -> None:
    """Fed from A through N to C, sensed from A to N: L1 - M12 of windings that share N."""
    star = Device("invented", (Winding("one", "A", "N"), Winding("two", "C", "N"), Winding("three", "E", "N")))
    assert only(Hookup(("A", "C"), (), ("A", "N")), device=star).terms == ((0, 0, 1), (0, 1, -1))
    # The voltage from E to C: M13 - M12 by the current in one, L2 - M23 by that in two.
    assert only(Hookup(("A", "C"), (), ("E", "C")), device=star).terms == ((0, 1, -1), (0, 2, 1), (1, 1, 1), (1, 2, -1))


def test_hookups_that_contradict_themselves_are_named() -> None:
    plus, minus = {"kick on make": "+"}, {"kick on make": "-"}
    rows = [(Row(k + 1, ACROSS, kicks=plus if k < 4 else minus), f"row {k + 1}") for k in range(9)]
    found, (finding,) = kicks(PAIR, rows, KickTable(misread=0.05))
    # Four or more of nine wrong: binomial, 126 0.05^4 0.95^5 + ... = 6.4e-4. At 0.1 it is 8.3e-3, which happens.
    assert len(found.each) == 9
    assert (finding.level, finding.code) == ("caution", "kick disagrees")
    assert "A-B sense C-D: 4 kicks went up at make and 5 down" in finding.text
    assert kicks(PAIR, rows, KickTable(misread=0.1))[1] == []


def random_device(rng: np.random.Generator) -> Device:
    """Two to five windings that share leads at random, without closed loops."""
    count = int(rng.integers(2, 6))
    leads = [f"L{i}" for i in range(2 * count)]
    windings: list[Winding] = []
    while len(windings) < count:
        a, b = rng.choice(leads, 2, replace=False)
        tried = [*windings, Winding(f"w{len(windings)}", str(a), str(b))]
        case = {"windings": [(w.name, w.first, w.second) for w in tried], "tied": (), "across": (str(a), str(b))}
        if loops.paths(case)[2].shape[1] == 0:
            windings = tried
    return Device("invented", tuple(windings))


def test_terms_are_those_of_the_paths_of_current_and_voltage() -> None:
    """The jump is p' L s: p the path of the current, s that of the sensed voltage, each -1, 0 or 1 in a winding."""
    rng = np.random.default_rng(5)
    compared = mixed = 0
    while compared < 400:
        device = random_device(rng)
        pairs = list(combinations(device.leads, 2))
        across, sense, tie = (tuple(map(str, rng.permutation(pairs[rng.integers(len(pairs))]))) for _ in range(3))
        tied = (tie,) if rng.random() < 0.3 else ()
        windings = [(w.name, w.first, w.second) for w in device.windings]
        try:
            p, s, closed = loops.paths({"windings": windings, "tied": tied, "across": across, "sense": sense})
        except ValueError:
            continue
        assert s is not None
        if closed.shape[1] or not p.any() or not s.any() or np.array_equal(abs(p), abs(s)):
            continue
        weight = np.outer(p, s) + np.outer(s, p)
        expected = tuple(
            (i, j, int(np.sign(weight[i, j]))) for i in range(len(p)) for j in range(i, len(p)) if weight[i, j]
        )
        if all(i == j for i, j, _ in expected):
            continue
        assert only(Hookup(across, tied, sense), device=device).terms == expected
        compared += 1
        mixed += len(expected) > 1
    assert mixed > 100


def test_kicks_of_a_recording_reach_the_estimate() -> None:
    import mutual

    made = recording("across,sense,kick on make,kick on break", [("A-B", "C-D", "-", "+")] * 4, kick={"misread": 0.05})
    polarity = mutual.estimate(made).pair("one", "two").polarity
    odds = (0.95 / 0.05) ** 4
    known = odds / (1 + odds)
    assert polarity.verdict == "opposite"
    assert 1 - polarity.probability_same == pytest.approx(0.9999 * known + 0.0001 * (1 - known), abs=1e-12)
