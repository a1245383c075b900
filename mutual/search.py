"""The search for slips: which rows, which changes of them, and the fits that decide."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from itertools import combinations

import numpy as np

from mutual.collect import Collected
from mutual.joint import IMPROBABLE, Joint
from mutual.leverage import Leverage
from mutual.mended import Mended
from mutual.mending import Mending
from mutual.methods.alternatives import Alternative, Slips
from mutual.methods.readings import Item

# Rows that are tried, those first without which the rest agrees best.
_ROWS_TRIED = 30
# Starts of their own get the likeliest rows, at first and where nothing was found; others start from what was found.
_ROWS_ANEW = 5
_PAIRS_TRIED = 6
# A change that by the linear model leaves more than this of chi-square is not fitted.
_WORTH_A_FIT = 0.3
_PROMISING, _HARDLY_PROMISING = 0.01, 0.05
# Once something was found, rows are left alone without which, by the linear model, this much of chi-square stays.
_NO_GAIN = 0.9
_MOVES_TRIED, _MOST_MOVES = 8, 24
# Below this part of chi-square, what the linear model sees of a contradiction is not what it is about.
_TELLING = 0.5


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


class Search:
    """All slips of one set of readings.

    Parameters
    ----------
    collected : Collected
    joint : Joint
        The fit that contradicts itself.
    """

    def __init__(self, collected: Collected, joint: Joint) -> None:
        self.joint, self.items = joint, list(collected.items)
        self.mending = Mending(self.items, joint)
        self.slips = Slips(joint.device, [item.row for item in self.items], _names(self.items))
        self.linear = Leverage(joint, [len(item.columns()) for item in self.items])
        # Where physics is what the readings contradict, the linear model without its limits tells nothing.
        self.telling = self.linear.total > _TELLING * joint.main.chi_square
        self.order = [int(k) for k in np.argsort(self.linear.without)[:_ROWS_TRIED]]

    def candidates(self) -> Iterator[Candidate]:
        """Slips that mend the readings, in no order."""
        early = []
        for place, position in enumerate(self.order):
            if not self.mending.found:
                early.append(position)
            elif self.telling and self.linear.without[position] > _NO_GAIN * self.linear.total:
                break
            yield from self._of_row(position, 2 if place < _ROWS_ANEW else 1)
        # Rows that were tried before anything good was found start better now; where nothing was, try harder.
        for place, position in enumerate(early[:-1] if self.mending.found else self.order):
            harder = 3 if place < _ROWS_ANEW else 2
            yield from self._of_row(position, 1 if self.mending.found else harder)
        for alternative in self.slips.everywhere():
            yield from self._tried(alternative, None, 3 if len(self.items) <= _ROWS_TRIED else 1)
        yield from self._exchanged()
        yield from self._moved_from()

    def _of_row(self, position: int, effort: int) -> Iterator[Candidate]:
        removal = self.slips.unknown(position)
        items = self.mending.changed(removal)
        if not items:
            return
        bases = self.mending.bases(items, effort)
        if bases[0].p_value < IMPROBABLE / 10 and not self._promising(bases[0], effort):
            return
        best: dict[str, Candidate] = {}
        alternatives = list(self.slips.of_row(position))
        for base in bases:
            near = self.mending.near(base, position, alternatives)
            if base is bases[0]:
                # The other equivalent bends the model most: what is near in a straight line is no guide to it.
                tried = {alternative.text for alternative, _ in near}
                near += [(a, 1) for a in alternatives if a.text not in tried and self._turned(a, position)]
            for alternative, worth in near:
                for found in self._tried(alternative, base, worth):
                    old = best.get(alternative.text)
                    if old is None or found.score < old.score:
                        best[alternative.text] = found
        yield from best.values()
        for alternative in self.slips.twice(position):
            yield from self._tried(alternative, bases[0], 1)
        moved = self.slips.moved_at(position)
        mended = self.mending.with_moved(moved.moved, bases[0]) if moved.moved else None
        if mended is not None and mended.good:
            yield Candidate(moved, mended)
        if bases[0].good:
            yield Candidate(removal, bases[0])

    def _turned(self, alternative: Alternative, position: int) -> bool:
        """Whether a slip is about what the columns of a row are, not about its hookup or numbers."""
        row = dict(alternative.rows)[position]
        return row is not None and set(row.values) != set(self.items[position].row.values)

    def _promising(self, base: Mended, effort: int) -> bool:
        """Whether a fit without a row, though not good, is so much better that it may only have stopped too early."""
        if effort < 2:
            return False
        part = _PROMISING if effort < 3 else _HARDLY_PROMISING
        return base.freedom < 1 or base.fit.chi_square < part * self.joint.main.chi_square

    def _worth_a_fit(self, chi_square: float) -> bool:
        return not self.telling or chi_square < _WORTH_A_FIT * self.linear.total

    def _tried(self, alternative: Alternative, start: Mended | None, effort: int) -> Iterator[Candidate]:
        theta = None if start is None else start.fit.theta
        mended = self.mending.solve(self.mending.changed(alternative), theta, effort)
        if mended is not None and mended.good:
            yield Candidate(alternative, mended)

    def _exchanged(self) -> Iterator[Candidate]:
        values = [self.mending.evidence([item]).values for item in self.items]
        found = []
        for first, second in combinations(sorted(self.order), 2):
            alternative = self.slips.exchanged(first, second)
            if alternative is not None:
                merit = self.linear.exchanged(values, first, second)
                if self._worth_a_fit(merit):
                    found.append((merit, first, second, alternative))
        for _, _, _, alternative in sorted(found, key=lambda f: f[:3])[:_PAIRS_TRIED]:
            yield from self._tried(alternative, None, 1 if self.mending.found else 2)

    def _moved_from(self) -> Iterator[Candidate]:
        found = []
        count = len(self.joint.device.windings)
        # Of two windings it does not matter which one moved.
        for winding in range(count if count > 2 else 1):
            shows, merits = self.linear.shows(self.joint, winding), self.linear.moves(self.joint, winding)
            rows = [k for k, shown in enumerate(shows) if shown]
            # With one row before or after it is the same as at one reading.
            for position in rows[2:-1]:
                alternative = self.slips.moved_from(position, winding, shows)
                found.append((merits[position], position, winding, alternative))
        good = False
        for number, (merit, _, _, alternative) in enumerate(sorted(found, key=lambda f: f[:3])[:_MOST_MOVES]):
            # Where closed loops bend the model, its order is rough: more are tried while none is good.
            if alternative.moved is None or (number >= _MOVES_TRIED and good):
                break
            if number < _MOVES_TRIED and not self._worth_a_fit(merit) and self.joint.main.main.problem.body.linear:
                break
            base = self.mending.solve(self.mending.changed(alternative), None, 2)
            mended = None if base is None else self.mending.with_moved(alternative.moved, base)
            if mended is not None and mended.good:
                good = True
                yield Candidate(alternative, mended)


def _names(items: Sequence[Item]) -> list[str]:
    """How texts name rows: with the file only where there are several."""
    files = {item.where.rpartition(" row ")[0] for item in items}
    return [f"row {item.row.number}" if len(files) == 1 else item.where for item in items]
