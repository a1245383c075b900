"""The tree of errors. Each carries facts as fields; only `cli` makes sentences of them."""

from __future__ import annotations

from typing import Any


class MutualError(Exception):
    """Root of all errors raised on purpose by this package."""


class RefusedInput(MutualError):
    """An input that cannot be used without guessing (exit code 1).

    Parameters
    ----------
    reason : str
        What is wrong, as one clause without the place.
    file : str, optional
        Name of the file as the user gave it.
    row : int, optional
        Data row, counted from 1, the header not counted.
    line : int, optional
        Line of the file, counted from 1.
    column : str, optional
        Column or preface key.
    found, expected : str, optional
        What stood there and what would have been taken.
    """

    def __init__(
        self,
        reason: str,
        *,
        file: str | None = None,
        row: int | None = None,
        line: int | None = None,
        column: str | None = None,
        found: str | None = None,
        expected: str | None = None,
    ) -> None:
        super().__init__(reason)
        self.reason = reason
        self.file = file
        self.row = row
        self.line = line
        self.column = column
        self.found = found
        self.expected = expected

    def with_place(self, **place: Any) -> RefusedInput:
        """Return a copy in which missing place fields are filled from `place`."""
        fields = {name: getattr(self, name) for name in ("file", "row", "line", "column", "found", "expected")}
        for name, value in place.items():
            if fields.get(name) is None:
                fields[name] = value
        return RefusedInput(self.reason, **fields)

    def __str__(self) -> str:
        place = [str(self.file)] if self.file is not None else []
        if self.row is not None:
            place.append(f"row {self.row}")
        if self.line is not None:
            place.append(f"line {self.line}")
        if self.column is not None:
            place.append(f"column {self.column!r}")
        text = f"{', '.join(place)}: {self.reason}" if place else self.reason
        if self.found is not None:
            text += f"; found {self.found}"
        if self.expected is not None:
            text += f"; expected {self.expected}"
        return text


class WrongUsage(MutualError):
    """A request that makes no sense whatever the data (exit code 2)."""
