"""What goes to the two output streams and to new files, and how a refusal becomes one sentence."""

from __future__ import annotations

import json
import os
import sys
from pathlib import Path
from typing import Any, TextIO

from mutual.errors import RefusedInput
from mutual.reports.wording import cut, safe

# A cell can be megabytes long; this much of it is enough to find it again.
LONGEST_QUOTE = 120


def say(text: str) -> None:
    """Print a result on standard output; characters that its encoding lacks come out as escapes."""
    _put(sys.stdout, text)


def tell(text: str) -> None:
    """Print a message or progress on standard error."""
    _put(sys.stderr, text)


def say_json(value: Any) -> None:
    """Print one JSON value on standard output. Not-a-number has no place in it."""
    say(json.dumps(value, indent=2, allow_nan=False))


def output_encoding() -> str | None:
    """Encoding of standard output; None where there is none (a closed stream)."""
    return getattr(sys.stdout, "encoding", None)


def _put(stream: TextIO | None, text: str) -> None:
    if stream is None:  # closed by whoever started the program: nobody wants to hear it
        return
    encoding = stream.encoding or "ascii"
    try:
        stream.write(text.encode(encoding, "backslashreplace").decode(encoding) + "\n")
        stream.flush()
    except BrokenPipeError:
        # Whoever read the other end has gone (`| head`): that says nothing about the result, so the exit
        # code stays what it would have been, and the interpreter must not complain when it flushes at the end.
        os.dup2(os.open(os.devnull, os.O_WRONLY), stream.fileno())


def sentence(refused: RefusedInput) -> str:
    """One sentence of a refusal: file, row and line, column, what is wrong, what was found and expected."""
    place: list[str] = []
    if refused.file is not None:
        place.append(safe(refused.file))
    if refused.row is not None and refused.line is not None:
        place.append(f"row {refused.row} (line {refused.line})")
    elif refused.row is not None:
        place.append(f"row {refused.row}")
    elif refused.line is not None:
        place.append(f"line {refused.line}")
    if refused.column is not None:
        place.append(_column(refused))
    text = f"{', '.join(place)}: " if place else ""
    text += safe(refused.reason)
    if refused.found is not None:
        text += f"; found {_quoted(refused.found)}"
    if refused.expected is not None:
        text += f"; expected {safe(refused.expected)}"
    return text


def _column(refused: RefusedInput) -> str:
    """A column of a row, an option of the command line, or else a key of a preface or a title of the header."""
    name = _quoted(refused.column or "")
    if name.startswith("--"):
        return f"option {name}"
    return f"column '{name}'" if refused.row is not None else f"at '{name}'"


def _quoted(text: str) -> str:
    return cut(safe(text[: 2 * LONGEST_QUOTE]), LONGEST_QUOTE)


def sentence_of_system(error: OSError) -> str:
    """One sentence of what the operating system refused."""
    name = f"{safe(error.filename)}: " if error.filename is not None else ""
    return f"{name}{safe(error.strerror or error)}"


def write_new(file: str, text: str, force: bool = False) -> None:
    """Write a file that must not exist yet (unless `force`), all of it or nothing.

    Raises
    ------
    RefusedInput
        The file exists.
    """
    try:
        with Path(file).open("w" if force else "x", encoding="utf-8", newline="\n") as stream:
            stream.write(text)
    except FileExistsError:
        raise RefusedInput("the file exists and is not overwritten", file=file, expected="another name") from None
