"""The preface of a recording: lines that begin with `#`, one TOML document, whatever a spreadsheet did to them."""

from __future__ import annotations

import csv
import io
import re
import sys
import tomllib
from collections.abc import Sequence
from dataclasses import dataclass
from numbers import Real
from typing import Any

from mutual.errors import RefusedInput
from mutual.quoting import plain, shown

Lines = Sequence[tuple[int, str]]

_TOML_PLACE = re.compile(r"\s*\(at (?:line (\d+), column \d+|end of document)\)$")
_KEY = re.compile(r"""\s*((?:"[^"]*"|'[^']*'|[\w-]+)(?:\s*\.\s*(?:"[^"]*"|'[^']*'|[\w-]+))*)\s*=""")
_KEY_PART = re.compile(r""""([^"]*)"|'([^']*)'|([\w-]+)""")
# Unrolled, so that a string of megabytes takes no memory for going back.
_STRING = re.compile(r""""[^"\\]*(?:\\.[^"\\]*)*"|'[^']*'""")
# Items of a list without quotes that are no value of TOML either.
_BARE_ITEM = re.compile(
    r"""(?<=[\[,])(\s*)(?!(?:[+-]?[0-9][0-9_.eE+-]*|[+-]?inf|[+-]?nan|true|false)\s*[,\]])"""
    r"""([^\s"'\[\]{},=]+)(?=\s*[,\]])"""
)
# The TOML reader takes time with the square of the number of parts of one key.
_MOST_DOTS = 5000


@dataclass(frozen=True)
class Preface:
    """What a preface says, with the lines it stands on.

    Attributes
    ----------
    tables : dict
        As TOML gives it.
    lines : sequence of (int, str)
        Line of the file (from 1) and TOML text without the mark; empty if it came from Python.
    """

    tables: dict[str, Any]
    lines: Lines = ()

    def line_of(self, *path: str) -> int | None:
        """Line of the file where a key is set, else that of the innermost table around it."""
        best, depth = None, 0
        here: tuple[str, ...] = ()
        for number, text in self.lines:
            stripped = text.strip()
            key = _KEY.match(stripped)
            if stripped.startswith("["):
                here = _parts(stripped.partition("]")[0])
                place = here
            elif key is not None:
                place = here + _parts(key.group(1))
            else:
                continue
            if len(place) > depth and place == path[: len(place)]:
                best, depth = number, len(place)
        return best

    def refused(self, reason: str, *path: str, found: object = None, expected: str | None = None) -> RefusedInput:
        """A refusal that names a key and its line; `found` is quoted."""
        return RefusedInput(
            reason,
            line=self.line_of(*path),
            column=plain(".".join(part[:60] for part in path)),
            found=None if found is None else shown(found),
            expected=expected,
        )


def is_number(value: Any) -> bool:
    """Whether a value of a key or cell is a real number, and no truth value."""
    return isinstance(value, Real) and not isinstance(value, bool)


def _parts(key: str) -> tuple[str, ...]:
    return tuple(a or b or c for a, b, c in _KEY_PART.findall(key))


def split(text: str) -> tuple[list[tuple[int, str]], list[str], int]:
    """Preface lines with their numbers, the lines that follow, and the number of the first of these.

    Line ends may be LF, CRLF or CR; lines with nothing on them before the header are passed over.
    """
    lines = list(io.StringIO(text, newline=""))
    preface: list[tuple[int, str]] = []
    for number, line in enumerate(lines, 1):
        begin = line.lstrip()
        if begin.removeprefix('"').lstrip().startswith("#"):
            preface.append((number, begin.rstrip("\r\n")))
        elif begin.strip(' \t\r\n,"'):
            return preface, lines[number - 1 :], number
    return preface, [], len(lines) + 1


def understand(lines: Lines) -> Preface:
    """Read preface lines as TOML, undoing what a spreadsheet did to them where that is needed.

    Raises
    ------
    RefusedInput
        Not TOML; the line of the file is named.
    """
    quoted = any(text.startswith('"') for _, text in lines)
    padded = sum(text.endswith(",") for _, text in lines) > len(lines) / 2
    if not quoted:
        try:
            return _toml([(number, _without_mark(text)) for number, text in lines])
        except RefusedInput:
            if not padded:
                raise
    return _toml(_repaired(lines))


def _without_mark(text: str) -> str:
    return text.partition("#")[2].removeprefix(" ")


def _toml(lines: Lines) -> Preface:
    for number, text in lines:
        if len(text) > _MOST_DOTS and text.partition("=")[0].count(".") > _MOST_DOTS:
            raise RefusedInput("the preface has a key of thousands of parts", line=number, found=shown(text))
    try:
        return Preface(tomllib.loads("\n".join(text for _, text in lines)), lines)
    except RecursionError:
        raise RefusedInput("the preface is nested too deeply", line=lines[0][0]) from None
    except ValueError as error:
        message = str(error)
        place = _TOML_PLACE.search(message[-80:])
        number, text = lines[int(place.group(1)) - 1 if place and place.group(1) else -1]
        reason = plain(_TOML_PLACE.sub("", message)[:120])
        raise RefusedInput(
            f"the preface is not valid TOML ({reason})",
            line=number,
            found=shown(text),
            expected='a line such as: # device = "two coils"',
        ) from None


def _repaired(lines: Lines) -> list[tuple[int, str]]:
    """Undo quoting, splitting at commas and padding with commas.

    A spreadsheet takes every line for a row: it cuts it at commas, quotes cells that hold a quote
    (and doubles it), and pads all rows to one width.
    """
    repaired = []
    depth = 0
    for number, text in lines:
        cells = text
        if text.startswith('"') or '""' in text:
            cells = ",".join(next(csv.reader([text])))
        line = _without_mark(cells).rstrip(", \t")
        bare = _STRING.sub("", line)
        depth = max(depth + sum(bare.count(c) for c in "[{") - sum(bare.count(c) for c in "]}"), 0)
        # The comma at the end of a line within an array went with the padding; one too many does no harm.
        if depth and line and line[-1] not in "[{,":
            line += ","
        # A list written without spaces, ["A","B"], comes back as ["A",B].
        repaired.append((number, _BARE_ITEM.sub(r'\1"\2"', line) if _BARE_ITEM.search(bare) else line))
    return repaired


def allow_long_cells(length: int) -> None:
    """Let `csv` take cells of `length` characters (its own limit is 131 072, for the whole process)."""
    if csv.field_size_limit() < length:
        csv.field_size_limit(min(length + 1, sys.maxsize))
