"""How probable each sign pattern is: what numbers say and kicks, by exact enumeration.

Every pair starts at even odds (prior flat in the signed coupling). Given whether the kick meter's sense is reversed,
pairs that no kick and no arrangement join are independent, so they are weighed one by one and joined through that one
unknown: the work grows with the number of pairs, not with the number of sign patterns of the whole device.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from itertools import combinations, product
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

Real = NDArray[np.float64]
Pattern = NDArray[np.int8]
Pair = tuple[int, int]
Terms = tuple[tuple[int, int, int], ...]

_MOST_JOINED = 14
_CERTAIN = 700.0
_NEVER = 1e-12


class SignTerm(Protocol):
    """A seen sign of a sum of entries of the inductance matrix (see `methods.kick.Kick`)."""

    @property
    def terms(self) -> Terms:
        """(i, j, sign) of each entry, i <= j."""

    @property
    def seen(self) -> int:
        """+1 or -1."""

    @property
    def misread(self) -> float:
        """Probability of being wrong."""


@dataclass(frozen=True)
class Sum:
    """All kicks whose jump has the sign of one sum of entries of the inductance matrix.

    Attributes
    ----------
    terms : tuple of (i, j, sign)
    up, down : float
        ln of the probability of what was seen where the deflection is truly + and truly -.
    """

    terms: Terms
    up: float
    down: float

    @property
    def pairs(self) -> list[Pair]:
        """Windings whose M is in the sum."""
        return [(i, j) for i, j, _ in self.terms if i != j]

    def log_likelihood(self, index: dict[Pair, int], patterns: Pattern) -> Real:
        """(2, N) for each pattern; second row with the meter's sense reversed.

        Where terms differ in sign, their sum has one sign that is not known, the same in all kicks: both are as likely.
        """
        own = np.ones(patterns.shape[1], dtype=np.int8)
        signs = np.array([s * (own if i == j else patterns[index[i, j]]) for i, j, s in self.terms])
        plus, minus = np.all(signs > 0, axis=0), np.all(signs < 0, axis=0)
        either = np.logaddexp(self.up, self.down) - np.log(2)
        straight = np.where(plus, self.up, np.where(minus, self.down, either))
        return np.array([straight, np.where(plus, self.down, np.where(minus, self.up, either))])


def gathered(kicks: Sequence[SignTerm]) -> list[Sum]:
    """Kicks by the sum that they show, the first term of which is positive."""
    found: dict[Terms, Real] = {}
    for kick in kicks:
        turn = kick.terms[0][2]
        key = tuple((i, j, s * turn) for i, j, s in kick.terms)
        wrong = min(max(kick.misread, _NEVER), 1 - _NEVER)
        chances = np.log([1 - wrong, wrong])
        found[key] = found.get(key, np.zeros(2)) + (chances if kick.seen * turn > 0 else chances[::-1])
    return [Sum(key, float(up), float(down)) for key, (up, down) in found.items()]


@dataclass(frozen=True)
class Part:
    """Pairs weighed together.

    Attributes
    ----------
    pairs : list of (i, j)
    patterns : (pairs, N) int
        +1 or -1.
    weight : (2, N) float
        ln of the likelihood, the meter's sense as it should be and reversed.
    """

    pairs: list[Pair]
    patterns: Pattern
    weight: Real

    @property
    def evidence(self) -> Real:
        """(2,) ln of the likelihood over all patterns, up to a constant."""
        top = self.weight.max(axis=1)
        return np.asarray(top + np.log(np.exp(self.weight - top[:, None]).sum(axis=1)))

    @property
    def chance(self) -> Real:
        """(2, N) probability of each pattern."""
        raised = np.exp(self.weight - self.weight.max(axis=1, keepdims=True))
        return np.asarray(raised / raised.sum(axis=1, keepdims=True))


def free_parts(n: int, log_odds: Real, sums: Sequence[Sum]) -> list[Part]:
    """Pairs of n windings that nothing ties to one another but the kicks.

    Parameters
    ----------
    n : int
    log_odds : (n, n) float
        ln P(M > 0)/P(M < 0) from numbers.
    sums : sequence of Sum
    """
    parts = []
    for pairs, joined in _groups(n, sums):
        signs = list(product((1, -1), repeat=len(pairs)))
        patterns = np.array(signs, dtype=np.int8).reshape(len(signs), len(pairs)).T
        parts.append(_part(pairs, patterns, log_odds, joined))
    return parts


def tied_part(n: int, log_odds: Real, sums: Sequence[Sum], asked: int) -> Part:
    """Pairs of n windings of which every triple has the sign product `asked`: 2^(n - 1) patterns."""
    pairs = list(combinations(range(n), 2))
    bits = np.arange(2 ** (n - 1))
    # One orientation for each winding, the first one's being free to choose, decides all signs.
    orientation = np.ones((n, len(bits)), dtype=np.int8)
    for i in range(1, n):
        orientation[i] = 1 - 2 * (bits >> (i - 1) & 1)
    patterns = np.array([asked * orientation[i] * orientation[j] for i, j in pairs], dtype=np.int8)
    return _part(pairs, patterns, log_odds, sums)


def _groups(n: int, sums: Sequence[Sum]) -> Iterator[tuple[list[Pair], list[Sum]]]:
    """Pairs that kicks join, with the sums that show them; first what shows no pair but the meter's sense."""
    yield [], [s for s in sums if not s.pairs]
    group_of = {pair: [pair] for pair in combinations(range(n), 2)}
    used: list[Sum] = []
    for total in sorted((s for s in sums if s.pairs), key=lambda s: len(s.terms)):
        joined = sorted({p for pair in total.pairs for p in group_of[pair]})
        if len(joined) > _MOST_JOINED:
            # A sum of so many terms says hardly anything, and would take 2^(pairs) patterns.
            continue
        group_of |= dict.fromkeys(joined, joined)
        used.append(total)
    for group in {id(g): g for g in group_of.values()}.values():
        yield group, [s for s in used if s.pairs[0] in group]


