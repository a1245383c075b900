"""Which single slip would make contradicting readings agree, and what the answer is if it is mended.

For every row the device is fitted without it; that fit predicts what the row should have shown
under each likely slip. The few that come near are fitted in full, and compared by chi-square
and by how much freedom and rarity they need to explain the data.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace

import numpy as np

from mutual.collect import Collected
from mutual.device import Device
from mutual.engine import Fit, Problem, fit
from mutual.errors import RefusedInput
from mutual.evidence import Body
from mutual.joint import Joint, explain
from mutual.methods.alternatives import Alternative, of_row, of_two, pair_of, unexplained
from mutual.methods.readings import Item, ReadingsEvidence
from mutual.quantities import pair_measures
from mutual.result import Consistency, Suspect

IMPROBABLE = 1e-3
# Slips within this of the best one, in units of chi-square, are all listed.
_WINDOW = 8.0
_MOST_LISTED = 8
_NEAR = 6.0
_LEEWAY = 0.01
_PAIRS_UP_TO = 24


@dataclass(frozen=True)
class _Candidate:
    position: int
    alternative: Alternative
    chi_square: float
    p_value: float

    @property
    def score(self) -> float:
        return self.chi_square + self.alternative.penalty


class _Search:
    """Fits with rows replaced, all from one layout of unknowns."""

    def __init__(self, collected: Collected, joint: Joint) -> None:
        self.collected, self.joint = collected, joint
        self.items = list(collected.items)
        self.rows = [item.row for item in self.items]
        self.main = joint.main
        self.choice = joint.choices[0]

    def evidence(self, items: Sequence[Item]) -> ReadingsEvidence:
        return ReadingsEvidence(self.joint.device, items, self.joint.states, self.choice)

    def solve(self, items: Sequence[Item], start: Fit | None) -> Fit:
        """Physical fit of a changed set of rows."""
        base = self.main.main.problem
        problem = Problem(Body([self.evidence(items)]), base.unknowns, base.held)
        starts = [self.main.main.best.theta] if start is None else [start.theta]
        fits = [fit(problem, theta) for theta in starts]
        best = min(fits, key=lambda f: f.chi_square)
        return best if self.main.region.contains(best.theta) else fit(problem, best.theta, self.main.region)

    def changed(self, alternative: Alternative) -> list[Item]:
        out: list[Item | None] = list(self.items)
        for position, row in alternative.rows:
            out[position] = None if row is None else replace(self.items[position], row=row)
        return [item for item in out if item is not None]

    def near(self, without: Fit, position: int, alternatives: Sequence[Alternative]) -> list[Alternative]:
        """Those under which the row would have shown about what was read."""
        items = [replace(self.items[position], row=a.rows[0][1]) for a in alternatives if a.rows[0][1] is not None]
        evidence = self.evidence(items)
        unknowns = self.main.unknowns
        prediction = evidence.predict(unknowns, without.theta)
        gain = (without.vt.T / without.s) * 1.0
        slope = prediction.jacobian[:, without.free] * unknowns.scale[without.free] @ gain
        variance = np.sum(slope**2, axis=1) + np.sum(prediction.effects**2, axis=1)
        variance += evidence.noise**2 + evidence.rounding**2
        size = np.abs(prediction.values)
        off = np.abs(evidence.values - prediction.values) > _NEAR * np.sqrt(variance) + _LEEWAY * size
        # What the fit without the row leaves open cannot speak against a slip.
        rest = prediction.jacobian[:, without.free] * unknowns.scale[without.free]
        rest = rest - (rest @ without.vt.T) @ without.vt
        open_ended = np.linalg.norm(rest, axis=1) > 1e-6 * np.maximum(size, 1e-300)
        numbers = np.array([n for n, _ in evidence.position])
        bad = {int(n) for n in numbers[off & ~open_ended]}
        return [a for k, a in enumerate(alternatives) if k not in bad]

    def candidates(self) -> Iterator[_Candidate]:
        """All slips that mend the readings."""
        from scipy.special import chdtrc

        for position in range(len(self.rows)):
            removal = Alternative("", ((position, None),))
            without = self._least_without(removal)
            if without is None or chdtrc(max(without.degrees_of_freedom, 1), without.chi_square) < IMPROBABLE / 10:
                continue
            explained = list(of_row(self.joint.device, self.rows, position))
            for alternative in self.near(without, position, explained):
                found = self._try(alternative, without)
                if found is not None:
                    yield found
            for alternative in unexplained(self.joint.device, self.rows, position):
                p = self._p(without)
                if p >= IMPROBABLE:
                    yield _Candidate(position, alternative, without.chi_square, p)
        if len(self.rows) <= _PAIRS_UP_TO:
            yield from self._exchanged()

    def _least_without(self, removal: Alternative) -> Fit | None:
        items = self.changed(removal)
        if not items:
            return None
        return self.solve(items, None)

    def _exchanged(self) -> Iterator[_Candidate]:
        for first in range(len(self.rows)):
            for second in range(first + 1, len(self.rows)):
                for alternative in of_two(self.rows, first, second):
                    found = self._try(alternative, None)
                    if found is not None:
                        yield found

    def _try(self, alternative: Alternative, start: Fit | None) -> _Candidate | None:
        try:
            found = self.solve(self.changed(alternative), start)
        except RefusedInput:
            return None
        p = self._p(found)
        if p < IMPROBABLE:
            return None
        return _Candidate(alternative.rows[0][0], alternative, found.chi_square, p)

    def _p(self, found: Fit) -> float:
        from scipy.special import chdtrc

        if found.degrees_of_freedom < 1:
            return 1.0 if found.chi_square < 4 else 0.0
        return float(chdtrc(found.degrees_of_freedom, found.chi_square))


def find_suspects(collected: Collected, joint: Joint, consistency: Consistency, coverage: float) -> Consistency:
    """Add the slips that would alone mend contradicting readings, best first.

    Parameters
    ----------
    collected : Collected
    joint : Joint
        The fit that contradicts itself.
    consistency : Consistency
    coverage : float
    """
    search = _Search(collected, joint)
    found = sorted(search.candidates(), key=lambda c: c.score)
    if not found:
        return consistency
    listed = [c for c in found if c.score <= found[0].score + _WINDOW][:_MOST_LISTED]
    suspects = [_suspect(search, c, coverage) for c in listed]
    return replace(consistency, suspects=tuple(suspects))


def _suspect(search: _Search, candidate: _Candidate, coverage: float) -> Suspect:
    item = search.items[candidate.position]
    mended = replace(search.collected, items=tuple(search.changed(candidate.alternative)))
    joint = explain(mended, coverage, search.joint.states.apart)
    p = max(e.p_value if e.p_value is not None else 1.0 for e in joint.explanations)
    return Suspect(
        where=item.where,
        hookup=str(item.row.hookup),
        text=candidate.alternative.text,
        p_value=p,
        **_answer(search.joint.device, joint, item),
    )


def _answer(device: Device, joint: Joint, item: Item) -> dict[str, object]:
    """M and k of the pair that the row is about."""
    if len(device.windings) < 2:
        return {}
    i, j = pair_of(device, item.row.hookup)
    measures = pair_measures(joint.main.unknowns, joint.names, 0, i, j)
    signed = replace(measures.mutual, folded=False)
    open_sign = any(m.double[i, j] for m in joint.modes(0))
    return {
        "coupling": joint.quantity(measures.coupling),
        "mutual": None if open_sign else joint.quantity(signed),
    }
