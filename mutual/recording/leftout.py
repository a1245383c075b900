"""Records of a file, and those that are left out with a finding."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from mutual.errors import RefusedInput
from mutual.result import Finding

EMPTY = "empty"


@dataclass(frozen=True)
class Record:
    """Cells of one row: number from 1, line of the file (None if from Python), cells."""

    number: int
    line: int | None
    cells: Sequence[Any]


@dataclass(frozen=True)
class LeftOut:
    """A row that is not used, and why; the code `empty` stands for a row with no value in it."""

    record: Record
    code: str
    reason: str
    column: str | None = None
    found: str | None = None


def findings_of(left_out: Sequence[LeftOut], file: str) -> list[Finding]:
    """One finding for each row left out; rows without any value that follow one another share one."""
    runs: list[list[LeftOut]] = []
    for item in left_out:
        joins = runs and item.code == EMPTY == runs[-1][-1].code
        if joins and runs[-1][-1].record.number + 1 == item.record.number:
            runs[-1].append(item)
        else:
            runs.append([item])
    return [_finding(run, file) for run in runs]


def _finding(run: Sequence[LeftOut], file: str) -> Finding:
    first, last = run[0], run[-1].record.number
    where = f"{file} row {first.record.number}"
    if first.code != EMPTY:
        remedy = ": read it once more, on a larger range" if first.code == "overload" else ""
        return Finding("caution", first.code, f"{first.column}: {first.reason}; the row is left out{remedy}", where)
    which = "the row has" if first.record.number == last else f"rows {first.record.number} to {last} have"
    left = "it is" if first.record.number == last else "they are"
    return Finding("note", "left out", f"{which} no value filled in; {left} left out", where)


def nothing_remains(left_out: Sequence[LeftOut]) -> RefusedInput:
    """The refusal of a file of which no row can be used, with the first cause."""
    cause = next((item for item in left_out if item.code != EMPTY), None)
    if cause is not None:
        return RefusedInput(
            f"no row remains to be used, the first one because {cause.reason}",
            row=cause.record.number,
            line=cause.record.line,
            column=cause.column,
            found=cause.found,
            expected="a number in at least one row",
        )
    if left_out:
        first = left_out[0].record
        return RefusedInput("no value is filled in", row=first.number, line=first.line, expected="readings")
    return RefusedInput("no row follows the header", expected="a row for each reading")