def _part(pairs: list[Pair], patterns: Pattern, log_odds: Real, sums: Sequence[Sum]) -> Part:
    weight = np.zeros((2, patterns.shape[1]))
    for pair, signs in zip(pairs, patterns, strict=True):
        weight += float(np.clip(log_odds[pair], -_CERTAIN, _CERTAIN)) / 2 * signs
    index = {pair: k for k, pair in enumerate(pairs)}
    for total in sums:
        weight += total.log_likelihood(index, patterns)
    return Part(pairs, patterns, weight)


class Weighing:
    """Parts joined through the one unknown that all kicks share: whether the meter's sense is reversed.

    Parameters
    ----------
    parts : sequence of Part
        Each pair in one of them.
    reversed_chance : float
        Prior probability.
    """

    def __init__(self, parts: Sequence[Part], reversed_chance: float) -> None:
        self._parts = [(part, part.chance) for part in parts]
        self._place = {pair: (k, row) for k, part in enumerate(parts) for row, pair in enumerate(part.pairs)}
        with np.errstate(divide="ignore"):
            total = np.log([1 - reversed_chance, reversed_chance])
        total = total + np.sum([part.evidence for part in parts], axis=0)
        senses = np.exp(total - total.max())
        self._senses: Real = senses / senses.sum()

    @property
    def reversed(self) -> float:
        """Probability that the meter's sense is reversed."""
        return float(self._senses[1])

    def same(self, n: int) -> Real:
        """(n, n) probability that M > 0, 1 on the diagonal."""
        out = np.eye(n)
        for (i, j), (k, row) in self._place.items():
            part, chance = self._parts[k]
            up, down = (float(self._senses @ chance[:, s * part.patterns[row] > 0].sum(axis=1)) for s in (1, -1))
            out[i, j] = out[j, i] = up / (up + down)
        return out

    def mean(self, pairs: Sequence[Pair]) -> float:
        """Mean of the product of the signs of some pairs."""
        rows: dict[int, list[int]] = {}
        for pair in pairs:
            k, row = self._place[pair]
            rows.setdefault(k, []).append(row)
        each = self._senses
        for k, chosen in rows.items():
            part, chance = self._parts[k]
            each = each * (chance @ np.prod(part.patterns[chosen], axis=0))
        return float(each.sum())
