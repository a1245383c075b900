"""Lines after the preface -> titles and records (RFC 4180), with the number of each row and its line."""

from __future__ import annotations

import csv
from collections.abc import Collection, Iterator, Sequence
from itertools import pairwise

from mutual.errors import RefusedInput
from mutual.quoting import nearest, plain, shown
from mutual.recording.leftout import Record
from mutual.result import Finding

Line = tuple[int, list[str]]

# How far down an instrument's export the header is sought, below whatever it says of itself first.
_SOUGHT = 200
_OTHER_DELIMITERS = {";": "semicolons", "\t": "tabs", "|": "bars"}


def header_and_records(
    lines: Sequence[str], first_line: int, mapped: Collection[str], file: str
) -> tuple[list[str], Iterator[Record], list[Finding]]:
    """Titles, records (each checked when it is taken) and what was passed over.

    Parameters
    ----------
    lines : sequence of str
        With their line ends; the first is the header, unless columns are mapped.
    first_line : int
        Its number in the file.
    mapped : collection of str
        Titles of a foreign file that the command line maps: the header is the first line that has them all.
    file : str
        Name for the findings.

    Raises
    ------
    RefusedInput
        No header, another delimiter, not CSV, too many or too few fields; row and line are named.
    """
    if not lines:
        raise RefusedInput(
            "no header and no row follow the preface" if first_line > 1 else "the file holds no row",
            expected="a header such as across,tied,frequency [Hz],inductance [uH]",
        )
    records = _csv(lines, first_line)
    findings: list[Finding] = []
    if mapped:
        titles, line = _sought_header(records, mapped)
        if line > first_line:
            text = f"lines {first_line} to {line - 1} stand before the header and were passed over"
            findings.append(Finding("note", "before header", text, file))
    else:
        line, titles = next(records)
        _check_delimiter(titles, line)
    return titles, _numbered(titles, records, lenient=bool(mapped)), findings


def _csv(lines: Sequence[str], first_line: int) -> Iterator[Line]:
    """Records with the line on which each begins; a quoted cell may go over several lines."""
    reader = csv.reader(lines, strict=True)
    before = 0
    number = 0
    while True:
        try:
            cells = next(reader)
        except StopIteration:
            return
        except csv.Error as error:
            told = {"unexpected end of data": "a quote is opened and never closed"}.get(str(error), str(error))
            raise RefusedInput(
                f"not comma-separated text ({plain(told)})",
                row=number or None,
                line=first_line + before,
                found=shown(lines[before].rstrip("\r\n")),
                expected="quotes around whole cells only, doubled within (RFC 4180)",
            ) from None
        if cells:
            yield first_line + before, cells
            number += 1
        before = reader.line_num


def _check_delimiter(titles: Sequence[str], line: int) -> None:
    if len(titles) > 1:
        return
    for sign, name in _OTHER_DELIMITERS.items():
        if sign in titles[0]:
            raise RefusedInput(
                f"fields are separated by {name}",
                line=line,
                found=shown(titles[0]),
                expected="commas, with a decimal point in numbers",
            )


def _sought_header(records: Iterator[Line], mapped: Collection[str]) -> tuple[list[str], int]:
    first: Line | None = None
    seen: list[str] = []
    for line, cells in records:
        present = [" ".join(cell.split()) for cell in cells]
        if all(title in present for title in mapped):
            return cells, line
        for sign in _OTHER_DELIMITERS:
            if len(cells) == 1 and set(mapped) <= {part.strip() for part in cells[0].split(sign)}:
                _check_delimiter(cells, line)
        first = first or (line, cells)
        seen += present
        if line - first[0] > _SOUGHT:
            break
    missing = next((title for title in mapped if title not in seen), next(iter(mapped)))
    raise RefusedInput(
        "no line of the file has all the mapped columns",
        line=first[0] if first else None,
        found=shown(missing) + " in the mapping",
        expected=shown(nearest(missing, seen)),
    )


def _numbered(titles: Sequence[str], records: Iterator[Line], lenient: bool) -> Iterator[Record]:
    """Records with as many cells as there are titles.

    Titles that are empty come from a spreadsheet that padded all rows to the width of a long
    preface line: nothing may stand below them.
    """
    width = len(titles)
    while width and not titles[width - 1].strip():
        width -= 1
    untitled = [i for i in range(width) if not titles[i].strip()]
    for number, (line, cells) in enumerate(records, start=1):
        if cells[0].lstrip().startswith("#") and not titles[0].lstrip().startswith("note"):
            raise RefusedInput(
                "a line of the preface stands below the header", row=number, line=line, found=shown(cells[0])
            )
        spare = cells[width:]
        if len(cells) < width or any(map(str.strip, spare)) or (len(cells) > len(titles) and not lenient):
            raise _miscounted(number, line, cells, width)
        below = next((i for i in untitled if cells[i].strip()), None)
        if below is not None:
            raise RefusedInput("a cell stands under no title", row=number, line=line, found=shown(cells[below]))
        yield Record(number, line, cells[:width])


def _miscounted(number: int, line: int, cells: Sequence[str], width: int) -> RefusedInput:
    expected = f"{width} fields, as in the header"
    whole = [(a.strip().lstrip("+-"), b.strip()) for a, b in pairwise(cells)]
    if len(cells) > width and any(_digits(a) and _digits(b[:1]) for a, b in whole):
        expected += "; a decimal comma has to be a decimal point"
    return RefusedInput(
        "too many fields" if len(cells) > width else "too few fields",
        row=number,
        line=line,
        found=f"{len(cells)} fields: {shown(','.join(cells[:40]))}",
        expected=expected,
    )


def _digits(text: str) -> bool:
    return text.isascii() and text.isdigit()
