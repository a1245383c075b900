"""Declared arrangements, sign products, dots, starts and finishes: what signs say of how windings sit on a core."""

from __future__ import annotations

from collections import Counter
from itertools import combinations
from pathlib import Path

import numpy as np
import pytest
from bench import THREE, codes
from kicked import DOWN, UP, kicked, same, word

import mutual
from mutual.device import Device, Winding
from mutual.methods.kick import Kick
from mutual.polarity import combine

RECORDINGS = Path(__file__).parent.parent / "recordings"
TWO_OF_THREE = [("A-B", "C-D", UP, 6), ("A-B", "E-F", DOWN, 6)]


def test_free_windings_do_not_settle_one_another() -> None:
    found = kicked(TWO_OF_THREE, windings=THREE)
    assert same(found, "two", "three") == 0.5
    assert found.dots is None and found.arrangement.phase_starts is None
    assert [t.sign_product for t in found.arrangement.triples] == [None]
    assert "'one limb'" in found.arrangement.text  # what to do, if it is so


def test_windings_on_one_limb_settle_one_another() -> None:
    found = kicked(TWO_OF_THREE, windings=THREE, arrangement="one limb")
    # Wrong where one of two is: 2/(9^6) of each, and never by a reversed meter, which turns both.
    assert word(found, "two", "three") == "opposite"
    ratio = 9.0**-6
    assert same(found, "two", "three") == pytest.approx(2 * ratio / (1 + ratio) ** 2, abs=1e-12)
    assert found.dots == (("A", "C", "F"), ("B", "D", "E"))
    assert found.arrangement.phase_starts is None
    # Nothing was read of the third pair: the product is declared, not known.
    assert [t.sign_product for t in found.arrangement.triples] == [None]
    assert "two and three follows from the declared 'one limb'" in found.arrangement.text


def test_three_phases_have_starts_and_never_dots() -> None:
    found = kicked(TWO_OF_THREE, windings=THREE, arrangement="three-phase")
    # M is negative between starts: from A to D and to E, and so between D and E, which makes M of C and E positive.
    assert word(found, "two", "three") == "same"
    assert found.dots is None
    assert found.arrangement.phase_starts == (("A", "D", "E"), ("B", "C", "F"))
    assert "two and three follows from the declared 'three-phase'" in found.arrangement.text


def test_alone_is_without_the_declaration() -> None:
    device = Device("invented", tuple(Winding(n, *ends) for n, ends in THREE.items()), "one limb")
    kicks = [Kick(((0, 1, 1),), 1, 0.1)] * 6 + [Kick(((0, 2, 1),), -1, 0.1)] * 6
    signs = combine(device, np.zeros((3, 3)), kicks, 0.0001)
    assert signs.alone[1, 2] == 0.5 and signs.verdict(1, 2) == "opposite"
    assert np.array_equal(signs.same, signs.same.T) and np.array_equal(np.diag(signs.alone), np.ones(3))


THIRD_AGAINST = [*TWO_OF_THREE, ("C-D", "E-F", UP, 6)]


@pytest.mark.parametrize(("declared", "third", "product"), [("one limb", UP, -1), ("three-phase", DOWN, 1)])
def test_data_may_contradict_the_declaration(declared: str, third: tuple[str, str], product: int) -> None:
    found = kicked([*TWO_OF_THREE, ("C-D", "E-F", third, 6)], windings=THREE, arrangement=declared)
    (finding,) = (f for f in found.findings if f.code == "arrangement")
    assert finding.level == "refusal" and f"multiply to {product:+d}" in finding.text
    assert not found.reliable
    assert [t.sign_product for t in found.arrangement.triples] == [product]
    assert found.dots is None
    # The verdicts are those of the data, each as it was kicked.
    words = [word(found, *pair) for pair in (("one", "two"), ("one", "three"), ("two", "three"))]
    assert words == ["same", "opposite", "same" if third == UP else "opposite"]
    assert (found.arrangement.phase_starts is not None) == (product == -1)


