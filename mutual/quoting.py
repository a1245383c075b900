"""Text from a user's file, made safe for a message: escaped, cut short, compared with known names."""

from __future__ import annotations

from collections.abc import Iterable

# Enough to recognise a cell or key; a message stays one line even where a cell has megabytes.
SHOWN_CHARACTERS = 60


def shown(text: object, limit: int = SHOWN_CHARACTERS) -> str:
    """Quote a piece of the input for a message.

    Everything that is not printable (control characters, escape codes, direction marks,
    lone surrogates) is escaped, so that nothing in a file can act on the terminal.

    Parameters
    ----------
    text : object
        What was found.
    limit : int
        Largest number of characters taken from it.
    """
    raw = str(text)
    return repr(raw if len(raw) <= limit else raw[: limit - 3] + "...")


def plain(text: str) -> str:
    """Escape what is not printable and leave the rest as it is, without quotes."""
    if text.isprintable():
        return text
    return "".join(c if c.isprintable() else c.encode("unicode_escape").decode("ascii") for c in text)


def has_control(text: str) -> bool:
    """Whether a text holds control characters or separators of lines, which no name needs."""
    return any(c < " " or "\x7f" <= c <= "\x9f" or c in "\u2028\u2029" or "\ud800" <= c <= "\udfff" for c in text)


def nearest(name: str, known: Iterable[str]) -> str:
    """The known name that looks most like `name`; an empty text if none is known.

    Capital letters count only where the small ones agree.
    """
    import difflib

    names = list(dict.fromkeys(known))
    short = name[:SHOWN_CHARACTERS]
    by_small: dict[str, str] = {}
    for candidate in names:
        by_small.setdefault(candidate.lower(), candidate)
    best = difflib.get_close_matches(short.lower(), list(by_small), n=1, cutoff=0.0)
    return by_small[best[0]] if best else ""


def listed(names: Iterable[str], most: int = 24) -> str:
    """Names in a row for a message, cut after the first `most`."""
    everything = [plain(n[:SHOWN_CHARACTERS]) for n in names]
    text = ", ".join(everything[:most])
    return text if len(everything) <= most else f"{text}, ... ({len(everything)} in all)"
