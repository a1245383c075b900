"""A `Recording` -> the text of a file that reads back as the same recording."""

from __future__ import annotations

import csv
import io
import json
import math
from collections.abc import Callable, Iterable, Iterator, Mapping, Sequence
from typing import Any

from mutual.device import Device
from mutual.recording.accuracy import BY_UNIT, GAINS, PHASES
from mutual.recording.columns import DEFAULT_INSTRUMENTS, KICKS, VALUE_UNITS
from mutual.recording.declared import FORMAT
from mutual.recording.model import Accuracy, KickTable, LimitSpec, Recording, Row
from mutual.units import Unit, prefixed, printed, unit_of

Cell = Callable[[Row], str]


def dumps(recording: Recording, notes: Mapping[str, str] | None = None) -> str:
    r"""Text of a recording: preface, header, rows, with `\n` line ends.

    Read again it gives an equal recording, but for `source`, the findings of its first reading, the numbers of rows
    below one that was left out, and instruments that none but such a row used. A value with a `step` is written to
    that digit; one without to so many digits that none is taken for the last digit of a display.

    Parameters
    ----------
    recording : Recording
        Of kind "readings".
    notes : mapping of str to str, optional
        Written as the table `[notes]`, which readers leave alone.

    Raises
    ------
    ValueError
        A kind other than "readings".
    """
    if recording.kind != "readings":
        raise ValueError(f"no recording of kind {recording.kind!r} can be written")
    limits = dict(_limit(spec) for spec in recording.limits)
    used = {*DEFAULT_INSTRUMENTS, *(row.instrument for row in recording.rows)}
    instruments = [name for name in recording.instruments if name in used]
    lines = [
        *head(recording.device),
        *_kick(recording.kick),
        *(["[limits]", *(f"{key} = {value}" for key, value in limits.items())] if limits else []),
        *(line for name in instruments for line in _table(name, recording.instruments[name])),
        *(["[notes]", *(f"{_key(name)} = {text(note)}" for name, note in notes.items())] if notes else []),
    ]
    columns = list(_columns(recording.rows))
    rows = [[cell(row) for _, cell in columns] for row in recording.rows]
    return preface(lines) + table([title for title, _ in columns], rows)


def preface(lines: Iterable[str]) -> str:
    """TOML lines with the mark before each."""
    return "".join(f"# {line}\n" for line in lines)


def table(titles: Sequence[str], rows: Iterable[Sequence[str]]) -> str:
    """Header and rows as RFC 4180 wants them, but with LF."""
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow(titles)
    writer.writerows(rows)
    return out.getvalue()


def text(value: str) -> str:
    """A TOML string; what JSON escapes, TOML escapes likewise.

    A comma just before the closing quote is escaped too: a spreadsheet would take the quote for the
    beginning of a cell, and all lines after it for the rest of that cell.
    """
    return json.dumps(value, ensure_ascii=False).replace("\x7f", "\\u007f").replace(',"', '\\u002c"')


def _key(name: str) -> str:
    plain = name.isascii() and name.replace("_", "").replace("-", "").isalnum()
    return name if plain else text(name)


def _list(names: Iterable[str]) -> str:
    # A space after each comma: without it a spreadsheet would take the quotes of the next name.
    return f"[{', '.join(map(text, names))}]"


def head(device: Device) -> list[str]:
    """TOML lines of what is declared about a device."""
    own = {lead for w in device.windings for lead in (w.first, w.second)}
    extra = [lead for lead in device.leads if lead not in own]
    ties = {"resistance": (device.tie_resistance, "ohm"), "inductance": (device.tie_inductance, "H")}
    lines = [f"format = {text(FORMAT)}", 'kind = "readings"']
    lines += [f"device = {text(device.name)}"] if device.name else []
    lines += [f"arrangement = {text(device.arrangement)}"] if device.arrangement != "free" else []
    for key, leads in (("leads", extra), ("internal", device.internal), ("earthed", device.earthed)):
        lines += [f"{key} = {_list(leads)}"] if leads else []
    lines += [f"shared_loss = {device.shared_loss!r}"] if device.shared_loss != 0.1 else []
    lines += ["[windings]", *(f"{_key(w.name)} = {_list((w.first, w.second))}" for w in device.windings)]
    if any(size for size, _ in ties.values()):
        lines += ["[ties]", *(f"{key} = {_with_unit(size, unit)}" for key, (size, unit) in ties.items() if size)]
    return lines


def _with_unit(size: float, base: str) -> str:
    """A size with the prefix that suits it, exact to the last bit, as a TOML string."""
    unit = unit_of("%") if base == "%" else prefixed(base, abs(size))
    return text(f"{printed(size, unit)} {unit.symbol}")


