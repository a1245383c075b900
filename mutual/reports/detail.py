"""What `--detail` adds: values by frequency or point, textbook formulas, uncertainty budget, inputs."""

from __future__ import annotations

from collections.abc import Sequence

from mutual.reports.drawing import MARGIN
from mutual.reports.figures import figures, rounded, short
from mutual.reports.findings import UNITS, point_text
from mutual.reports.wording import safe, wrapped
from mutual.result import BudgetLine, Estimate, Formula, Quantity, StateResult

# Symbol, unit, one quantity for each row.
Column = tuple[str, str, Sequence[Quantity | None]]
# A source below this share of the variance is not worth a line.
LEAST_SHARE = 0.0005


def state_lines(estimate: Estimate, width: int) -> list[list[str]]:
    """Tables by frequency and by point, one for each pair and one for each winding."""
    blocks = []
    for title, states in (("By frequency", estimate.by_frequency), ("By point", estimate.by_point)):
        if states:
            blocks += _tables(title, states, estimate, width)
    return blocks


def _tables(title: str, states: Sequence[StateResult], estimate: Estimate, width: int) -> list[list[str]]:
    several = len({state.frequency for state in states}) > 1
    names = [_state_name(state, several) for state in states]
    blocks = []
    for i, pair in enumerate(estimate.pairs):
        signed = any(s.pairs[i].mutual is not None for s in states)
        first = [s.pairs[i].mutual if signed else s.pairs[i].mutual_magnitude for s in states]
        columns = [("M" if signed else "|M|", "H", first), ("k", "1", [s.pairs[i].coupling for s in states])]
        heading = f"{title}: {' and '.join(safe(w) for w in pair.windings)}"
        blocks.append([*wrapped(heading, width), *_table(names, columns, width)])
    for name in estimate.windings:
        columns = [
            ("L", "H", [s.windings[name].inductance for s in states]),
            ("R", "ohm", [s.windings[name].resistance for s in states]),
        ]
        blocks.append([*wrapped(f"{title}: {name}", width), *_table(names, columns, width)])
    return blocks


def _state_name(state: StateResult, several: bool) -> str:
    """A frequency, or a point (with its frequency, where there are several)."""
    frequency = "no frequency" if state.frequency is None else short(state.frequency, "Hz")
    if state.point is None:
        return frequency
    return f"{point_text(state.point)}, {frequency}" if several else point_text(state.point)


def _table(names: Sequence[str], columns: Sequence[Column], width: int) -> list[str]:
    """Rows named at the left, one column for each quantity; below one another where they are too wide."""
    cells = [[symbol, *("-" if q is None else str(figures(q, unit)) for q in found)] for symbol, unit, found in columns]
    wide = [max(len(text) for text in column) for column in cells]
    head = max(len(name) for name in names)
    if len(MARGIN) + head + sum(wide) + 2 * len(wide) <= width:
        rows = zip(["", *names], *cells, strict=True)
        return [
            (MARGIN + f"{name:<{head}}" + "".join(f"  {text:<{w}}" for text, w in zip(row, wide, strict=True))).rstrip()
            for name, *row in rows
        ]
    lines = []
    for i, name in enumerate(names, 1):
        lines += wrapped(name, width, MARGIN)
        lines += [line for column in cells for line in wrapped(f"{column[0]}  {column[i]}", width, MARGIN * 2)]
    return lines


def detail_lines(estimate: Estimate, width: int) -> list[list[str]]:
    """Formulas, budget and inputs, one block each."""
    return [_formula_lines(estimate, width), _budget_lines(estimate.budget, width), _input_lines(estimate, width)]


def _formula_lines(estimate: Estimate, width: int) -> list[str]:
    """Textbook formulas beside what the estimate says of the same quantity."""
    if not estimate.formulas:
        return []
    title = "Textbook formulas, on the readings as they stand, to redo by hand"
    lines = wrapped(title, width)
    for formula in estimate.formulas:
        lines += wrapped(f"{formula.name}: {formula.expression}", width, MARGIN, MARGIN + "  ")
        answers = _answers(formula)
        lines += wrapped("; ".join(answers) or "no value", width, MARGIN * 2)
    for pair in estimate.pairs:
        mutual = pair.mutual or pair.mutual_magnitude
        best = [] if mutual is None else [f"{'M' if pair.mutual else '|M|'} {figures(mutual, 'H')}"]
        best += [] if pair.coupling is None else [f"k {figures(pair.coupling, '1')}"]
        if best:
            lines += wrapped(f"for comparison, the estimate of {' and '.join(pair.windings)}:", width, MARGIN)
            lines += wrapped("; ".join(best), width, MARGIN * 2)
    return lines


def _answers(formula: Formula) -> list[str]:
    pairs = (("M", formula.mutual, "H"), ("k", formula.coupling, "1"))
    return [f"{symbol} {figures(q, unit)}" for symbol, q, unit in pairs if q is not None]


def _budget_lines(budget: Sequence[BudgetLine], width: int) -> list[str]:
    """Where the uncertainty comes from, the largest source of each quantity first."""
    if not budget:
        return []
    lines = ["Where the uncertainty comes from (standard uncertainty, share of the variance)"]
    for quantity in dict.fromkeys(line.quantity for line in budget):
        lines += wrapped(quantity, width, MARGIN)
        own = sorted((line for line in budget if line.quantity == quantity), key=lambda x: -x.share)
        unit = UNITS.get(quantity.split(" ")[0], "1")
        for line in (x for x in own if x.share >= LEAST_SHARE):
            figure = short(line.standard_uncertainty, unit, 2) if unit != "1" else f"{line.standard_uncertainty:.1e}"
            lines += wrapped(f"{figure:>10} {rounded(100 * line.share, 0, -1):>6} %  {line.source}", width, MARGIN)
    return [line for text in lines for line in (wrapped(text, width) if len(text) > width else [text])]


def _input_lines(estimate: Estimate, width: int) -> list[str]:
    if not estimate.inputs:
        return []
    lines = ["Inputs"]
    for given in estimate.inputs:
        lines += wrapped(f"{given.file}: {given.kind}, {given.rows} rows", width, MARGIN)
        lines += wrapped(f"sha256 {given.sha256}", width, MARGIN * 2)
    return lines
