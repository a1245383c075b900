"""Stated limits: the probability that the device keeps them, and the verdict (JCGM 106:2012, 8.3)."""

from __future__ import annotations

import re
from collections.abc import Sequence

from mutual.errors import RefusedInput
from mutual.headline import Headline
from mutual.joint import Joint
from mutual.quantities import Measure, pair_measures, resistance, self_inductance
from mutual.recording.model import LimitSpec, Recording
from mutual.result import Limit


def limits(recordings: Sequence[Recording], head: Headline, risk: float) -> tuple[Limit, ...]:
    """Verdict on every stated limit."""
    specs = dict.fromkeys(spec for r in recordings for spec in r.limits)
    return tuple(_verdict(spec, head, risk) for spec in specs)


def _verdict(spec: LimitSpec, head: Headline, risk: float) -> Limit:
    measure = find_measure(spec.quantity, head)
    chance = None if measure is None else _probability(head.joint, measure, spec)
    word = "undecided"
    if chance is not None:
        word = "met" if chance >= 1 - risk else "not met" if chance <= risk else "undecided"
    return Limit(spec.quantity, spec.lower, spec.upper, word, chance)


def find_measure(quantity: str, head: Headline) -> Measure | None:
    """The measure that `[limits]` and the budget call by this name; None where the headline has none.

    Raises
    ------
    RefusedInput
        The name is not of the form "coupling A B", "mutual A B", "inductance A" or "resistance A".
    """
    words = re.split(r"\s+", quantity.strip())
    names = head.joint.names
    found = [w for w in words[1:] if w in names]
    expected = {"coupling": 2, "mutual": 2, "inductance": 1, "resistance": 1}.get(words[0])
    if expected is None or len(found) != expected or len(words) != expected + 1:
        raise RefusedInput(
            "unknown quantity in [limits]",
            found=repr(quantity),
            expected=f'"coupling A B", "mutual A B", "inductance A" or "resistance A" with windings {", ".join(names)}',
        )
    if head.group is None:
        return None
    u = head.joint.main.unknowns
    where = [names.index(w) for w in found]
    if expected == 2:
        i, j = sorted(where)
        pair = pair_measures(u, names, head.group, i, j)
        return pair.coupling if words[0] == "coupling" else pair.mutual
    if words[0] == "inductance":
        return self_inductance(u, names, head.group, where[0])
    state = head.state if head.state is not None else head.direct
    return None if state is None else resistance(u, names, state, where[0])


def _probability(joint: Joint, measure: Measure, spec: LimitSpec) -> float | None:
    """The least of all explanations; None where the quantity is not bounded on both sides."""
    chances = []
    for explanation in joint.explanations:
        interval, side = explanation.interval(measure)
        if interval is None or interval.parts is None or side != "both":
            return None
        posterior = explanation.main.bounds.posterior
        spread = posterior.spread(interval.parts)
        value = float(measure.value(posterior.fit.theta))
        value = abs(value) if measure.folded else value
        below = 1.0 if spec.upper is None else spread.below(spec.upper - value)
        under = 0.0 if spec.lower is None else spread.below(spec.lower - value)
        chances.append(max(below - under, 0.0))
    # Of two extremes the one that leaves more in doubt counts.
    return min(chances, key=lambda c: abs(c - 0.5))