def _kick(kick: KickTable) -> list[str]:
    changed = {key: value for key, value in vars(kick).items() if value != getattr(KickTable(), key)}
    return ["[kick]", *(f"{key} = {value!r}" for key, value in changed.items())] if changed else []


def _limit(spec: LimitSpec) -> tuple[str, str]:
    kind = spec.quantity.rsplit(" ", 2 if spec.quantity.startswith(("coupling", "mutual")) else 1)[0]
    base = {"coupling": "1", "resistance": "ohm", "mutual resistance": "ohm"}.get(kind, "H")
    ends = {"lower": spec.lower, "upper": spec.upper}
    given = {side: value for side, value in ends.items() if value is not None}
    written = (f"{s} = {repr(v) if base == '1' else _with_unit(v, base)}" for s, v in given.items())
    return text(spec.quantity), f"{{{', '.join(written)}}}"


def _table(name: str, accuracy: Accuracy) -> list[str]:
    lines = [f"[{_key(name)}]"]
    for key, value in vars(accuracy).items():
        if key == "name" or value is None or value == {} or (key == "stated_as" and value == "limit"):
            continue
        if key in GAINS:
            written = _with_unit(value, "%")
        elif key in PHASES:
            written = _with_unit(value, "rad")
        elif key in BY_UNIT:
            sizes = [_with_unit(size, unit) for unit, size in value.items()]
            written = sizes[0] if len(sizes) == 1 else f"[{', '.join(sizes)}]"
        elif key in ("shunt_floor", "input_resistance"):
            written = _with_unit(value, {"shunt_floor": "S", "input_resistance": "ohm"}[key])
        else:
            written = text(value) if isinstance(value, str) else repr(float(value))
        lines.append(f"{key} = {written}")
    return lines


def _columns(rows: Sequence[Row]) -> Iterator[tuple[str, Cell]]:
    """Titles of the columns in use, each with what it takes from a row."""
    yield "across", lambda row: "-".join(row.hookup.across)
    yield "tied", lambda row: " ".join("-".join(pair) for pair in row.hookup.tied)
    if any(row.hookup.sense for row in rows):
        yield "sense", lambda row: "-".join(row.hookup.sense or ())
    if any(row.frequency is not None for row in rows):
        yield "frequency [Hz]", lambda row: _plain(row.frequency)
    for name in VALUE_UNITS:
        if any(name in row.values for row in rows):
            unit = _column_unit(name, rows)
            yield (name if unit.base == "1" else f"{name} [{unit.symbol}]"), _value_cell(name, unit)
    for name in KICKS:
        if any(name in row.kicks for row in rows):
            yield name, lambda row, name=name: row.kicks.get(name, "")  # type: ignore[misc]
    level = next((str(row.conditions["level unit"]) for row in rows if "level unit" in row.conditions), "")
    for name, title in (
        ("temperature", "temperature [degC]"),
        ("level", f"level [{level}]" if level else "level"),
        ("range", "range"),
    ):
        if any(name in row.conditions for row in rows):
            yield title, lambda row, name=name: _plain(row.conditions.get(name))  # type: ignore[misc]
    for state in dict.fromkeys(state for row in rows for state in row.point):
        yield f"point {state}", lambda row, state=state: _plain(row.point.get(state))  # type: ignore[misc]
    if any(row.instrument for row in rows):
        yield "instrument", lambda row: row.instrument or ""


def _plain(value: Any) -> str:
    """A number in its shortest form that reads back the same, or a text."""
    return "" if value is None else value if isinstance(value, str) else printed(value, unit_of("1"))


def _column_unit(name: str, rows: Sequence[Row]) -> Unit:
    base = VALUE_UNITS[name]
    values = [row.values[name] for row in rows if name in row.values]
    if base == "rad":
        steps = [v.step for v in values if v.step is not None]
        in_degrees = unit_of("deg")
        # Digits printed in degrees are digits in no other unit.
        whole = all(math.log10(s / float(in_degrees.factor)) % 1.0 in (0.0, 1.0) for s in steps)
        return in_degrees if whole and steps else unit_of("rad")
    sizes = sorted(abs(v.value) for v in values if math.isfinite(v.value) and v.value)
    return prefixed(base, sizes[len(sizes) // 2] if sizes else 0.0)


def _value_cell(name: str, unit: Unit) -> Cell:
    def cell(row: Row) -> str:
        value = row.values.get(name)
        if value is None:
            return ""
        if math.isinf(value.value):
            return "open"
        return printed(value.value, unit, value.step, padded=value.step is None)

    return cell
