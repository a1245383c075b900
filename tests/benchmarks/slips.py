"""How often the slip that was made is among those listed, and where in the list.

    python tests/benchmarks/slips.py [--count 200] [--quick] [--seed 1] [--show KIND]

For each kind of slip, random devices of two to four windings (k from 0.05 to 0.98) in random hookups with one value
left over, two, or three and more; circuit truth is that of tests/loops.py. Asked for, among sets with p < 0.001: the
slip that was made is listed in 95 % or more, the median list has at most 3 entries, and with three values left over
or more it is first or alone in 90 % or more. It counts as first, too, where those before it explain the readings
equally well with the same circuit if mended; how often that was needed is printed ("of them tied"), as is how often
others explain the readings equally well with another circuit ("no telling"). Sets with p >= 0.001, in which the slip
cannot show, are counted apart.
"""

from __future__ import annotations

import argparse
import itertools
import re
import sys
import time
import warnings
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).parent))
from slipped import KINDS, Slipped, draw

from mutual.collect import collect
from mutual.device import Hookup
from mutual.joint import IMPROBABLE, explain
from mutual.methods.alternatives import Alternative
from mutual.search import Candidate
from mutual.slips import candidates

ASKED_LISTED, ASKED_FIRST, ASKED_MEDIAN = 0.95, 0.90, 3
WORDS = {
    "coil moved": "at this reading (a coil moved)",
    "coil moved, from then on": "from this reading on",
    "parallel for series": "parallel equivalent",
    "parallel for series, all rows": "parallel equivalent",
    "typed in two rows": "typed twice",
}


