"""Which single slip would make contradicting readings agree, and what the answer is if it is mended.

For every row the device is fitted without it; that fit predicts what the row should have shown under each likely
slip. The few that come near are fitted in full, and compared by the probability of what was typed: chi-square, what
the freedom of the explanation costs, and how rare the slip is.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from itertools import combinations

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import solve_triangular

from mutual.collect import Collected
from mutual.joint import Joint, explain
from mutual.mending import IMPROBABLE, Mended, Mending
from mutual.methods.alternatives import Alternative, Slips
from mutual.methods.readings import Item
from mutual.quantities import pair_measures
from mutual.result import Consistency, Quantity, Suspect

Real = NDArray[np.float64]

# Slips whose odds are within e^-7 of the best one's are all listed.
_WINDOW = 14.0
_MOST_LISTED = 10
# Rows that are tried, those first without which the rest agrees best.
_ROWS_TRIED = 30
# Starts of their own get the likeliest rows; others start from what was found.
_ROWS_ANEW = 5
_PAIRS_TRIED = 6
# A change that by the linear model leaves more than this of chi-square is not fitted.
_WORTH_A_FIT = 0.3
_PROMISING = 0.01
_MOVES_TRIED = 8


@dataclass(frozen=True)
class Candidate:
    """A slip that would explain the readings.

    Attributes
    ----------
    alternative : Alternative
    mended : Mended
        The fit if it is mended.
    """

    alternative: Alternative
    mended: Mended

    @property
    def score(self) -> float:
        """-2 ln of its probability, but for a constant."""
        return self.mended.cost + self.alternative.rarity + self.alternative.typed


class _Search:
    """All slips of one set of readings."""

    def __init__(self, collected: Collected, joint: Joint) -> None:
        self.joint, self.items = joint, list(collected.items)
        self.mending = Mending(self.items, joint)
        self.slips = Slips(joint.device, [item.row for item in self.items], _names(self.items))
        self.linear = _Linear(joint, [len(item.columns()) for item in self.items])

    def candidates(self) -> Iterator[Candidate]:
        """Slips that mend the readings, in no order."""
        order = [int(k) for k in np.argsort(self.linear.without)[:_ROWS_TRIED]]
        for place, position in enumerate(order):
            yield from self._of_row(position, place < _ROWS_ANEW)
        if not self.mending.found:
            # The contradicting fit was too far off to tell which rows are the likeliest.
            for position in order[_ROWS_ANEW:]:
                yield from self._of_row(position, True)
        for alternative in self.slips.everywhere():
            yield from self._tried(alternative, None, True)
        yield from self._exchanged()
        yield from self._moved_from()

    def _of_row(self, position: int, anew: bool) -> Iterator[Candidate]:
        removal = self.slips.unknown(position)
        items = self.mending.changed(removal)
        if not items:
            return
        bases = self.mending.bases(items, anew)
        if bases[0].p_value < IMPROBABLE / 10 and not (anew and self._promising(bases[0])):
            return
        best: dict[str, Candidate] = {}
        for base in bases:
            for alternative, loose in self.mending.near(base, position, list(self.slips.of_row(position))):
                for found in self._tried(alternative, base, loose):
                    old = best.get(alternative.text)
                    if old is None or found.score < old.score:
                        best[alternative.text] = found
        yield from best.values()
        for alternative in self.slips.twice(position):
            yield from self._tried(alternative, bases[0], False)
        moved = self.slips.moved_at(position)
        mended = self.mending.with_moved(moved.moved, bases[0]) if moved.moved else None
        if mended is not None and mended.good:
            yield Candidate(moved, mended)
        if bases[0].good:
            yield Candidate(removal, bases[0])

    def _promising(self, base: Mended) -> bool:
        """Whether a fit without a row, though not good, is so much better that it may only have stopped too early."""
        return base.freedom < 1 or base.fit.chi_square < _PROMISING * self.joint.main.chi_square

    def _tried(self, alternative: Alternative, start: Mended | None, anew: bool) -> Iterator[Candidate]:
        theta = None if start is None else start.fit.theta
        mended = self.mending.solve(self.mending.changed(alternative), theta, anew)
        if mended is not None and mended.good:
            yield Candidate(alternative, mended)

    def _exchanged(self) -> Iterator[Candidate]:
        values = [self.mending.evidence([item]).values for item in self.items]
        found = []
        for first, second in combinations(range(len(self.items)), 2):
            alternative = self.slips.exchanged(first, second)
            if alternative is not None:
                merit = self.linear.exchanged(values, first, second)
                if merit < _WORTH_A_FIT * self.linear.total:
                    found.append((merit, first, second, alternative))
        for _, _, _, alternative in sorted(found, key=lambda f: f[:3])[:_PAIRS_TRIED]:
            yield from self._tried(alternative, None, not self.mending.found)

    def _moved_from(self) -> Iterator[Candidate]:
        found = []
        count = len(self.joint.device.windings)
        # Of two windings it does not matter which one moved.
        for winding in range(count if count > 2 else 1):
            shows = self.linear.shows(self.joint, winding)
            rows = [k for k, shown in enumerate(shows) if shown]
            # With one row before or after it is the same as at one reading.
            for position in rows[2:-1]:
                alternative = self.slips.moved_from(position, winding, shows)
                assert alternative.moved is not None
                merit = self.linear.moved(self.joint, alternative.moved.rows, winding)
                found.append((merit, position, winding, alternative))
        for merit, _, _, alternative in sorted(found, key=lambda f: f[:3])[:_MOVES_TRIED]:
            if merit > _WORTH_A_FIT * self.linear.total or alternative.moved is None:
                break
            base = self.mending.solve(self.mending.changed(alternative))
            mended = None if base is None else self.mending.with_moved(alternative.moved, base)
            if mended is not None and mended.good:
                yield Candidate(alternative, mended)


class _Linear:
    """Chi-square of changed rows by updates of low rank, the model taken as linear about the contradicting fit."""

    def __init__(self, joint: Joint, counts: Sequence[int]) -> None:
        found = joint.main.main.free
        self.fit = found
        ends = np.cumsum(counts)
        self.parts = [np.arange(end - count, end) for end, count in zip(ends, counts, strict=True)]
        unit = np.eye(len(found.residual))
        self.white = solve_triangular(found.whitener, unit, lower=True, check_finite=False)
        self.left = self.white - found.u @ (found.u.T @ self.white)
        self.residual = found.residual - found.u @ (found.u.T @ found.residual)
        self.total = float(self.residual @ self.residual)
        self.without = np.array([self._freed(self.left[:, part]) for part in self.parts])

    def _freed(self, columns: Real) -> float:
        """Chi-square when the readings may be changed along columns (m, c)."""
        weight, _, _, _ = np.linalg.lstsq(columns, self.residual, rcond=1e-9)
        rest = self.residual - columns @ weight
        return float(rest @ rest)

    def exchanged(self, values: Sequence[Real], first: int, second: int) -> float:
        """Chi-square with the values of two rows exchanged."""
        a, b = self.parts[first], self.parts[second]
        change = values[second] - values[first]
        rest = self.residual + self.left[:, a] @ change - self.left[:, b] @ change
        return float(rest @ rest)

    def shows(self, joint: Joint, winding: int) -> list[bool]:
        """Whether the place of a winding bears on each row."""
        j = np.abs(self.fit.prediction.jacobian[:, self._couplings(joint, winding)]).sum(axis=1)
        return [bool(np.any(j[part] > 0)) for part in self.parts]

    def moved(self, joint: Joint, rows: frozenset[int], winding: int) -> float:
        """Chi-square with the couplings of a winding changed at some rows."""
        columns = self._couplings(joint, winding)
        slopes = np.zeros((len(self.residual), len(columns)))
        for row in rows:
            slopes[self.parts[row]] = self.fit.prediction.jacobian[np.ix_(self.parts[row], np.array(columns))]
        return self._freed(self.left @ (slopes * joint.main.unknowns.scale[columns]))

    def _couplings(self, joint: Joint, winding: int) -> list[int]:
        u = joint.main.unknowns
        others = [k for k in range(u.windings) if k != winding]
        return [u.inductance(g, winding, k) for g in range(u.groups) for k in others]


def _names(items: Sequence[Item]) -> list[str]:
    """How texts name rows: with the file only where there are several."""
    files = {item.where.rpartition(" row ")[0] for item in items}
    return [f"row {item.row.number}" if len(files) == 1 else item.where for item in items]


def candidates(collected: Collected, joint: Joint) -> list[Candidate]:
    """The slips that would alone mend contradicting readings, best first, as many as are worth telling.

    Parameters
    ----------
    collected : Collected
    joint : Joint
        The fit that contradicts itself.
    """
    found = sorted(_Search(collected, joint).candidates(), key=lambda c: c.score)
    return [c for c in found if c.score <= found[0].score + _WINDOW][:_MOST_LISTED]


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
    suspects = [_suspect(collected, joint, c, coverage) for c in candidates(collected, joint)]
    return replace(consistency, suspects=tuple(suspects))


def _suspect(collected: Collected, joint: Joint, candidate: Candidate, coverage: float) -> Suspect:
    alternative = candidate.alternative
    item = collected.items[alternative.position]
    items = Mending(collected.items, joint).changed(alternative)
    mended = explain(replace(collected, items=tuple(items)), coverage, joint.states.apart)
    known = [e.p_value for e in mended.explanations if e.p_value is not None]
    i, j = _pair(candidate, joint, item)
    names = joint.names
    more = f" (k and M if mended: {names[i]} and {names[j]})" if len(names) > 2 else ""
    coupling, mutual = (None, None) if len(names) < 2 else _answer(mended, i, j)
    return Suspect(
        where=item.where,
        hookup=str(item.row.hookup),
        text=alternative.text + more,
        p_value=max(known, default=1.0),
        coupling=coupling,
        mutual=mutual,
    )


def _pair(candidate: Candidate, joint: Joint, item: Item) -> tuple[int, int]:
    """The two windings that a row is about: of those in its hookup, the ones whose M the slip changes most."""
    u = joint.main.unknowns
    hookup = item.row.hookup
    leads = {*hookup.across, *(x for t in hookup.tied for x in t), *(hookup.sense or ())}
    involved = [k for k, w in enumerate(joint.device.windings) if {w.first, w.second} & leads]
    pairs = [p for p in combinations(range(u.windings), 2) if len(set(p) & set(involved)) == min(2, len(involved))]
    before, after = joint.main.main.best.theta, candidate.mended.fit.theta

    def change(pair: tuple[int, int]) -> float:
        where = u.inductance(0, *pair)
        return abs(float(after[where] - before[where])) / float(u.scale[where])

    return max(pairs, key=change) if pairs else (0, 0)


def _answer(mended: Joint, i: int, j: int) -> tuple[Quantity | None, Quantity | None]:
    """k and M of two windings."""
    measures = pair_measures(mended.main.unknowns, mended.names, 0, i, j)
    signed = replace(measures.mutual, folded=False)
    open_sign = any(m.double[i, j] for m in mended.modes(0))
    return mended.quantity(measures.coupling), None if open_sign else mended.quantity(signed)
