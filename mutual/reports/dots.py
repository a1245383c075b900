"""Which leads are alike: in words, as a drawing, and the next test where it is not known."""

from __future__ import annotations

from collections.abc import Sequence

from mutual.device import Winding
from mutual.reports.drawing import MARGIN, Pen, draw_dots, draw_phases, pen_for
from mutual.reports.figures import figures, odds, probability
from mutual.reports.findings import findings_lines, heading_lines, trust_lines
from mutual.reports.wording import safe, wrapped
from mutual.result import Estimate, PairResult

# Beyond this ratio of turns a bridged voltmeter or a series reading hardly shows the smaller winding.
LARGE_RATIO = 20
KICK = (
    "Clamp the fed winding with a diode across it, against the cell. Touch a weak cell of 1.5 V to it, through a "
    "resistor that limits the current to 0.1 A, and write down which way the voltmeter goes (+ or -) at make and at "
    "break, several times, in the columns 'kick on make' and 'kick on break'. It magnetises a core: read inductances "
    "before, and demagnetise afterwards what must not stay magnetised."
)


def windings_of(estimate: Estimate) -> list[Winding]:
    """The windings in the order of the estimate."""
    return [Winding(name, *result.leads) for name, result in estimate.windings.items()]


def pair_words(pair: PairResult, estimate: Estimate) -> str:
    """What is known of the polarity of one pair, in words."""
    first, second = (estimate.windings[name].leads for name in pair.windings)
    p = pair.polarity.probability_same
    if pair.polarity.verdict == "undetermined":
        if abs(p - 0.5) < 0.02:
            return "which leads are alike is not determined by these readings"
        likely = first[0], second[0 if p > 0.5 else 1]
        return f"not determined; {safe(likely[0])} and {safe(likely[1])} alike at {odds(max(p, 1 - p))} only"
    same = pair.polarity.verdict == "same"
    partner, other = (second[0], second[1]) if same else (second[1], second[0])
    sure = odds(p if same else 1 - p)
    if estimate.arrangement.phase_starts is not None:
        return f"currents into {safe(first[0])} and {safe(partner)} aid one another ({sure})"
    return f"{safe(first[0])} and {safe(partner)} are alike, as are {safe(first[1])} and {safe(other)} ({sure})"


def drawing_lines(estimate: Estimate, pen: Pen, width: int) -> list[str]:
    """The dots of the whole device, or starts and finishes, or the groups within which dots are known."""
    windings = windings_of(estimate)
    if len(windings) < 2:
        return []
    if estimate.dots is not None:
        leads = estimate.dots[0]
        marks = {w.name: (lead, 0) for w, lead in zip(windings, leads, strict=True)}
        return ["Dots (leads marked alike are of like polarity)", *draw_dots(windings, marks, pen)]
    if estimate.arrangement.phase_starts is not None:
        starts, finishes = estimate.arrangement.phase_starts
        text = "Starts and finishes (no single dot on each winding can serve: see the arrangement)"
        return [*wrapped(text, width), *draw_phases(windings, starts, finishes, pen)]
    groups = _groups(estimate, windings)
    if not groups:
        return ["Dots", *wrapped("Not determined by these readings.", width, MARGIN)]
    marks = {name: mark for kind, group in enumerate(groups) for name, mark in _marks(group, windings, kind).items()}
    text = "Dots, as far as they are known (only marks of one shape can be compared; no mark: not known)"
    return [*wrapped(text, width), *draw_dots(windings, marks, pen)]


def _marks(group: dict[str, int], windings: Sequence[Winding], kind: int) -> dict[str, tuple[str, int]]:
    ends = {w.name: (w.first, w.second) for w in windings}
    return {name: (ends[name][0 if sign > 0 else 1], kind) for name, sign in group.items()}


