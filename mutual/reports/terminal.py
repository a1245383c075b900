"""An estimate as text for people: the answer first, then how far to trust it, then what to do."""

from __future__ import annotations

from collections.abc import Sequence

from mutual.reports.detail import detail_lines, state_lines
from mutual.reports.dots import drawing_lines, pair_words
from mutual.reports.drawing import MARGIN, pen_for
from mutual.reports.figures import NOT_DETERMINED, figures
from mutual.reports.findings import findings_lines, heading_lines, limits_lines, trust_lines
from mutual.reports.wording import safe, wrapped
from mutual.result import Estimate, PairResult, Quantity, StateResult, WindingResult

Line = tuple[str, Quantity | None, str]
LONGEST_SYMBOL = 26
# Where windings are this tight, what is missing to 1 says more than k.
TIGHT = 0.99


def render(estimate: Estimate, detail: bool = False, width: int = 80, encoding: str | None = "ascii") -> str:
    """The whole report.

    Parameters
    ----------
    estimate : Estimate
    detail : bool
        Whether textbook formulas, budget, values by state and inputs follow.
    width : int
        Longest line, in characters; 40 or more.
    encoding : str or None
        Of the output; decides which characters draw. Plain ASCII unless given.

    Returns
    -------
    str
        Without a final line end.
    """
    blocks = [heading_lines(estimate, width)]
    blocks += [_pair_lines(pair, estimate, width, detail) for pair in estimate.pairs]
    blocks += [_winding_lines(name, result, estimate, width) for name, result in estimate.windings.items()]
    blocks.append(drawing_lines(estimate, pen_for(encoding), width))
    if estimate.arrangement.text:
        blocks.append(["Arrangement", *wrapped(estimate.arrangement.text, width, MARGIN)])
    blocks.append(trust_lines(estimate, width))
    blocks.append(findings_lines(estimate, width))
    blocks.append(limits_lines(estimate, width))
    if detail or estimate.headline_basis == "none":
        blocks += state_lines(estimate, width)
    if detail:
        blocks += detail_lines(estimate, width)
    return "\n\n".join("\n".join(block) for block in blocks if block)


def _pair_lines(pair: PairResult, estimate: Estimate, width: int, detail: bool) -> list[str]:
    """Mutual inductance, coupling and polarity of one pair."""
    states = _states(estimate)
    others = [s.pairs[estimate.pairs.index(pair)] for s in states]
    if pair.mutual is None and pair.mutual_magnitude is not None:
        lines: list[Line] = [("|M|", pair.mutual_magnitude, "H")]
    else:
        lines = [("M", pair.mutual, "H")]
    lines.append(("k", pair.coupling, "1"))
    tight = pair.coupling is not None and pair.coupling.value > TIGHT
    if pair.one_minus_coupling is not None and (detail or tight):
        lines.append(("1-k", pair.one_minus_coupling, "1"))
    varies = pair.coupling is None and any(p.coupling is not None for p in others)
    text = wrapped(" and ".join(safe(name) for name in pair.windings), width)
    text += quantity_lines(lines, width, _null_text(varies, estimate))
    text += wrapped(pair_words(pair, estimate), width, MARGIN, MARGIN + "  ")
    return text + (quantity_lines(_more_of(pair), width) if detail else [])


def _more_of(pair: PairResult) -> list[Line]:
    """What follows from M and the inductances, for `--detail`."""
    first, second = (safe(name) for name in pair.windings)
    names = ((first, second), (second, first))
    shorted = zip(names, pair.short_circuit_inductance, strict=True)
    lines: list[Line] = [(f"L of {own}, {other} shorted", q, "H") for (own, other), q in shorted]
    lines += [(f"voltage ratio, {own} fed", q, "1") for (own, _), q in zip(names, pair.open_voltage_ratio, strict=True)]
    return [*lines, ("shared resistance", pair.mutual_resistance, "ohm")]


def _winding_lines(name: str, result: WindingResult, estimate: Estimate, width: int) -> list[str]:
    """Self-inductance and resistance of one winding."""
    states = _states(estimate)
    lines: list[Line] = [("L", result.inductance, "H"), ("R", result.resistance, "ohm")]
    if result.capacitance is not None:
        lines.append(("C", result.capacitance, "F"))
    heading = wrapped(f"{name}, {'-'.join(result.leads)}", width)
    shown = []
    for line in lines:
        field = {"L": "inductance", "R": "resistance"}.get(line[0])
        varies = field is not None and any(getattr(s.windings[name], field) is not None for s in states)
        shown += quantity_lines([line], width, _null_text(varies, estimate))
    return heading + shown


def _states(estimate: Estimate) -> tuple[StateResult, ...]:
    return estimate.by_frequency or estimate.by_point


def _null_text(varies: bool, estimate: Estimate) -> str:
    """What to say of a missing value, which may be missing because each frequency or point has its own."""
    if not varies:
        return NOT_DETERMINED
    where = "see below" if estimate.headline_basis == "none" else "--detail lists them"
    return f"one value for each {'point' if _states(estimate)[0].point is not None else 'frequency'}: {where}"


def quantity_lines(lines: Sequence[Line], width: int, null: str = NOT_DETERMINED) -> list[str]:
    """Symbol, value and bounds in columns; a symbol too long for its column has a line of its own."""
    room = max((len(symbol) for symbol, _, _ in lines if len(symbol) <= LONGEST_SYMBOL), default=1)
    out = []
    for symbol, quantity, unit in lines:
        long = len(symbol) > room
        out += wrapped(symbol, width, MARGIN) if long else []
        label = f"{MARGIN}{'' if long else symbol:<{room}}"
        if quantity is None:
            out.append(f"{label}    {null}")
            continue
        f = figures(quantity, unit)
        text = f"{label} {f.relation:<2} {f'{f.value} {f.unit}':<14}".rstrip()
        bounds = "" if f.lower is None else f"{f.lower} to {f.upper} {f.unit}".rstrip()
        out.append(f"{text:<{room + 24}}{bounds}".rstrip())
    return out
