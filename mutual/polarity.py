"""Which leads are alike: probability per pair, verdicts, dots for the device, and its arrangement."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import combinations, product
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from mutual.device import Device
from mutual.result import Arrangement, Finding, Triple

Real = NDArray[np.float64]

ODDS = 1000.0
_CERTAIN = 700.0
_MOST_JOINT = 14


class SignTerm(Protocol):
    """A seen sign of a sum of entries of the inductance matrix (see `methods.kick.Kick`)."""

    @property
    def terms(self) -> tuple[tuple[int, int, int], ...]:
        """(i, j, sign) of each entry."""

    @property
    def seen(self) -> int:
        """+1 or -1."""

    @property
    def misread(self) -> float:
        """Probability of being wrong."""


@dataclass(frozen=True)
class Signs:
    """Probability that M > 0 for each pair.

    Attributes
    ----------
    same : (n, n) float
        Symmetric, 1 on the diagonal.
    alone : (n, n) float
        The same without the declared arrangement.
    """

    same: Real
    alone: Real

    def verdict(self, i: int, j: int) -> str:
        """"same" or "opposite" at odds of 1000 to 1 or better, else "undetermined"."""
        return verdict(float(self.same[i, j]))


def verdict(probability: float) -> str:
    """Word for a probability that M > 0."""
    if probability >= ODDS / (1 + ODDS):
        return "same"
    return "opposite" if probability <= 1 / (1 + ODDS) else "undetermined"


def combine(device: Device, log_odds: Real, kicks: Sequence[SignTerm], reversed_chance: float) -> Signs:
    """Join what numbers and kicks say of the signs, with the declared arrangement.

    Parameters
    ----------
    device : Device
    log_odds : (n, n) float
        ln P(M > 0)/P(M < 0) from the numeric evidence, prior flat in the signed coupling.
    kicks : sequence of SignTerm
    reversed_chance : float
        Prior probability that the meter's sense was reversed in all kicks.
    """
    alone = _probabilities(device, log_odds, kicks, reversed_chance, "free")
    if device.arrangement == "free" or len(device.windings) < 3:
        return Signs(alone, alone)
    return Signs(_probabilities(device, log_odds, kicks, reversed_chance, device.arrangement), alone)


def _probabilities(
    device: Device, log_odds: Real, kicks: Sequence[SignTerm], reversed_chance: float, arrangement: str
) -> Real:
    n = len(device.windings)
    pairs = list(combinations(range(n), 2))
    same = np.eye(n)
    for group in _joint_groups(n, pairs, kicks, arrangement):
        patterns = _patterns(n, group, arrangement)
        index = {pair: k for k, pair in enumerate(group)}
        weight = np.clip([log_odds[p] for p in group], -_CERTAIN, _CERTAIN) / 2 @ patterns
        total = np.full(patterns.shape[1], -np.inf)
        for sense, chance in ((1, 1 - reversed_chance), (-1, reversed_chance)):
            with np.errstate(divide="ignore"):
                likelihood = weight + np.log(chance)
            for kick in kicks:
                if all(i == j or (i, j) in index for i, j, _ in kick.terms):
                    likelihood = likelihood + _log_likelihood(kick, sense, patterns, index)
            total = np.logaddexp(total, likelihood)
        total = np.exp(total - total.max())
        chance_of = total / total.sum()
        for k, (i, j) in enumerate(group):
            same[i, j] = same[j, i] = float(np.sum(chance_of[patterns[k] > 0]))
    return same


def _log_likelihood(kick: SignTerm, sense: int, patterns: Real, index: dict[tuple[int, int], int]) -> Real:
    """Of a seen deflection for each pattern; where terms disagree in sign either deflection is as likely."""
    signs = np.array([s * (patterns[index[i, j]] if i != j else np.ones(patterns.shape[1])) for i, j, s in kick.terms])
    agreed = np.where(np.all(signs > 0, axis=0), 1, np.where(np.all(signs < 0, axis=0), -1, 0))
    right, wrong = np.log1p(-kick.misread), np.log(max(kick.misread, 1e-12))
    expected = agreed * sense
    return np.where(expected == 0, np.log(0.5), np.where(expected == kick.seen, right, wrong))


def _joint_groups(
    n: int, pairs: list[tuple[int, int]], kicks: Sequence[SignTerm], arrangement: str
) -> list[list[tuple[int, int]]]:
    """Pairs whose signs must be weighed together.

    All of them where the arrangement ties them, or where kicks share the chance that the meter is
    reversed; a kick whose sum has several terms joins its pairs.
    """
    if arrangement != "free":
        return [pairs]
    joined = sorted({(i, j) for kick in kicks for i, j, _ in kick.terms if i != j})
    if len(joined) > _MOST_JOINT:
        # Too many to enumerate: the chance of a reversed meter is then weighed for each pair alone.
        return [[p] for p in pairs]
    return ([joined] if joined else []) + [[p] for p in pairs if p not in joined]


def _patterns(n: int, group: list[tuple[int, int]], arrangement: str) -> Real:
    """Sign patterns (pairs, patterns) that the arrangement allows."""
    if arrangement == "one limb":
        windings = np.array(list(product((1.0, -1.0), repeat=n - 1)))
        windings = np.column_stack([np.ones(len(windings)), windings])
        return np.array([windings[:, i] * windings[:, j] for i, j in group])
    patterns = np.array(list(product((1.0, -1.0), repeat=len(group)))).T
    if arrangement == "three-phase" and n == 3:
        patterns = patterns[:, np.prod(patterns, axis=0) < 0]
    return patterns


@dataclass(frozen=True)
class Marks:
    """What the verdicts mean for the leads.

    Attributes
    ----------
    dots : two tuples of leads, or None
    arrangement : Arrangement
    findings : tuple of Finding
    """

    dots: tuple[tuple[str, ...], tuple[str, ...]] | None
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
    """Dots for the whole device where one dot each can serve, else starts and finishes of three phases."""
    n = len(device.windings)
    names = [w.name for w in device.windings]
    sign = {p: _sign(signs.verdict(*p)) for p in combinations(range(n), 2)}
    free = {p: _sign(verdict(float(signs.alone[p]))) for p in combinations(range(n), 2)}
    triples = []
    for i, j, k in combinations(range(n), 3):
        factors = (free[i, j], free[j, k], free[i, k])
        triples.append(Triple((names[i], names[j], names[k]), None if 0 in factors else int(np.prod(factors))))
    products = [t.sign_product for t in triples]
    dots = None
    if n > 1 and 0 not in sign.values() and -1 not in products:
        dots = _sides(device, [1, *(sign[0, i] for i in range(1, n))])
    starts = None
    if n == 3 and products == [-1]:
        starts = _sides(device, [1, -free[0, 1], -free[0, 2]])
    findings = _contradictions(device, triples)
    text = _text(device, products, dots is not None, starts is not None)
    return Marks(dots, Arrangement(device.arrangement, tuple(triples), starts, text), findings)


def _sign(word: str) -> int:
    return {"same": 1, "opposite": -1}.get(word, 0)


def _sides(device: Device, orientation: Sequence[int]) -> tuple[tuple[str, ...], tuple[str, ...]]:
    windings = device.windings
    marked = tuple(w.first if s > 0 else w.second for w, s in zip(windings, orientation, strict=True))
    return marked, tuple(w.second if s > 0 else w.first for w, s in zip(windings, orientation, strict=True))


def _contradictions(device: Device, triples: Sequence[Triple]) -> tuple[Finding, ...]:
    wrong = {"one limb": -1, "three-phase": 1}.get(device.arrangement)
    found = []
    for triple in triples:
        if wrong is not None and triple.sign_product == wrong and (wrong == -1 or len(device.windings) == 3):
            text = (
                f"declared {device.arrangement!r}, but the signs of M between {', '.join(triple.windings)} multiply to "
                f"{wrong:+d}, which that arrangement cannot give; exchanging leads does not change it. "
                "The declaration is wrong, or one of these readings is"
            )
            found.append(Finding("refusal", "arrangement", text))
    return tuple(found)


def _text(device: Device, products: Sequence[int | None], dotted: bool, phased: bool) -> str:
    if len(device.windings) < 3:
        return "two windings: one dot each serves" if dotted else "the signs are not known yet"
    if phased:
        return (
            "the signs multiply to -1, as those of three phase windings (or of three limbs of one core) do: no single "
            "dots exist, starts and finishes are given instead"
        )
    if -1 in products:
        return "some triples multiply to -1: the windings do not all enclose one flux path, and no single dots exist"
    if dotted:
        return "all signs agree with one dot on each winding"
    return "the signs are not all known yet"