@dataclass
class Tally:
    """Counts of one kind of slip. `ranks` has the place of the slip in each list, 0 where it is missing."""

    hidden: int = 0
    ranks: list[int] = field(default_factory=list)
    lengths: list[int] = field(default_factory=list)
    spare: list[int] = field(default_factory=list)
    tied: list[bool] = field(default_factory=list)
    open: list[bool] = field(default_factory=list)
    seconds: list[tuple[float, float]] = field(default_factory=list)

    def listed(self, least: int = 1, most: int = 99) -> float:
        """Fraction listed among sets with so many values left over."""
        chosen = [r > 0 for r, s in zip(self.ranks, self.spare, strict=True) if least <= s <= most]
        return sum(chosen) / max(len(chosen), 1)

    def first(self, least: int = 3) -> float:
        """Fraction first or alone, ties with the same circuit counted."""
        chosen = [r == 1 or t for r, t, s in zip(self.ranks, self.tied, self.spare, strict=True) if s >= least]
        return sum(chosen) / max(len(chosen), 1)

    def share(self, flags: list[bool], least: int = 3) -> float:
        """Fraction of sets with a flag."""
        chosen = [f for f, s in zip(flags, self.spare, strict=True) if s >= least]
        return sum(chosen) / max(len(chosen), 1)

    @property
    def slower(self) -> float:
        """Time of all searches over time of all fits before."""
        fits, searches = (sum(s[k] for s in self.seconds) for k in (0, 1))
        return searches / max(fits, 1e-9)

    @property
    def median(self) -> float:
        """Median length of the list."""
        ordered = sorted(self.lengths)
        return float(ordered[len(ordered) // 2]) if ordered else 0.0


def run(kind: str, count: int, seed: int, show: bool = False, only: Sequence[int] = ()) -> Tally:
    """Draw sets until `count` of them contradict themselves, or those of given numbers."""
    tally = Tally()
    for number in only or itertools.count():
        if len(tally.ranks) == count:
            break
        slipped = draw(kind, 1 + number % 3, (seed, KINDS.index(kind), number))
        start = time.process_time()
        collected = collect([slipped.recording])
        joint = explain(collected, 0.95)
        between = time.process_time()
        if any(e.p_value is None or e.p_value >= IMPROBABLE for e in joint.explanations):
            tally.hidden += 1
            continue
        found = candidates(collected, joint)
        tally.seconds.append((between - start, time.process_time() - between))
        hits = [k for k, c in enumerate(found, 1) if is_the_one(slipped, c.alternative)]
        rank = hits[0] if hits else 0
        tally.ranks.append(rank)
        tally.lengths.append(len(found))
        tally.spare.append(slipped.spare)
        before = found[: max(rank - 1, 0)]
        alike = [equally_good(c, found[rank - 1]) for c in before]
        same = [a and same_circuit(slipped, c, found[rank - 1]) for a, c in zip(alike, before, strict=True)]
        tally.tied.append(rank > 1 and all(same))
        tally.open.append(rank > 1 and all(alike) and not all(same))
        if show and (rank == 0 or (rank > 1 and slipped.spare >= 3)):
            describe(slipped, found, number, rank)
    return tally


def is_the_one(slipped: Slipped, found: Alternative) -> bool:
    """Whether a slip that was found is the one that was made."""
    here = found.position == slipped.row
    if slipped.kind == "parallel for series, all rows":
        return "every row" in found.text and WORDS[slipped.kind] in found.text
    if slipped.kind in WORDS:
        return here and WORDS[slipped.kind] in found.text
    if slipped.kind == "prefix":
        size = "small" if slipped.factor > 1 else "large"
        return here and f"the {slipped.column} was written a thousand times too {size}" in found.text
    was = re.search(r": it was (.*)", found.text)
    return here and was is not None and slipped.bench.same_circuit(hookup_of(was[1]), slipped.was)


def hookup_of(text: str) -> Hookup:
    """Read `A-B tied A-C B-D sense C-D` back."""
    found = re.fullmatch(r"(\S+)(?: tied ((?:\S+-\S+ ?)+?))?(?: sense (\S+))?", text.strip())
    assert found is not None, text
    pairs = [tuple(pair.split("-")) for pair in (found[2] or "").split()]
    return Hookup(tuple(found[1].split("-")), tuple(pairs), tuple(found[3].split("-")) if found[3] else None)


def equally_good(a: Candidate, b: Candidate) -> bool:
    """Whether two slips explain the readings to the same chi-square."""
    return abs(a.mended.fit.chi_square - b.mended.fit.chi_square) < 0.01 and a.alternative.moved is b.alternative.moved


def same_circuit(slipped: Slipped, a: Candidate, b: Candidate) -> bool:
    """Whether the devices if mended are the same; a sign of M that nothing decides may differ."""
    n = len(slipped.bench.windings)
    one, two = (np.abs(c.mended.fit.theta[: n * (n + 1) // 2]) for c in (a, b))
    return bool(np.all(np.abs(one - two) <= 1e-3 * one))


def describe(slipped: Slipped, found: list[Candidate], number: int, rank: int) -> None:
    """Say what went wrong with one set."""
    print(f"\n{slipped.kind} #{number}: {slipped.spare} left over; row {slipped.row + 1}", end="")
    print(f", was {slipped.was}; rank {rank}")
    root = np.sqrt(np.diag(slipped.bench.inductance))
    kappa = (slipped.bench.inductance / np.outer(root, root))[np.triu_indices(len(root), 1)]
    print("   k", kappa.round(3), slipped.bench.windings, slipped.bench.second)
    for row in slipped.recording.rows:
        print("  ", row.number, row.hookup, {k: f"{v.value:.5g}" for k, v in row.values.items()})
    for c in found:
        m = c.mended
        text = f"chi2 {m.fit.chi_square:.2f} dof {m.fit.degrees_of_freedom} score {c.score:.1f}"
        print(f"    row {c.alternative.position + 1}: {c.alternative.text}; {text}")


def table(count: int, seed: int, show: str | None = None, only: Sequence[int] = ()) -> Iterator[tuple[str, Tally]]:
    """Run every kind and print a line for each."""
    head = "sets  apart  listed  (1)   (2)   (3+)  median  first (3+)  of them tied  no telling  times an estimate"
    print(f"{'slip':<30}  {head}")
    for kind in KINDS:
        if show is not None and not kind.startswith(show):
            continue
        t = run(kind, count, seed, show is not None, only)
        print(
            f"{kind:<30} {len(t.ranks):5d} {t.hidden:6d} {t.listed():7.1%} {t.listed(1, 1):5.0%} {t.listed(2, 2):5.0%} "
            f"{t.listed(3):5.0%} {t.median:7.0f} {t.first():11.1%} {t.share(t.tied):13.1%} {t.share(t.open):11.1%} "
            f"{sum(s[1] for s in t.seconds) / len(t.seconds):6.2f} {max(s[1] for s in t.seconds):6.2f} {t.slower:6.1f}",
            flush=True,
        )
        yield kind, t


def main() -> None:
    """Print the table; exit 1 where something that is asked for is missed."""
    parser = argparse.ArgumentParser()
    parser.add_argument("--count", type=int, default=200)
    parser.add_argument("--quick", action="store_true")
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--show", metavar="KIND")
    parser.add_argument("--only", metavar="NUMBER", type=int, nargs="*", default=())
    given = parser.parse_args()
    warnings.simplefilter("error")
    missed = []
    for kind, tally in table(12 if given.quick else given.count, given.seed, given.show, given.only):
        good = tally.listed() >= ASKED_LISTED and tally.median <= ASKED_MEDIAN and tally.first() >= ASKED_FIRST
        if not good:
            missed.append(kind)
    if missed:
        sys.exit(f"missed: {', '.join(missed)}")


if __name__ == "__main__":
    main()