def _groups(estimate: Estimate, windings: Sequence[Winding]) -> list[dict[str, int]]:
    """Windings joined by pairs of known polarity, with signs; a group whose signs contradict is left out."""
    sign = {frozenset(p.windings): 1 if p.polarity.verdict == "same" else -1
            for p in estimate.pairs if p.polarity.verdict != "undetermined"}  # fmt: skip
    left = [w.name for w in windings]
    groups = []
    while left:
        group, queue = {left[0]: 1}, [left.pop(0)]
        for name in queue:
            near = [other for other in left if frozenset((name, other)) in sign]
            group |= {other: group[name] * sign[frozenset((name, other))] for other in near}
            left = [other for other in left if other not in near]
            queue += near
        agree = all(group[a] * group[b] == s for (a, b), s in
                    ((tuple(pair), s) for pair, s in sign.items()) if a in group and b in group)  # fmt: skip
        if len(group) > 1 and agree:
            groups.append(group)
    return groups


def next_test(estimate: Estimate, pair: PairResult) -> list[str]:
    """What to do next for a pair whose polarity is not determined, one paragraph for each way."""
    first, second = (estimate.windings[name] for name in pair.windings)
    a, b, c, d = (safe(lead) for lead in (*first.leads, *second.leads))
    large, ratio = first, 1.0
    if first.inductance is not None and second.inductance is not None:
        l1, l2 = first.inductance.value, second.inductance.value
        large = first if l1 >= l2 else second
        ratio = (max(l1, l2) / min(l1, l2)) ** 0.5 if min(l1, l2) > 0 else float("inf")
    # The winding of many turns is fed: the other way round it would carry many times the voltage.
    fed, sensed = ((a, b), (c, d)) if large is first else ((c, d), (a, b))
    kick = (
        f"Kick test (see below): cell across {'-'.join(fed)}, plus to {fed[0]}; voltmeter across "
        f"{'-'.join(sensed)}, plus to {sensed[0]}. If it goes up at make, {fed[0]} and {sensed[0]} are alike."
    )
    if ratio > LARGE_RATIO or set(first.leads) & set(second.leads):
        return [kick]
    if pair.mutual is not None:
        weak = f"M is {figures(pair.mutual, 'H')}: too weak for these readings to show its sign."
        return [f"{weak} Repeat them, in series both ways above all, or take a finer meter.", kick]
    series = (
        f"Read the two in series both ways: across {a}-{d} with {b} and {c} joined, and across {a}-{c} with {b} and "
        f"{d} joined. If the first reads more, {a} and {c} are alike; if the second does, {a} and {d} are."
    )
    return [series, kick]


def render_polarity(estimate: Estimate, detail: bool = False, width: int = 80, encoding: str | None = "ascii") -> str:
    """The answer to `which leads are alike`, as text.

    Parameters
    ----------
    estimate : Estimate
    detail : bool
        Whether every finding is listed, and not only cautions and refusals.
    width : int
        Longest line, in characters.
    encoding : str or None
        Of the output; decides which characters draw.
    """
    blocks = [heading_lines(estimate, width)]
    for pair in estimate.pairs:
        name = " and ".join(safe(w) for w in pair.windings)
        lines = wrapped(name, width)
        lines += wrapped(pair_words(pair, estimate), width, MARGIN)
        if pair.polarity.verdict == "undetermined":
            a, c = (estimate.windings[w].leads[0] for w in pair.windings)
            p = probability(pair.polarity.probability_same, f"probability that {a} and {c} are alike")
            lines += wrapped(f"{p}; odds of 1000 to 1 are asked for. What to do next:", width, MARGIN)
            lines += [line for text in next_test(estimate, pair) for line in wrapped(text, width, MARGIN + "- ")]
        blocks.append(lines)
    blocks.append(drawing_lines(estimate, pen_for(encoding), width))
    if any(pair.polarity.verdict == "undetermined" for pair in estimate.pairs):
        blocks.append(["How a kick test is made", *wrapped(KICK, width, MARGIN)])
    if estimate.arrangement.text:
        blocks.append(["Arrangement", *wrapped(estimate.arrangement.text, width, MARGIN)])
    blocks += [trust_lines(estimate, width), findings_lines(estimate, width, notes=detail)]
    return "\n\n".join("\n".join(block) for block in blocks if block)