def test_doubt_of_the_declaration_is_said() -> None:
    """Three kicks against it: 729 to 1 is no contradiction yet."""
    sure = [("A-B", "C-D", UP, 9), ("A-B", "E-F", DOWN, 9)]
    found = kicked([*sure, ("C-D", "E-F", UP, 3)], windings=THREE, arrangement="one limb")
    (finding,) = (f for f in found.findings if f.code == "arrangement")
    assert finding.level == "caution" and "speaks against the declared 'one limb'" in finding.text
    assert found.reliable and word(found, "two", "three") == "opposite"
    assert codes(kicked([*TWO_OF_THREE, ("C-D", "E-F", UP, 1)], windings=THREE, arrangement="one limb")) == {
        "undetermined"
    }


def test_a_pair_common_to_all_wrong_triples_is_named() -> None:
    leads = {f"w{i}": (f"a{i}", f"b{i}") for i in range(5)}
    rows = [(f"a{i}-b{i}", f"a{j}-b{j}", DOWN if (i, j) == (1, 3) else UP, 6) for i, j in combinations(range(5), 2)]
    found = kicked(rows, windings=leads, arrangement="one limb")
    (finding,) = (f for f in found.findings if f.code == "arrangement")
    assert "2 more triples" in finding.text and "w1 and w3 are in all of them" in finding.text
    assert Counter(t.sign_product for t in found.arrangement.triples) == {1: 7, -1: 3}
    assert found.dots is None


def test_two_windings_on_each_of_three_limbs() -> None:
    """Invented: limbs p, q and r, some windings turned round; M < 0 between like ends on different limbs."""
    limbs = {"p1": "p", "p2": "p", "q1": "q", "q2": "q", "r1": "r", "r2": "r"}
    turned = {"p1": 1, "p2": -1, "q1": 1, "q2": 1, "r1": -1, "r2": 1}
    leads = {name: (f"{name}a", f"{name}b") for name in limbs}
    rows = []
    for a, b in combinations(limbs, 2):
        sign = turned[a] * turned[b] * (1 if limbs[a] == limbs[b] else -1)
        rows.append(("-".join(leads[a]), "-".join(leads[b]), UP if sign > 0 else DOWN, 5))
    found = kicked(rows, windings=leads)
    starts = tuple(leads[n][0 if turned[n] > 0 else 1] for n in limbs)
    finishes = tuple(leads[n][1 if turned[n] > 0 else 0] for n in limbs)
    assert found.arrangement.phase_starts == (starts, finishes)
    assert found.dots is None
    assert "p1 p2 / q1 q2 / r1 r2" in found.arrangement.text
    assert Counter(t.sign_product for t in found.arrangement.triples) == {-1: 8, 1: 12}


def test_five_phases_have_neither_dots_nor_starts() -> None:
    """72 degrees apart M goes as the cosine of the angle: positive between neighbours, negative beyond."""
    leads = {f"w{i}": (f"a{i}", f"b{i}") for i in range(5)}
    rows = [(f"a{i}-b{i}", f"a{j}-b{j}", UP if j - i in (1, 4) else DOWN, 6) for i, j in combinations(range(5), 2)]
    found = kicked(rows, windings=leads)
    assert Counter(t.sign_product for t in found.arrangement.triples) == {1: 5, -1: 5}
    assert found.dots is None and found.arrangement.phase_starts is None
    assert "do not all enclose one flux path" in found.arrangement.text


def test_six_lead_stator() -> None:
    """Its scenario: between starts, leads 1, 4 and 5, all three M are negative."""
    found = mutual.estimate(mutual.read(RECORDINGS / "six_lead_stator.csv"))
    assert found.arrangement.phase_starts == (("1", "4", "5"), ("2", "3", "6"))
    assert [t.sign_product for t in found.arrangement.triples] == [-1]
    assert found.dots is None and found.reliable
    assert [p.polarity.verdict for p in found.pairs] == ["same", "opposite", "same"]
