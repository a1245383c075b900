"""A file, or a DataFrame, -> a `Recording`."""

from __future__ import annotations

import hashlib
import os
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import replace
from typing import TYPE_CHECKING, Any

from mutual.errors import RefusedInput
from mutual.quoting import listed, plain, shown
from mutual.recording.accuracy import bare_ratios, kick_table
from mutual.recording.cells import Unusable, is_empty, number_in, text_of
from mutual.recording.checks import refuse_negative_inductance
from mutual.recording.columns import Column, need_readings, read_header
from mutual.recording.declared import check_format, device_of, instruments_of
from mutual.recording.hookups import Hookups
from mutual.recording.leftout import Record, findings_of, nothing_remains
from mutual.recording.limits import limits_of
from mutual.recording.model import Recording
from mutual.recording.overrides import Overrides, merged
from mutual.recording.preface import Preface, allow_long_cells, split, understand
from mutual.recording.rows import RowReader
from mutual.recording.source import decode, load
from mutual.recording.table import header_and_records
from mutual.result import Finding, Input
from mutual.units import unit_of

if TYPE_CHECKING:
    import pandas

IN_MEMORY = "(in memory)"


def read(path: str | os.PathLike[str], overrides: Overrides | None = None) -> Recording:
    """Read a recording.

    Parameters
    ----------
    path : path
    overrides : Overrides, optional
        What the command line says; it holds together with the preface.

    Returns
    -------
    Recording
        With a finding for each row that was left out. `source.rows` counts the rows in use.

    Raises
    ------
    RefusedInput
        The file cannot be used without guessing; all that is known of the place is in its fields.
    """
    name = os.fsdecode(path)
    overrides = overrides or Overrides()
    try:
        data = load(path)
        text = decode(data)
        allow_long_cells(len(text))
        lines, rest, first_line = split(text)
        preface = merged(understand(lines) if lines else Preface({}), overrides)
        check_format(preface)
        titles, records, findings = header_and_records(rest, first_line, overrides.columns, plain(name))
        source = Input(name, hashlib.sha256(data).hexdigest(), "readings", 0)
        return _built(preface, titles, records, overrides, source, findings)
    except RefusedInput as error:
        raise error.with_place(file=plain(name)) from None


def from_readings(frame: pandas.DataFrame, windings: Mapping[str, Sequence[str]], **tables: Any) -> Recording:
    """Build a recording from a DataFrame, with no file.

    Parameters
    ----------
    frame : pandas.DataFrame
        Columns named as in a file, such as "inductance [uH]". Numbers have no last printed digit; texts behave as
        cells of a file do; what is missing (NaN, None) was not read.
    windings : mapping of name to (first lead, second lead)
    **tables
        The tables and keys of a preface as dicts and values, such as `meter={"gain_common": "0.1 %"}`.

    Raises
    ------
    RefusedInput
        As for a file; `row` counts from 1.
    """
    preface = Preface({**tables, "windings": dict(windings)})
    cells = frame.itertuples(index=False, name=None)
    records = (Record(number, None, row) for number, row in enumerate(cells, start=1))
    try:
        check_format(preface)
        return _built(preface, [str(title) for title in frame.columns], records, Overrides(), None, [])
    except RefusedInput as error:
        raise error.with_place(file=IN_MEMORY) from None


def _built(
    preface: Preface,
    titles: Sequence[str],
    unread: Iterable[Record],
    overrides: Overrides,
    source: Input | None,
    findings: Sequence[Finding],
) -> Recording:
    name = IN_MEMORY if source is None else plain(source.file)
    columns, passed_over = read_header(titles, overrides.columns)
    fixed = {key: text for key, text in (("across", overrides.across), ("tied", overrides.tied)) if text is not None}
    if "across" not in columns and "across" not in fixed:
        raise RefusedInput("there is no column across", expected="a column across, or --across A-B for one hookup")
    need_readings(columns)
    records = list(unread)
    columns = {name: _settled(column, records) for name, column in columns.items()}
    device = device_of(preface)
    instruments = instruments_of(preface, _texts(columns.get("instrument"), records))
    reader = RowReader(Hookups(device), columns, fixed, instruments)
    rows = tuple(row for row in map(reader.read, records) if row is not None)
    if not rows:
        raise nothing_remains(reader.left_out)
    refuse_negative_inductance(rows, instruments)
    return Recording(
        device=device,
        rows=rows,
        instruments=instruments,
        kick=kick_table(preface),
        limits=limits_of(preface, device),
        findings=(
            *findings,
            *_about_columns(columns.values() if source else (), passed_over, name),
            *bare_ratios(preface, instruments, name),
            *findings_of(reader.left_out, name),
        ),
        source=None if source is None else replace(source, rows=len(rows)),
    )


def _texts(column: Column | None, records: Iterable[Record]) -> set[str]:
    return set() if column is None else {text_of(r.cells[column.index]) for r in records} - {""}


def _settled(column: Column, records: Sequence[Record]) -> Column:
    """A point without a unit is a plain number if all its cells are numbers, else text."""
    if not column.name.startswith("point ") or column.unit is not None:
        return column
    cells = [r.cells[column.index] for r in records if not is_empty(r.cells[column.index])]
    plain_number = unit_of("1")
    for cell in cells:
        try:
            if isinstance(number_in(cell, plain_number), Unusable):
                return column
        except RefusedInput:  # a decimal comma: here it is text
            return column
    return replace(column, unit=plain_number)


def _about_columns(columns: Iterable[Column], passed_over: Sequence[str], file: str) -> list[Finding]:
    findings = [
        Finding("caution", "unit", f"column {shown(c.title)} names no unit: {c.unit.symbol} is taken", file)
        for c in columns
        if c.assumed and c.unit is not None
    ]
    if passed_over:
        text = f"columns that are not mapped were passed over: {listed(passed_over)}"
        findings.append(Finding("note", "not mapped", text, file))
    return findings
