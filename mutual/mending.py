"""Fits of readings with slips mended, many and quick: what `slips` compares.

Resistances of which nothing was read are fitted as they are here, not as squares: less is told of them, but
changed readings that are far off lead no fit astray.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from itertools import combinations, product

import numpy as np
from numpy.typing import NDArray

from mutual.descent import chi_square, descend
from mutual.engine import Fit, Problem, fit
from mutual.errors import RefusedInput
from mutual.evidence import Body
from mutual.joint import Joint
from mutual.methods.alternatives import Alternative, Moved
from mutual.methods.moved import MovedEvidence, doubled, spread_out
from mutual.methods.readings import Item, ReadingsEvidence
from mutual.physics import Region
from mutual.priors import UsualLosses
from mutual.start import make_start
from mutual.unknowns import Unknowns

Real = NDArray[np.float64]

IMPROBABLE = 1e-3
_STEPS = 15
# Loss of a winding of which none was read, where a fit starts: R/(omega L).
_LOSS = 0.03
_SMALL_LOSS, _LARGE_LOSS = 0.01, 0.15
_STARTS = 3
# A start with windings tighter than this gets the larger self-inductances that make them looser.
_TIGHT, _LOOSER = 0.97, 0.7
# With more pairs of open sign only one is turned round at a time.
_OPEN_SIGNS = 3
_MOST_TURNED = 15
_COUPLINGS = (-0.9, -0.6, -0.3, -0.1, 0.1, 0.3, 0.6, 0.9)
_NEAR = 6.0
_LEEWAY = 0.003
_TRUSTED, _RARE = 1.5, 2.0


@dataclass(frozen=True)
class Mended:
    """A physical fit of changed readings.

    Attributes
    ----------
    freedom : float
        Values left over to test with, what is determined but in part counted in part.
    cost : float
        -2 ln of the probability of the readings, all unknowns averaged over a normal prior as wide as their natural
        sizes: what the freedom of an explanation costs is in it.
    """

    problem: Problem
    fit: Fit
    freedom: float
    p_value: float
    cost: float

    @property
    def good(self) -> bool:
        """Whether the readings can be true together."""
        return self.p_value >= IMPROBABLE


class Mending:
    """Fits of one set of readings with changes.

    Parameters
    ----------
    items : sequence of Item
    joint : Joint
        The fit that contradicts itself.
    """

    def __init__(self, items: Sequence[Item], joint: Joint) -> None:
        self.items, self.joint = list(items), joint
        self.choice = joint.choices[0]
        self.raw = joint.main.unknowns
        self.held = self.raw.fixed
        self.unread = np.flatnonzero(self.raw.squared)
        self.unknowns = _plain(self.raw, _plain_scale(self.raw))
        # Fits start from the contradicting one, and later from any that was found good.
        self.theta = self.contradicting = _from_squares(self.raw, joint.main.main.best.theta)
        self.found = False

    def evidence(self, items: Sequence[Item]) -> ReadingsEvidence:
        """Evidence of a changed set of rows."""
        return ReadingsEvidence(self.joint.device, items, self.joint.states, self.choice)

    def changed(self, alternative: Alternative) -> list[Item]:
        """The rows with a slip mended."""
        out: list[Item | None] = list(self.items)
        for position, row in alternative.rows:
            out[position] = None if row is None else replace(self.items[position], row=row)
        return [item for item in out if item is not None]

    def bases(self, items: Sequence[Item], anew: bool) -> list[Mended]:
        """Good fits of a set of rows, one for each pattern of signs; the best one alone if none is good."""
        best = self.solve(items, None, anew)
        assert best is not None
        if not best.good:
            return [best]
        if not self.found:
            self.theta, self.found = best.fit.theta, True
        found = [best]
        for theta in _other_signs(best.problem, best.fit):
            other = self._at(best.problem, theta)
            if other.good and not any(_same_signs(other, f) for f in found):
                found.append(other)
        return found

    def solve(self, items: Sequence[Item], start: Real | None = None, anew: bool = True) -> Mended | None:
        """Fit of a set of rows, from a start or from what was found so far; None where the rows make no sense.

        `anew` allows for starts made from these rows themselves.
        """
        try:
            evidence = self.evidence(items)
        except RefusedInput:
            return None
        unknowns, starts = self._starts(evidence)
        usual = UsualLosses(unknowns, self.held, self.unread)
        problem = Problem(Body([evidence, usual]), unknowns, self.held)
        first = self.theta if start is None else start
        best = self._at(problem, first)
        if best.good or best.problem.body.linear:
            return best
        more = list(self._with_losses(unknowns, first))
        tried = list(_turned_round(unknowns, first))
        tried += [self.contradicting] if start is None and self.found else []
        tried += [theta for made in starts for theta in _made_passive(unknowns, made)] if anew else []
        order = np.argsort([chi_square(problem, theta) for theta in tried])
        for theta in [*more, *(tried[k] for k in order[:_STARTS])]:
            other = self._at(problem, theta)
            best = other if other.fit.chi_square < best.fit.chi_square else best
            if best.good:
                return best
        if anew and starts:
            other = self._at(problem, _one_by_one(problem, starts[0]))
            best = other if other.fit.chi_square < best.fit.chi_square else best
        return best

    def _with_losses(self, unknowns: Unknowns, theta: Real) -> Iterator[Real]:
        """The same with other losses of windings of which none was read: all small, and each larger than the rest.

        Losses that show only in closed loops, by squares and differences, leave several minima.
        """
        if not self.unread.size:
            return
        for larger in (None, *self.unread):
            out = theta.copy()
            out[self.unread] = _SMALL_LOSS * unknowns.scale[self.unread]
            if larger is not None:
                out[larger] = _LARGE_LOSS * unknowns.scale[larger]
            yield out

    def with_moved(self, moved: Moved, base: Mended) -> Mended | None:
        """Fit with windings standing differently at some rows; None where no passive device does that."""
        plain = base.problem.unknowns
        evidence = MovedEvidence(self.joint.device, self.items, self.joint.states, self.choice, moved.rows)
        unknowns, groups = doubled(plain), plain.groups
        held = spread_out(plain, self.held, True).astype(bool)
        for group in range(groups):
            for i, j in combinations(range(unknowns.windings), 2):
                if moved.winding is None or moved.winding in (i, j):
                    held[unknowns.inductance(group + groups, i, j)] = False
        unread = np.flatnonzero(spread_out(plain, self.raw.squared, False))
        usual = UsualLosses(unknowns, held, unread)
        problem = Problem(Body([evidence, usual]), unknowns, held)
        end = descend(problem, spread_out(plain, base.fit.theta, 0.0), _STEPS)
        half = groups * plain.entries
        before, after = end.theta[:half], end.theta[:half] + end.theta[half : 2 * half]
        rest = _turned_up(self.raw.squared[half:], end.theta[2 * half :])
        if not all(Region(plain).contains(np.concatenate([x, rest])) for x in (before, after)):
            return None
        return _judged(problem, end.theta, unread)

    def near(self, base: Mended, position: int, alternatives: Sequence[Alternative]) -> list[tuple[Alternative, bool]]:
        """Those under which a row would have shown about what was read, by a fit without it.

        With each, whether it rests on something that the fit leaves open: that cannot speak against a slip. Nor can
        a fit that is not good, or has nothing to test it, so that there may be others: then all slips but the rare ones
        are worth a try.
        """
        rows = [dict(a.rows)[position] for a in alternatives]
        items = [replace(self.items[position], row=row) for row in rows if row is not None]
        evidence = self.evidence(items)
        found, unknowns = base.fit, base.problem.unknowns
        prediction = evidence.predict(unknowns, found.theta)
        slope = prediction.jacobian[:, found.free] * unknowns.scale[found.free]
        known = (slope @ found.vt.T) / found.s
        variance = np.sum(known**2, axis=1) + np.sum(prediction.effects**2, axis=1)
        variance += evidence.noise**2 + evidence.rounding**2
        size = np.abs(prediction.values)
        leeway = np.where(evidence.straight, 0.0, _LEEWAY * size)
        off = np.abs(evidence.values - prediction.values) > _NEAR * np.sqrt(variance) + leeway
        rest = np.linalg.norm(slope - (slope @ found.vt.T) @ found.vt, axis=1)
        loose = rest > 1e-6 * np.maximum(size, 1e-300)
        numbers = np.array([number for number, _ in evidence.position])
        bad, vague = set(numbers[off & ~loose].tolist()), set(numbers[loose].tolist())
        if not base.problem.body.linear and (base.freedom < _TRUSTED or not base.good):
            bad -= {k for k, a in enumerate(alternatives) if a.rarity < _RARE}
        return [(a, k in vague) for k, a in enumerate(alternatives) if k not in bad]

    def _starts(self, evidence: ReadingsEvidence) -> tuple[Unknowns, list[Real]]:
        """Layout with natural sizes of its own, and vectors to start from."""
        states = self.joint.states
        made = make_start([evidence.hints()], self.unknowns.windings, len(states.inductive), states.omegas)
        thetas = [_from_squares(made.unknowns, theta) for theta in made.thetas]
        return _plain(self.unknowns, _plain_scale(made.unknowns)), thetas

    def _at(self, problem: Problem, theta: Real) -> Mended:
        """The physical fit next to a vector of unknowns."""
        end = descend(problem, theta, _STEPS)
        turned = _turned_up(self.raw.squared, end.theta)
        if turned is not end.theta:
            end = descend(problem, turned, _STEPS)
        mended = _judged(problem, end.theta, self.unread)
        region = Region(problem.unknowns)
        # Physics only makes a fit worse.
        if not mended.good or region.contains(end.theta):
            return mended
        return _judged(problem, fit(problem, end.theta, region, steps=_STEPS).theta, self.unread)


def _judged(problem: Problem, theta: Real, loose: NDArray[np.int64]) -> Mended:
    from scipy.special import chdtrc

    found = fit(problem, theta, steps=0)
    data = len(problem.body.pieces[0].values)
    misfit = float(np.sum(found.residual[:data] ** 2))
    # What the usual losses determine is no freedom of the readings.
    freedom = data - float(np.sum(found.u[:data] ** 2))
    p = float(chdtrc(freedom, misfit)) if freedom > 0.5 else float(misfit < 4)
    # Losses that show by their squares alone are no measure of what an explanation leaves free.
    told = ~np.isin(found.free, loose)
    freed = np.linalg.svd(found.jacobian[:, told], compute_uv=False)
    cost = found.chi_square + 2 * float(np.sum(np.log(np.diag(found.whitener))))
    cost += len(found.residual) * float(np.log(2 * np.pi)) + float(np.sum(np.log1p(freed**2)))
    return Mended(problem, found, freedom, p, cost)


def _plain_scale(unknowns: Unknowns) -> Real:
    return np.where(unknowns.squared, np.sqrt(unknowns.scale), unknowns.scale)


def _plain(unknowns: Unknowns, scale: Real) -> Unknowns:
    """The layout with every resistance as it is."""
    every = tuple((True,) * unknowns.windings for _ in unknowns.omegas)
    return replace(unknowns, read=every, scale=scale)


def _from_squares(unknowns: Unknowns, theta: Real) -> Real:
    least = _LOSS * _plain_scale(unknowns)
    return np.where(unknowns.squared, np.maximum(np.sqrt(np.maximum(theta, 0.0)), least), theta)


def _turned_up(unread: NDArray[np.bool_], theta: Real) -> Real:
    """Unread resistances made positive: they show by their squares alone."""
    below = unread & (theta < 0)
    return np.where(below, -theta, theta) if below.any() else theta


def _made_passive(u: Unknowns, theta: Real) -> Iterator[Real]:
    """A start, and where it is tighter than can be, starts with either self-inductance of the pair raised."""
    yield theta
    for group in range(u.groups):
        for i, j in combinations(range(u.windings), 2):
            own, other, m = (u.inductance(group, *ij) for ij in ((i, i), (j, j), (i, j)))
            tight = abs(theta[m]) / np.sqrt(abs(theta[own] * theta[other]))
            if tight > _TIGHT:
                for raised in (own, other):
                    out = theta.copy()
                    out[raised] *= (tight / _LOOSER) ** 2
                    yield out


def _one_by_one(problem: Problem, start: Real) -> Real:
    """A start in which every coupling, one after another and twice over, was put where chi-square is least."""
    u, theta = problem.unknowns, start.copy()
    least = chi_square(problem, theta)
    for _ in range(2):
        for i, j in combinations(range(u.windings), 2):
            for group in range(u.groups):
                own, other, m = (u.inductance(group, *ij) for ij in ((i, i), (j, j), (i, j)))
                for kappa in _COUPLINGS:
                    tried = theta.copy()
                    tried[m] = kappa * np.sqrt(abs(theta[own] * theta[other]))
                    found = chi_square(problem, tried)
                    if found < least:
                        theta, least = tried, found
    return theta


def _turned_round(u: Unknowns, theta: Real) -> Iterator[Real]:
    """The same with the leads of windings exchanged throughout, but for the first winding."""
    pairs = list(combinations(range(u.windings), 2))
    for turned in list(product((1.0, -1.0), repeat=u.windings - 1))[1 : _MOST_TURNED + 1]:
        s = (1.0, *turned)
        yield _signed(u, theta, pairs, [s[i] * s[j] for i, j in pairs])


def _other_signs(problem: Problem, found: Fit) -> Iterator[Real]:
    """Vectors with the signs of M reversed that no reading without a closed loop settles."""
    u = problem.unknowns
    pairs = [p for p in combinations(range(u.windings), 2) if not _settled(problem, found, p)]
    if len(pairs) <= _OPEN_SIGNS:
        patterns = list(product((1.0, -1.0), repeat=len(pairs)))[1:]
    else:
        patterns = [tuple(-1.0 if p == q else 1.0 for q in pairs) for p in pairs]
        patterns += [tuple(-1.0 if w in q else 1.0 for q in pairs) for w in range(u.windings)]
    for pattern in patterns:
        yield _signed(u, found.theta, pairs, pattern)


def _settled(problem: Problem, found: Fit, pair: tuple[int, int]) -> bool:
    """Whether the readings without closed loops determine M of a pair in every set of inductances."""
    rows, u = problem.body.straight, problem.unknowns
    slopes = found.prediction.jacobian[rows][:, found.free] * u.scale[found.free]
    slopes = slopes / np.maximum(np.linalg.norm(slopes, axis=1), 1e-300)[:, None]
    values, directions = np.linalg.svd(slopes)[1:]
    known = directions[: int(np.sum(values > 1e-6))]
    for group in range(u.groups):
        unit = (found.free == u.inductance(group, *pair)).astype(float)
        if np.linalg.norm(unit - known.T @ (known @ unit)) > 1e-6:
            return False
    return True


def _signed(u: Unknowns, theta: Real, pairs: Sequence[tuple[int, int]], pattern: Sequence[float]) -> Real:
    out = theta.copy()
    for (i, j), sign in zip(pairs, pattern, strict=True):
        for group in range(u.groups):
            out[u.inductance(group, i, j)] *= sign
        for f, omega in enumerate(u.omegas):
            if omega > 0:
                out[u.resistance(f, i, j)] *= sign
    return out


def _same_signs(a: Mended, b: Mended) -> bool:
    u = a.problem.unknowns
    off = np.tile(u.first != u.second, u.groups)
    one, two = (m.fit.theta[: len(off)][off] for m in (a, b))
    return bool(np.all(np.sign(one) == np.sign(two)))
