"""All explanations of one body of evidence, one for each choice of what data sheets leave open, taken together."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from mutual.bounds import Interval
from mutual.collect import Collected, choices
from mutual.device import Device
from mutual.explain import Explanation
from mutual.methods.errors_of_instruments import Choice
from mutual.methods.readings import ReadingsEvidence
from mutual.modes import Modes, sign_modes
from mutual.quantities import Measure
from mutual.result import Quantity
from mutual.states import States, make_states

# Readings less probable than this contradict one another.
IMPROBABLE = 1e-3


@dataclass
class Joint:
    """Explanations of one body of evidence, one for each choice of what data sheets leave open.

    Attributes
    ----------
    explanations : list of Explanation
        The one that fits best comes first.
    states : States
        Numbering of the sets of inductances and resistances.
    choices : list of Choice
        That of each explanation.
    """

    device: Device
    explanations: list[Explanation]
    states: States
    choices: list[Choice]
    _modes: dict[int, list[Modes]] = field(default_factory=dict)
    _asked: dict[str, Quantity | None] = field(default_factory=dict)

    @property
    def main(self) -> Explanation:
        """The one that fits best."""
        return self.explanations[0]

    @property
    def names(self) -> list[str]:
        """Names of the windings."""
        return [w.name for w in self.device.windings]

    def modes(self, group: int) -> list[Modes]:
        """What each explanation says of the signs."""
        if group not in self._modes:
            self._modes[group] = [sign_modes(e, self.names, group) for e in self.explanations]
        return self._modes[group]

    def log_odds(self, group: int | None) -> NDArray[np.float64]:
        """(n, n) the most cautious of all explanations; over all sets of inductances where `group` is None."""
        groups = range(self.main.unknowns.groups) if group is None else [group]
        every = np.array([m.log_odds for g in groups for m in self.modes(g)])
        agree = np.all(np.sign(every) == np.sign(every[0]), axis=0)
        return np.where(agree, np.sign(every[0]) * np.abs(every).min(axis=0), 0.0)

    def quantity(self, measure: Measure) -> Quantity | None:
        """A quantity with the union of its bounds; None where any choice leaves it undetermined."""
        key = f"{measure.name} {measure.positions} {measure.folded}"
        if key not in self._asked:
            self._asked[key] = self._union([e.interval(measure) for e in self.explanations])
        return self._asked[key]

    def _union(self, found: Sequence[tuple[Interval | None, str]]) -> Quantity | None:
        intervals = [i for i, _ in found if i is not None]
        if len(intervals) < len(found):
            return None
        sides = {side for _, side in found} | {_side(i) for i in intervals}
        side = next((s for s in ("lower", "upper") if s in sides), "both")
        standards = [i.standard for i in intervals if i.standard is not None]
        lower, upper = min(i.lower for i in intervals), max(i.upper for i in intervals)
        return Quantity(
            value=intervals[0].value,
            standard_uncertainty=max(standards) if len(standards) == len(intervals) else None,
            lower=lower if np.isfinite(lower) else None,
            upper=upper if np.isfinite(upper) else None,
            bound=side,
        )


def _side(interval: Interval) -> str:
    """A region that ends at what physics allows is bounded by the data on the other side only."""
    if interval.at_upper and not interval.at_lower:
        return "lower"
    return "upper" if interval.at_lower and not interval.at_upper else "both"


def explain(collected: Collected, coverage: float, apart: bool = False) -> Joint:
    """Fit all readings, once for each choice of what the data sheets leave open.

    Parameters
    ----------
    collected : Collected
    coverage : float
    apart : bool
        Whether every frequency and point has inductances of its own.
    """
    device = collected.device
    states = make_states(collected.seen, apart)
    found = []
    for choice in choices(collected):
        pieces = [ReadingsEvidence(device, collected.items, states, choice)]
        n = len(device.windings)
        explanation = Explanation(pieces, n, len(states.inductive), states.omegas, coverage, device.shared_loss)
        found.append((explanation, choice))
    found.sort(key=lambda pair: pair[0].chi_square)
    return Joint(device, [e for e, _ in found], states, [c for _, c in found])
