"""Which leads are alike: probability and verdict per pair, and dots or starts for the device."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from itertools import combinations

import numpy as np
from numpy.typing import NDArray

from mutual import arrangement
from mutual.device import Device
from mutual.result import Arrangement, Finding
from mutual.signs import Pair, SignTerm, Sum, Weighing, free_parts, gathered, tied_part

Real = NDArray[np.float64]
Sides = tuple[tuple[str, ...], tuple[str, ...]]

ODDS = 1000.0
# More windings on one limb would be too many patterns to enumerate (2^17 take a second).
MOST_ON_ONE_LIMB = 18


@dataclass(frozen=True)
class Signs:
    """Probability that M > 0 for each pair.

    Attributes
    ----------
    same : (n, n) float
        Symmetric, 1 on the diagonal.
    alone : (n, n) float
        The same without the declared arrangement.
    holds : mapping of (i, j, k) to float
        Probability, without the declaration, of the sign product that it asks of that triple.
    reversed : float or None
        Probability that the kick meter's sense was reversed throughout; None where nothing was kicked.
    disputed : tuple of (i, j)
        Pairs of which numbers say one sign and kicks the other, each at odds of 1000 to 1 or better.
    """

    same: Real
    alone: Real
    holds: Mapping[arrangement.Indices, float] = field(default_factory=dict)
    reversed: float | None = None
    disputed: tuple[Pair, ...] = ()

    def verdict(self, i: int, j: int) -> str:
        """Word "same" or "opposite" at odds of 1000 to 1 or better, else "undetermined"."""
        return verdict(float(self.same[i, j]))


def verdict(probability: float) -> str:
    """Word for a probability that M > 0."""
    if probability >= ODDS / (1 + ODDS):
        return "same"
    return "opposite" if probability <= 1 / (1 + ODDS) else "undetermined"


def combine(device: Device, log_odds: Real, kicks: Sequence[SignTerm], reversed_chance: float) -> Signs:
    """Join what numbers and kicks say of the signs, with the declared arrangement.

    A declaration that the verdicts without it contradict is not used: `same` is then `alone`.

    Parameters
    ----------
    device : Device
    log_odds : (n, n) float
        ln P(M > 0)/P(M < 0) from the numeric evidence, prior flat in the signed coupling; pairs count as independent.
    kicks : sequence of SignTerm
    reversed_chance : float
        Prior probability that the meter's sense was reversed in all kicks.
    """
    n = len(device.windings)
    sums = gathered(kicks)
    free = Weighing(free_parts(n, log_odds, sums), reversed_chance)
    same = alone = free.same(n)
    asked, holds = arrangement.asked_product(device), {}
    if asked is not None:
        holds = {t: (1 + asked * free.mean(list(combinations(t, 2)))) / 2 for t in combinations(range(n), 3)}
        if n <= MOST_ON_ONE_LIMB and not arrangement.contradicted(device, _known(alone)):
            same = Weighing([tied_part(n, log_odds, sums, asked)], reversed_chance).same(n)
    disputed = tuple(_disputed(log_odds, sums, -1 if free.reversed > 0.5 else 1))
    return Signs(same, alone, holds, free.reversed if kicks else None, disputed)


def _known(probabilities: Real) -> arrangement.Known:
    """Signs (n, n) by verdict."""
    alike, unlike = probabilities >= ODDS / (1 + ODDS), probabilities <= 1 / (1 + ODDS)
    return alike.astype(np.int8) - unlike.astype(np.int8)


def _disputed(log_odds: Real, sums: Sequence[Sum], sense: int) -> Iterator[Pair]:
    """Pairs whose numbers and kicks contradict beyond doubt, the meter's sense being what it most likely is."""
    for total in sums:
        if len(total.terms) == 1 and total.pairs:
            (pair,) = total.pairs
            kicked, numeric = sense * (total.up - total.down), float(log_odds[pair])
            if kicked * numeric < 0 and min(abs(kicked), abs(numeric)) >= np.log(ODDS):
                yield pair


@dataclass(frozen=True)
class Marks:
    """What the verdicts mean for the leads.

    Attributes
    ----------
    dots : two tuples of leads, or None
    arrangement : Arrangement
    findings : tuple of Finding
    """

    dots: Sides | None
    arrangement: Arrangement
    findings: tuple[Finding, ...] = ()


def pair_dots(device: Device, i: int, j: int, word: str) -> tuple[tuple[str, str], tuple[str, str]] | None:
    """Leads of like polarity of two windings, or None while undetermined."""
    a, b = device.windings[i], device.windings[j]
    if word == "undetermined":
        return None
    if word == "same":
        return (a.first, b.first), (a.second, b.second)
    return (a.first, b.second), (a.second, b.first)


def marks(device: Device, signs: Signs) -> Marks:
    """Dots for the whole device where one dot each can serve, else starts and finishes of its phases."""
    known, alone = _known(signs.same), _known(signs.alone)
    groups = arrangement.phases(known)
    dots = starts = None
    if groups is not None and len(known) > 1:
        # Between like ends of windings on different limbs M is negative.
        turned = [int(known[0, j]) * (1 if j in groups[0] else -1) for j in range(1, len(known))]
        sides = _sides(device, [1, *turned])
        if len(groups) > 1:
            starts = sides
        elif arrangement.asked_product(device) != -1:
            dots = sides
    follow = [p for p in combinations(range(len(known)), 2) if known[p] and not alone[p]]
    text = arrangement.describe(device, known, follow)
    found = Arrangement(device.arrangement, arrangement.triples(device, alone), starts, text)
    return Marks(dots, found, (*arrangement.findings(device, alone, signs.holds), *_findings(device, signs)))


def _sides(device: Device, orientation: Sequence[int]) -> Sides:
    windings = device.windings
    marked = tuple(w.first if s > 0 else w.second for w, s in zip(windings, orientation, strict=True))
    return marked, tuple(w.second if s > 0 else w.first for w, s in zip(windings, orientation, strict=True))


def _findings(device: Device, signs: Signs) -> Iterator[Finding]:
    """What the kicks are worth beside the rest."""
    if arrangement.asked_product(device) and len(device.windings) > MOST_ON_ONE_LIMB:
        text = (
            f"the declared {device.arrangement!r} is not used: with more than {MOST_ON_ONE_LIMB} windings there are "
            "too many sign patterns to weigh. Read or kick every pair that must be known, or leave windings out"
        )
        yield Finding("caution", "arrangement", text)
    for i, j in signs.disputed:
        a, b = device.windings[i], device.windings[j]
        text = (
            f"readings and kicks say opposite things of {a.name} and {b.name}, each at odds of 1000 to 1 or better: "
            "leads were exchanged between the two tests, or one of them was made on another winding"
        )
        yield Finding("refusal", "kick disagrees", text)
    chance = signs.reversed
    if chance is None or verdict(chance) == "opposite":
        return
    if verdict(chance) == "same":
        text = (
            "the kicks, taken together, show the voltmeter's sense reversed throughout; the verdicts take that into "
            "account. Exchange its leads before the next kick"
        )
    else:
        text = (
            f"whether the voltmeter's sense was reversed in all kicks is open (probability {chance:.2g}), and a kick "
            "cannot be surer than that. Kick several times with the voltmeter across the fed winding itself, plus to "
            "plus ('sense' as 'across'): that tells"
        )
    yield Finding("caution", "sense", text)
