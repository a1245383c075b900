"""Bytes of a file -> text, or the reason why it is none."""

from __future__ import annotations

import os
from pathlib import Path

from mutual.errors import RefusedInput
from mutual.quoting import shown

_UTF8_MARK = b"\xef\xbb\xbf"
_UTF16_MARKS = (b"\xff\xfe", b"\xfe\xff")
_ARCHIVE = b"PK\x03\x04"
_WANTED = "comma-separated text in UTF-8 (a spreadsheet saves it as 'CSV UTF-8')"


def load(path: str | os.PathLike[str]) -> bytes:
    """Bytes of a file.

    Raises
    ------
    RefusedInput
        A folder, a missing file, or one that cannot be read.
    """
    file = Path(path)
    try:
        if file.is_dir():
            raise RefusedInput("this is a folder", expected="a recording, a file that ends in .csv")
        return file.read_bytes()
    except FileNotFoundError:
        raise RefusedInput("there is no such file") from None
    except (OSError, ValueError) as error:  # ValueError: a null character in the name
        reason = error.strerror if isinstance(error, OSError) else str(error)
        raise RefusedInput(f"the file cannot be read ({reason})") from error


def decode(data: bytes) -> str:
    """Text of a recording, its byte-order mark removed.

    Raises
    ------
    RefusedInput
        Nothing in it, binary, or in another encoding.
    """
    if data.startswith(_UTF16_MARKS) or _looks_like_utf16(data):
        raise RefusedInput("the file is written in UTF-16", expected=_WANTED)
    if data.startswith(_ARCHIVE):
        raise RefusedInput("the file is a workbook or another archive, not text", expected=_WANTED)
    if b"\0" in data:
        line = data[: data.index(b"\0")].count(b"\n") + 1
        raise RefusedInput("the file is binary", line=line, found="a null byte", expected=_WANTED)
    try:
        text = data.removeprefix(_UTF8_MARK).decode("utf-8")
    except UnicodeDecodeError as error:
        raise _not_utf8(data.removeprefix(_UTF8_MARK), error) from None
    if not text.strip():
        raise RefusedInput("the file is empty")
    return text


def _looks_like_utf16(data: bytes) -> bool:
    """Whether every second byte of the beginning is null, as in UTF-16 without a mark."""
    head = data[:64]
    half = len(head) // 2
    return half >= 2 and any(head[odd::2].count(0) >= half and head[1 - odd :: 2].count(0) == 0 for odd in (0, 1))


def _not_utf8(data: bytes, error: UnicodeDecodeError) -> RefusedInput:
    before = data[: error.start]
    around = data[max(error.start - 12, before.rfind(b"\n") + 1) : error.start + 1]
    found = f"byte 0x{data[error.start]:02x} after {shown(around[:-1].decode('ascii', 'replace'))}"
    return RefusedInput("a character is not UTF-8", line=before.count(b"\n") + 1, found=found, expected=_WANTED)
