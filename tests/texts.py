"""Invented recordings as texts, for tests of reading; no device was measured."""

from __future__ import annotations

from pathlib import Path

import pytest

from mutual.errors import RefusedInput
from mutual.recording import Overrides, Recording, read

PREFACE = """\
# format = "mutual-recording-1"
# kind = "readings"
# device = "two coils, invented"
# [windings]
# pad = ["A", "B"]
# latch = ["C", "D"]
"""
HEADER = "across,tied,frequency [Hz],inductance [uH]\n"
ROWS = "A-B,,100e3,24.30\nC-D,,100e3,18.90\n"
# The first line of rows, with PREFACE and one line of header before it.
FIRST_ROW_LINE = 8


def read_text(folder: Path, text: str | bytes, overrides: Overrides | None = None, name: str = "a.csv") -> Recording:
    """Write a file and read it."""
    file = folder / name
    file.write_bytes(text if isinstance(text, bytes) else text.encode("utf-8"))
    return read(file, overrides)


def refused(folder: Path, text: str | bytes, overrides: Overrides | None = None) -> RefusedInput:
    """The refusal of a file, which has to be one printable sentence that names the file."""
    with pytest.raises(RefusedInput) as caught:
        read_text(folder, text, overrides)
    error = caught.value
    assert error.file == str(folder / "a.csv")
    assert str(error).isprintable()
    assert len(str(error)) < 1000
    return error
