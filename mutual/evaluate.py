"""From recordings to an Estimate: the way of the data, step by step."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from mutual.assemble import pair_results, winding_results
from mutual.budget import budget
from mutual.collect import Collected, collect
from mutual.conformity import limits
from mutual.errors import WrongUsage
from mutual.headline import Headline, by_state, choose
from mutual.joint import IMPROBABLE, Joint, explain
from mutual.polarity import Marks, Signs, combine, marks
from mutual.reasons import reasons
from mutual.recording.model import Recording
from mutual.redo import formulas
from mutual.result import Consistency, Estimate, Finding


def estimate(
    recordings: Sequence[Recording] | Recording,
    *,
    coverage: float = 0.95,
    at: float | None = None,
    point: Mapping[str, Any] | None = None,
    risk: float = 0.025,
    suspects: bool = True,
) -> Estimate:
    """Find the circuit that explains recordings of one device.

    Parameters
    ----------
    recordings : Recording or sequence of Recording
    coverage : float
        Coverage probability of all bounds, 0.5 to 0.9999.
    at : float, optional
        Frequency of the headline in Hz, where constants do not fit all frequencies.
    point : mapping, optional
        Point of the headline, name to value.
    risk : float
        Risk at which a limit counts as met or not met, above 0 and up to 0.5.
    suspects : bool
        Whether to look for the slip that would explain contradicting readings.

    Returns
    -------
    Estimate
        Frozen. Inconsistent data do not raise: see `Estimate.consistency`.

    Raises
    ------
    RefusedInput
        The recordings cannot be used without guessing.
    WrongUsage
        Coverage, risk, frequency or point out of what there is.
    """
    if not 0.5 <= coverage <= 0.9999:
        raise WrongUsage(f"the coverage probability lies between 0.5 and 0.9999, not {coverage}")
    if not 0 < risk <= 0.5:
        raise WrongUsage(f"the risk lies above 0 and up to 0.5, not {risk}")
    recordings = [recordings] if isinstance(recordings, Recording) else list(recordings)
    if not recordings:
        raise WrongUsage("there is no recording to estimate from")
    collected = collect(recordings)
    if not collected.items:
        return _signs_only(recordings, collected, coverage)
    head = choose(collected, lambda apart: explain(collected, coverage, apart), at, point)
    return _result(recordings, collected, head, coverage, risk, suspects)


def signs_of(collected: Collected, joint: Joint, group: int | None) -> Signs:
    """Probabilities of the signs from numbers and kicks, with the declared arrangement."""
    return combine(collected.device, joint.log_odds(group), collected.kicks.each, collected.kicks.reversed)


def _result(
    recordings: Sequence[Recording],
    collected: Collected,
    head: Headline,
    coverage: float,
    risk: float,
    suspects: bool,
) -> Estimate:
    joint, device = head.joint, collected.device
    signs = signs_of(collected, joint, head.group)
    marked = marks(device, signs)
    windings = winding_results(joint, head.group, head.state, head.direct)
    pairs = pair_results(joint, signs, head.group, head.state)
    consistency = _consistency(collected, joint)
    if consistency.verdict == "inconsistent" and suspects:
        from mutual.slips import find_suspects

        consistency = find_suspects(collected, joint, consistency, coverage)
    groups = by_state(collected, head, lambda g: signs_of(collected, joint=head.apart or joint, group=g))
    return Estimate(
        device=device.name,
        coverage=coverage,
        windings=windings,
        pairs=pairs,
        consistency=consistency,
        arrangement=marked.arrangement,
        dots=marked.dots,
        headline_basis=head.basis,
        headline_frequency=head.frequency,
        headline_point=head.point,
        by_frequency=groups.by_frequency,
        by_point=groups.by_point,
        limits=limits(recordings, head, risk),
        formulas=formulas(collected, joint),
        budget=budget(head),
        findings=_findings(collected, head, marked, windings, pairs, consistency),
        inputs=tuple(r.source for r in recordings if r.source is not None),
    )


def _findings(
    collected: Collected, head: Headline, marked: Marks, windings: Any, pairs: Any, consistency: Consistency
) -> tuple[Finding, ...]:
    every = [*marked.findings, *collected.findings, *head.findings]
    every += reasons(collected, head, windings, pairs, consistency)
    order = {"refusal": 0, "caution": 1, "note": 2}
    return tuple(sorted(dict.fromkeys(every), key=lambda f: order[f.level]))


def _consistency(collected: Collected, joint: Joint) -> Consistency:
    """Can the readings belong to one device? Inconsistent only where no choice of what is open makes them."""
    stated = all(item.accuracy.stated for item in collected.items)
    known = [e.p_value for e in joint.explanations]
    p = None if any(x is None for x in known) else max(x for x in known if x is not None)
    verdict = "not testable"
    if stated and p is not None:
        verdict = "consistent" if p >= IMPROBABLE else "inconsistent"
    return Consistency(
        chi_square=joint.main.chi_square,
        degrees_of_freedom=joint.main.degrees_of_freedom,
        p_value=p if stated else None,
        verdict=verdict,
        bounds_basis="stated" if stated else "repeatability only",
    )


def _signs_only(recordings: Sequence[Recording], collected: Collected, coverage: float) -> Estimate:
    """Kicks alone: signs, and nothing else."""
    import numpy as np

    from mutual.headline import nothing_read

    device = collected.device
    n = len(device.windings)
    signs = combine(device, np.zeros((n, n)), collected.kicks.each, collected.kicks.reversed)
    marked = marks(device, signs)
    windings, pairs = nothing_read(device, signs)
    text = "only signs were read: no inductance, so neither M nor k is known"
    findings = [*marked.findings, *collected.findings, Finding("note", "undetermined", text)]
    return Estimate(
        device=device.name,
        coverage=coverage,
        windings=windings,
        pairs=pairs,
        consistency=Consistency(0.0, 0, None, "not testable", "stated"),
        arrangement=marked.arrangement,
        dots=marked.dots,
        findings=tuple(dict.fromkeys(findings)),
        inputs=tuple(r.source for r in recordings if r.source is not None),
    )
