"""Uncertainty budget: what each named source contributes to each quantity (GUM, JCGM 100:2008, 5.1)."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator
from itertools import combinations

from mutual.headline import Headline
from mutual.quantities import Measure, pair_measures, self_inductance
from mutual.result import BudgetLine

# Lines below this share of the variance are left out.
_LEAST_SHARE = 1e-6


def headline_measures(head: Headline) -> Iterator[Measure]:
    """Inductances, M and k of the headline."""
    if head.group is None:
        return
    u, names = head.joint.main.unknowns, head.joint.names
    for i in range(u.windings):
        yield self_inductance(u, names, head.group, i)
    for i, j in combinations(range(u.windings), 2):
        found = pair_measures(u, names, head.group, i, j)
        yield found.mutual
        yield found.coupling


def budget(head: Headline) -> tuple[BudgetLine, ...]:
    """Lines for every quantity of the headline that has a two-sided bound, largest first."""
    lines: list[BudgetLine] = []
    posterior = head.joint.main.main.bounds.posterior
    body = posterior.problem.body
    for measure in headline_measures(head):
        if head.joint.quantity(measure) is None:
            continue
        gradient = measure.gradient(posterior.fit.theta)
        if not posterior.determined(gradient):
            continue
        parts = posterior.contributions(gradient)
        variance: dict[str, float] = defaultdict(float)
        for source, part in zip(body.sources, parts.sources, strict=True):
            variance[source.label] += float(part) ** 2
        for label, noise, rounding in zip(body.labels, parts.noise, parts.rounding, strict=True):
            variance[label] += float(noise) ** 2
            variance[label.replace(" noise", " resolution")] += float(rounding) ** 2
        total = parts.variance
        for label, part in sorted(variance.items(), key=lambda kv: -kv[1]):
            if total > 0 and part / total > _LEAST_SHARE:
                lines.append(BudgetLine(label, measure.name, part**0.5, part / total))
    return tuple(lines)
