"""Fits of readings with slips mended, many and quick: what `slips` compares.

Resistances of which nothing was read are fitted as they are here, not as squares: less is told of them, but
changed readings that are far off lead no fit astray.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import replace
from itertools import combinations

import numpy as np
from numpy.typing import NDArray

from mutual.attempts import (
    from_squares,
    likeliest,
    made_passive,
    one_by_one,
    other_signs,
    plain,
    plain_scale,
    possible,
    turned_round,
    turned_up,
    with_losses,
)
from mutual.descent import descend
from mutual.engine import Problem, fit
from mutual.errors import RefusedInput
from mutual.evidence import Body
from mutual.joint import Joint
from mutual.mended import Mended, alike, judged
from mutual.methods.alternatives import Alternative, Moved
from mutual.methods.moved import MovedEvidence, doubled, spread_out
from mutual.methods.readings import Item, ReadingsEvidence
from mutual.physics import Region
from mutual.priors import UsualLosses
from mutual.start import make_start
from mutual.unknowns import Unknowns

Real = NDArray[np.float64]
Ints = NDArray[np.int64]

_STEPS, _MANY_STEPS = 15, 40
_STARTS, _SIGNS = 3, 4
# So many different fits of the same rows are kept.
_MODES = 6
# A reading is near what a slip would have shown within so many standard deviations, and so much for a bent model.
_NEAR = 6.0
_LEEWAY = 0.003
# A fit with fewer values left over than this may be one of several; slips rarer than that are not tried at a venture.
_TRUSTED, _RARE = 1.5, 2.0


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
        self.unknowns = plain(self.raw, plain_scale(self.raw))
        # Fits start from the contradicting one, and later from any that was found good.
        self.theta = self.contradicting = from_squares(self.raw, joint.main.main.best.theta)
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

    def bases(self, items: Sequence[Item], effort: int) -> list[Mended]:
        """Good fits of a set of rows, one for each pattern of signs; the best one alone if none is good."""
        best = self.solve(items, None, effort)
        assert best is not None
        if not best.good:
            return [best]
        if not self.found:
            self.theta, self.found = best.fit.theta, True
        starts = likeliest(best.problem, other_signs(best.problem, best.fit), _SIGNS)
        if best.freedom < _TRUSTED and not best.problem.body.linear:
            # With hardly anything to test it, there may be quite different devices that explain these rows.
            made = self._starts(self.evidence(items))[1]
            starts += self._more_starts(best.problem, best.fit.theta, made, 2)
        found = [best]
        for theta in starts:
            other = self._at(best.problem, theta)
            if other.good and not any(alike(other, f) for f in found):
                found.append(other)
        return found[:_MODES]

    def solve(self, items: Sequence[Item], start: Real | None = None, effort: int = 0) -> Mended | None:
        """Fit of a set of rows, from a start or from what was found so far; None where the rows make no sense.

        Where that leads nowhere, an `effort` of 1 tries starts next to it, 2 starts made from the rows as well, and
        3 one in which the couplings were searched one by one.
        """
        try:
            evidence = self.evidence(items)
        except RefusedInput:
            return None
        unknowns, made = self._starts(evidence)
        problem = Problem(Body([evidence, UsualLosses(unknowns, self.held, self.unread)]), unknowns, self.held)
        first = self.theta if start is None else start
        best = self._at(problem, first)
        if problem.body.linear:
            return best
        for theta in self._more_starts(problem, first, made, effort):
            if best.good:
                break
            other = self._at(problem, theta, _STEPS if effort < 3 else _MANY_STEPS)
            best = other if other.fit.chi_square < best.fit.chi_square else best
        return best

    def _more_starts(self, problem: Problem, first: Real, made: Sequence[Real], effort: int) -> Iterator[Real]:
        losses = list(with_losses(problem.unknowns, self.unread, first))
        if effort > 0:
            yield from losses[: 1 if effort == 1 else None]
            around = [*turned_round(problem.unknowns, first), self.contradicting]
            around += [theta for m in made for theta in made_passive(problem.unknowns, m)] if effort > 1 else []
            yield from likeliest(problem, around, _STARTS if effort > 1 else 1)
        if effort > 2:
            yield one_by_one(problem, made[0])

    def with_moved(self, moved: Moved, base: Mended) -> Mended | None:
        """Fit with windings standing differently at some rows; None where no passive device does that."""
        layout = base.problem.unknowns
        evidence = MovedEvidence(self.joint.device, self.items, self.joint.states, self.choice, moved.rows)
        unknowns, groups = doubled(layout), layout.groups
        held = spread_out(layout, self.held, True).astype(bool)
        for group in range(groups):
            for i, j in combinations(range(unknowns.windings), 2):
                if moved.winding is None or moved.winding in (i, j):
                    held[unknowns.inductance(group + groups, i, j)] = False
        unread = np.flatnonzero(spread_out(layout, self.raw.squared, False))
        problem = Problem(Body([evidence, UsualLosses(unknowns, held, unread)]), unknowns, held)
        start = spread_out(layout, base.fit.theta, 0.0)
        half = groups * layout.entries
        offset = np.concatenate([np.zeros(half), start[:half], np.zeros(len(start) - 2 * half)])
        found = [self._moved_fit(problem, layout, start, unread)]
        if found[0] is None or not found[0].good:
            found.append(self._moved_fit(problem, layout, one_by_one(problem, start, offset), unread))
        return min((f for f in found if f is not None), key=lambda f: f.fit.chi_square, default=None)

    def _moved_fit(self, problem: Problem, layout: Unknowns, start: Real, unread: Ints) -> Mended | None:
        end = descend(problem, start, _STEPS)
        half = layout.groups * layout.entries
        changes = end.theta[half : 2 * half]
        # Of the windings that moved some readings show one coupling only: the others are where they were, in this fit.
        if possible(layout, end.theta[:half]) and possible(layout, end.theta[:half] + changes):
            return judged(problem, end.theta, unread)
        return None

    def near(self, base: Mended, position: int, alternatives: Sequence[Alternative]) -> list[tuple[Alternative, int]]:
        """Those under which a row would have shown about what was read, by a fit without it; with each, the effort.

        What that fit leaves open cannot speak against a slip. Nor can a fit that is not good, or has nothing to test
        it, so that there may be others: then all slips but the rare ones are worth a try.
        """
        rows = [dict(a.rows)[position] for a in alternatives]
        evidence = self.evidence([replace(self.items[position], row=row) for row in rows if row is not None])
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
        doubtful = not base.problem.body.linear and (base.freedom < _TRUSTED or not base.good)
        out = []
        for k, alternative in enumerate(alternatives):
            if k not in bad:
                out.append((alternative, 2 if k in vague else 1))
            elif doubtful and alternative.rarity < _RARE:
                out.append((alternative, 1 if base.good else 0))
        return out

    def _starts(self, evidence: ReadingsEvidence) -> tuple[Unknowns, list[Real]]:
        """Layout with natural sizes of its own, and vectors to start from."""
        states = self.joint.states
        made = make_start([evidence.hints()], self.unknowns.windings, len(states.inductive), states.omegas)
        thetas = [from_squares(made.unknowns, theta) for theta in made.thetas]
        return plain(self.unknowns, plain_scale(made.unknowns)), thetas

    def _at(self, problem: Problem, theta: Real, steps: int = _STEPS) -> Mended:
        """The physical fit next to a vector of unknowns."""
        end = descend(problem, theta, steps, steps > _STEPS)
        turned = turned_up(self.raw.squared, end.theta)
        if turned is not end.theta:
            end = descend(problem, turned, steps, steps > _STEPS)
        mended = judged(problem, end.theta, self.unread)
        # Physics only makes a fit worse.
        if not mended.good or Region(problem.unknowns).contains(end.theta):
            return mended
        return judged(problem, fit(problem, end.theta, Region(problem.unknowns), steps=_STEPS).theta, self.unread)
