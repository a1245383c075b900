"""What the command line says in place of, or in addition to, a preface."""

from __future__ import annotations

import re
import tomllib
from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from typing import Any

from mutual.errors import RefusedInput
from mutual.quoting import shown
from mutual.recording.preface import Preface

_TEXTS = ("format", "kind", "device", "arrangement")
_LISTS = ("leads", "internal", "earthed")


@dataclass(frozen=True)
class Overrides:
    """Holds for every file of a command; a contradiction with a preface is refused.

    Attributes
    ----------
    windings : mapping of name to (first lead, second lead)
    settings : mapping of dotted key to text
        Such as "meter.gain" to "0.3%".
    columns : mapping of a foreign column to one of ours
        Such as "Ls" to "inductance [uH]".
    across, tied : str or None
        The hookup of a file that has one hookup only.
    """

    windings: Mapping[str, tuple[str, str]] = field(default_factory=dict)
    settings: Mapping[str, str] = field(default_factory=dict)
    columns: Mapping[str, str] = field(default_factory=dict)
    across: str | None = None
    tied: str | None = None


def merged(preface: Preface, overrides: Overrides) -> Preface:
    """The preface with what the command line adds to it.

    Raises
    ------
    RefusedInput
        The two contradict each other.
    """
    tables = dict(preface.tables)
    for name, leads in overrides.windings.items():
        _put(preface, tables, ("windings", name), list(leads))
    for key, text in overrides.settings.items():
        path = tuple(part.strip().strip("\"'") for part in key.split("."))
        _put(preface, tables, path, _value(path[0], text))
    return replace(preface, tables=tables)


def _put(preface: Preface, table: dict[str, Any], path: tuple[str, ...], value: Any) -> None:
    """Set a key in `table`, which is changed, while the tables within it are copied first."""
    for part in path[:-1]:
        inner = table.get(part, {})
        if not isinstance(inner, dict):
            raise preface.refused("the command line sets a key of what is no table in the preface", *path)
        table[part] = table = dict(inner)
    if path[-1] in table and not _same(table[path[-1]], value):
        raise preface.refused(
            "the command line contradicts the preface",
            *path,
            found=_written(value),
            expected=f"{shown(_written(table[path[-1]]))}, as the preface says, or nothing",
        )
    table.setdefault(path[-1], value)


def _written(value: Any) -> str:
    return ", ".join(map(str, value)) if isinstance(value, list) else str(value)


def _value(key: str, text: str) -> Any:
    """The text of `--set` as TOML would have it; what is not TOML is a string."""
    text = text.strip()
    try:
        document = tomllib.loads(f"x = {text}")
    except (ValueError, RecursionError):
        document = {}
    value = document.get("x") if len(document) == 1 else None
    if key in _TEXTS:
        return value if isinstance(value, str) else text
    if key in _LISTS:
        return value if isinstance(value, list) else re.split(r"[\s,]+", text)
    return value if isinstance(value, (bool, int, float, str, list, dict)) else text


def _same(ours: Any, theirs: Any) -> bool:
    """Whether two values of a key mean the same: "0.3%" is "0.3 %", and lead 1 is lead "1"."""
    from mutual.units import parse

    if isinstance(ours, list) and isinstance(theirs, list):
        return len(ours) == len(theirs) and all(map(_same, ours, theirs))
    if ours == theirs or str(ours) == str(theirs):
        return True
    try:
        a, b = parse(str(ours)), parse(str(theirs))
    except RefusedInput:
        return False
    return (a.value, a.unit) == (b.value, b.unit)
