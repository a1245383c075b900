"""From explanations to results of windings and pairs."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from itertools import combinations
from math import prod, sqrt

from mutual.joint import Joint
from mutual.polarity import Signs, pair_dots
from mutual.quantities import Measure, mutual_resistance, pair_measures, resistance, self_inductance
from mutual.result import PairResult, Polarity, Quantity, WindingResult


def winding_results(
    joint: Joint, group: int | None, state: int | None, direct: int | None
) -> Mapping[str, WindingResult]:
    """All windings; nulls where `group` or `state` is None.

    Parameters
    ----------
    joint : Joint
    group : int or None
        Set of inductances.
    state, direct : int or None
        Sets of resistances: of the frequency, and of direct current.
    """
    out = {}
    for i, winding in enumerate(joint.device.windings):
        u = joint.main.unknowns
        out[winding.name] = WindingResult(
            leads=(winding.first, winding.second),
            inductance=None if group is None else joint.quantity(self_inductance(u, joint.names, group, i)),
            resistance=_resistance(joint, state, i),
            direct_resistance=_resistance(joint, direct, i),
        )
    return out


def _resistance(joint: Joint, state: int | None, i: int) -> Quantity | None:
    u = joint.main.unknowns
    if state is None or not u.read[state][i]:
        return None
    return joint.quantity(resistance(u, joint.names, state, i))


def pair_results(joint: Joint, signs: Signs, group: int | None, state: int | None) -> tuple[PairResult, ...]:
    """All pairs; nulls where `group` is None."""
    out = []
    for i, j in combinations(range(len(joint.device.windings)), 2):
        word, chance = signs.verdict(i, j), float(signs.same[i, j])
        polarity = Polarity(word, chance, pair_dots(joint.device, i, j, word))
        windings = (joint.names[i], joint.names[j])
        if group is None:
            out.append(PairResult(windings, polarity))
            continue
        u = joint.main.unknowns
        m = pair_measures(u, joint.names, group, i, j)
        coupling = joint.quantity(m.coupling)
        magnitude = _possible(joint, joint.quantity(m.mutual), group, i, j)
        shared = None
        if state is not None and not u.fixed[u.resistance(state, i, j)] and not joint.main.shared:
            shared = joint.quantity(mutual_resistance(u, joint.names, state, i, j))
        out.append(
            PairResult(
                windings=windings,
                polarity=polarity,
                mutual=_signed(joint, m.mutual, magnitude, word, group, (i, j)),
                mutual_magnitude=magnitude,
                mutual_resistance=shared,
                coupling=coupling,
                one_minus_coupling=_complement(coupling),
                short_circuit_inductance=(joint.quantity(m.short[0]), joint.quantity(m.short[1])),
                open_voltage_ratio=(joint.quantity(m.ratio[0]), joint.quantity(m.ratio[1])),
            )
        )
    return tuple(out)


def _possible(joint: Joint, magnitude: Quantity | None, group: int, i: int, j: int) -> Quantity | None:
    """|M| within sqrt(L1 L2): a bound over unread losses ends at the bounds of both inductances at the latest."""
    if magnitude is None or magnitude.standard_uncertainty is not None or magnitude.upper is None:
        return magnitude
    ends = [joint.quantity(self_inductance(joint.main.unknowns, joint.names, group, k)) for k in (i, j)]
    most = prod(q.upper for q in ends if q is not None and q.upper is not None)
    if any(q is None or q.upper is None for q in ends) or magnitude.upper <= sqrt(most):
        return magnitude
    return replace(magnitude, upper=max(sqrt(most), magnitude.value))


def _signed(
    joint: Joint, measure: Measure, magnitude: Quantity | None, word: str, group: int, pair: tuple[int, int]
) -> Quantity | None:
    """M with its sign; None where two signs explain the numbers and nothing else decides."""
    if magnitude is None:
        return None
    if word == "same":
        return magnitude
    if word == "opposite":
        turned = {"lower": "upper", "upper": "lower"}.get(magnitude.bound, "both")
        lower = None if magnitude.upper is None else -magnitude.upper
        upper = None if magnitude.lower is None else -magnitude.lower
        return Quantity(-magnitude.value, magnitude.standard_uncertainty, lower, upper, turned)
    if any(m.double[pair] for m in joint.modes(group)) or magnitude.bound == "lower":
        return None
    return joint.quantity(Measure(measure.name, measure.kind, measure.positions))


def _complement(q: Quantity | None) -> Quantity | None:
    """1 - k from k."""
    if q is None:
        return None
    turned = {"lower": "upper", "upper": "lower"}.get(q.bound, "both")
    lower = 0.0 if q.upper is None else 1 - q.upper
    upper = 1.0 if q.lower is None else 1 - q.lower
    return Quantity(1 - q.value, q.standard_uncertainty, lower, upper, turned)
