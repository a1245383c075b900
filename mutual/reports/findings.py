"""How far to trust an estimate: its heading, consistency with suspects, findings and limits, in sentences."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from mutual.reports.drawing import MARGIN
from mutual.reports.figures import figures, percent, probability, short
from mutual.reports.wording import safe, wrapped
from mutual.result import Estimate, Finding, Limit, Suspect

LEVELS = ("refusal", "caution", "note")
UNITS = {"coupling": "1", "mutual": "H", "inductance": "H", "resistance": "ohm", "capacitance": "F"}


def heading_lines(estimate: Estimate, width: int) -> list[str]:
    """Name of the device, what the values hold for, and a warning where they must not be relied on."""
    lines = wrapped(estimate.device or "device without a name", width)
    states = [f"bounds hold with {percent(estimate.coverage)} probability"]
    if estimate.headline_frequency is not None:
        states.append(f"at {short(estimate.headline_frequency, 'Hz')}")
    elif estimate.headline_basis == "all" and len(estimate.by_frequency) > 1:
        states.append("one set of values for all frequencies")
    if estimate.headline_point:
        states.append(point_text(estimate.headline_point))
    elif estimate.headline_basis == "all" and len(estimate.by_point) > 1:
        states.append("one set of values for all points")
    lines += wrapped("; ".join(states), width)
    if not estimate.reliable:
        inconsistent = estimate.consistency.verdict == "inconsistent"
        why = "the readings contradict one another" if inconsistent else "see the refusal among the findings"
        lines += ["", *wrapped(f"NOT TO BE RELIED ON AS IT STANDS: {why}.", width)]
    if estimate.headline_basis == "none":
        text = "No single set of values fits all readings: they are listed for each state below."
        lines += ["", *wrapped(text, width)]
    return lines


def point_text(point: Mapping[str, Any]) -> str:
    """A point as text, values in SI units."""
    return ", ".join(f"{safe(k)} = {f'{v:.6g}' if isinstance(v, float) else safe(v)}" for k, v in point.items())


def trust_lines(estimate: Estimate, width: int) -> list[str]:
    """Whether the readings agree, in plain sentences, and the slips that would explain it if not."""
    found = estimate.consistency
    spare = f"{found.degrees_of_freedom} value{'' if found.degrees_of_freedom == 1 else 's'} more than needed"
    p = "" if found.p_value is None else probability(found.p_value)
    if found.verdict == "consistent":
        text = f"The readings agree with one another within the errors stated ({p}; {spare})."
    elif found.verdict == "inconsistent":
        text = (
            f"The readings contradict one another by more than the errors stated ({p}; {spare}): they cannot all be "
            "right and belong to one device."
        )
    elif found.degrees_of_freedom > 0:
        text = "Whether the readings agree cannot be tested, because no accuracy was stated."
    else:
        text = (
            "Nothing is left over to test the readings against one another: a slip would not show. "
            "One more reading in another hookup would make a test."
        )
    lines = ["How far to trust it", *wrapped(text, width, MARGIN)]
    if found.bounds_basis == "repeatability only":
        text = (
            "The bounds come from repeats and the last printed digit alone, because no accuracy was stated. "
            "What the meter itself is wrong by is not in them."
        )
        lines += wrapped(text, width, MARGIN)
    if found.verdict == "inconsistent":
        lines += _suspect_lines(found.suspects, width)
    return lines


def _suspect_lines(suspects: tuple[Suspect, ...], width: int) -> list[str]:
    if not suspects:
        text = "No single slip in one reading would explain it: look for several, or for accuracy stated too fine."
        return wrapped(text, width, MARGIN)
    several = "Each of these slips alone would explain it, the likeliest first:"
    lines = wrapped("This slip alone would explain it:" if len(suspects) == 1 else several, width, MARGIN)
    for number, suspect in enumerate(suspects, 1):
        lines += wrapped(f"{suspect.where} ({suspect.hookup}): {suspect.text}", width, f"{MARGIN}{number}. ")
        answer = [probability(suspect.p_value)]
        if suspect.coupling is not None:
            answer.append(f"k {_related(str(figures(suspect.coupling, '1')))}")
        if suspect.mutual is not None:
            answer.append(f"M {_related(str(figures(suspect.mutual, 'H')))}")
        lines += wrapped(f"if mended: {', '.join(answer)}", width, MARGIN + "   ")
    return lines


def _related(text: str) -> str:
    return text if text.startswith(("<", ">")) else f"= {text}"


def findings_lines(estimate: Estimate, width: int, notes: bool = True) -> list[str]:
    """All findings, gravest first; without notes on request."""
    chosen = [f for level in LEVELS for f in estimate.findings if f.level == level and (notes or level != "note")]
    if not chosen:
        return []
    lines = ["Findings"]
    for finding in chosen:
        lines += finding_lines(finding, width)
    return lines


def finding_lines(finding: Finding, width: int) -> list[str]:
    """One finding."""
    where = f" [{finding.where}]" if finding.where else ""
    first = f"{MARGIN}{safe(finding.level)}, {safe(finding.code)}: "
    return wrapped(f"{finding.text}{where}", width, first, MARGIN + "  ")


def limits_lines(estimate: Estimate, width: int) -> list[str]:
    """Every stated limit with its verdict."""
    lines = ["Limits"] if estimate.limits else []
    for limit in estimate.limits:
        sure = "" if limit.probability is None else f" ({probability(limit.probability, 'probability of conforming')})"
        lines += wrapped(f"{limit.quantity} {_range(limit)}: {limit.verdict}{sure}", width, MARGIN, MARGIN + "  ")
    return lines


def _range(limit: Limit) -> str:
    unit = UNITS.get(limit.quantity.split(" ")[0], "1")
    if limit.lower is not None and limit.upper is not None:
        return f"from {short(limit.lower, unit, 6)} to {short(limit.upper, unit, 6)}"
    if limit.lower is not None:
        return f"at least {short(limit.lower, unit, 6)}"
    return f"at most {short(limit.upper, unit, 6)}" if limit.upper is not None else "without a limit"
