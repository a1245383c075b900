"""Which single slip would make contradicting readings agree, and what the answer is if it is mended.

For every row the device is fitted without it; that fit predicts what the row should have shown under each likely
slip. The few that come near are fitted in full, and compared by the probability of what was typed: chi-square, what
the freedom of the explanation costs, and how rare the slip is.
"""

from __future__ import annotations

from dataclasses import replace
from itertools import combinations

from mutual.collect import Collected
from mutual.joint import Joint, explain
from mutual.mending import Mending
from mutual.methods.readings import Item
from mutual.quantities import pair_measures
from mutual.result import Consistency, Quantity, Suspect
from mutual.search import Candidate, Search
from mutual.states import States, point_key

# Slips whose odds are within e^-7 of the best one's are all listed.
_WINDOW = 14.0
_MOST_LISTED = 10


def candidates(collected: Collected, joint: Joint) -> list[Candidate]:
    """The slips that would alone mend contradicting readings, best first, as many as are worth telling.

    Parameters
    ----------
    collected : Collected
    joint : Joint
        The fit that contradicts itself.
    """
    best: dict[tuple[int, str], Candidate] = {}
    for candidate in Search(collected, joint).candidates():
        key = (candidate.alternative.position, candidate.alternative.text)
        if key not in best or candidate.score < best[key].score:
            best[key] = candidate
    found = sorted(best.values(), key=lambda c: (round(c.score, 6), c.alternative.position))
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
    names, group = joint.names, _group(mended.states, item)
    more = f" (k and M if mended: {names[i]} and {names[j]})" if len(names) > 2 else ""
    coupling, mutual = (None, None) if len(names) < 2 or group is None else _answer(mended, group, i, j)
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
    before, after, group = joint.main.main.best.theta, candidate.mended.fit.theta, _group(joint.states, item)

    def change(pair: tuple[int, int]) -> float:
        where = u.inductance(group or 0, *pair)
        return abs(float(after[where] - before[where])) / float(u.scale[where])

    return max(pairs, key=change) if pairs else (0, 0)


def _group(states: States, item: Item) -> int | None:
    """The set of inductances of a row; None where no reading of it is left."""
    try:
        return states.group(item.row.frequency, point_key(item.row.point))
    except ValueError:
        return None


def _answer(mended: Joint, group: int, i: int, j: int) -> tuple[Quantity | None, Quantity | None]:
    """k and M of two windings."""
    measures = pair_measures(mended.main.unknowns, mended.names, group, i, j)
    signed = replace(measures.mutual, folded=False)
    open_sign = any(m.double[i, j] for m in mended.modes(group))
    return mended.quantity(measures.coupling), None if open_sign else mended.quantity(signed)
