"""Text that fits: names cut, sentences wrapped, and nothing in them that a terminal could obey."""

from __future__ import annotations

import textwrap

from mutual.quoting import plain


def safe(text: object) -> str:
    r"""Anything as one line of text, with what cannot be seen (or acts on a terminal) escaped: ESC becomes ``\x1b``."""
    return plain(str(text))


def cut(text: str, width: int) -> str:
    """The text, shortened with three full stops where it is longer than `width` characters."""
    return text if len(text) <= width else text[: max(width - 3, 0)] + "..."[: max(width, 0)]


def wrapped(text: object, width: int, first: str = "", rest: str | None = None) -> list[str]:
    """Lines of at most `width` characters; `first` and `rest` stand before the first and the further lines."""
    rest = " " * len(first) if rest is None else rest
    return textwrap.wrap(
        safe(text), width, initial_indent=first, subsequent_indent=rest, break_on_hyphens=False
    ) or [first.rstrip()]
