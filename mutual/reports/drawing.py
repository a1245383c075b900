"""Drawings in text: how to wire a hookup, and where the dots sit. They know leads and windings, no numbers."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from mutual.device import Device, Hookup, Winding
from mutual.reports.wording import cut, safe

COIL_TURNS = 5
MARGIN = "    "


@dataclass(frozen=True)
class Pen:
    """The characters that a drawing is made of.

    Attributes
    ----------
    line, turn, wire, down, joint : str
        Horizontal conductor, one turn of a coil, jumper wire, vertical conductor, connection.
    marks : str
        Dots; the first is used when one kind of dot serves all windings.
    """

    line: str
    turn: str
    wire: str
    down: str
    joint: str
    marks: str


PLAIN = Pen(line="-", turn="n", wire="=", down="|", joint="+", marks="*ox#")
LINES = Pen(line="─", turn="∩", wire="═", down="│", joint="o", marks="●○■□")


def pen_for(encoding: str | None) -> Pen:
    """The finest pen whose characters the encoding of the output can take; plain ASCII where that is not known."""
    try:
        "".join((LINES.line, LINES.turn, LINES.wire, LINES.down, LINES.marks)).encode(encoding or "ascii")
    except (UnicodeEncodeError, LookupError):
        return PLAIN
    return LINES


@dataclass(frozen=True)
class _Branch:
    """Something that joins two columns of the drawing."""

    left: int
    right: int
    body: str
    label: str


def draw_hookup(device: Device, hookup: Hookup, pen: Pen = PLAIN, width: int = 80) -> list[str]:
    """Draw one hookup: every lead is a column, windings, wires and meter join columns.

    A horizontal line that meets a vertical one without the connection sign passes over it.

    Parameters
    ----------
    device : Device
    hookup : Hookup
    pen : Pen
    width : int
        Longest line, in characters.

    Returns
    -------
    list of str
        Lines without line ends; in words alone where the leads do not fit beside one another.
    """
    names = [safe(lead) for lead in device.leads]
    longest = max(len(name) for name in names)
    for pitch in (max(COIL_TURNS + 3, longest + 2), max(5, longest + 1)):
        room = width - len(MARGIN) - pitch * len(names)
        if room >= 12:
            break
    else:
        return _in_words(hookup, width)
    column = {lead: i for i, lead in enumerate(device.leads)}
    rows = _rows(device, hookup, column, pen)
    last = {c: r for r, row in enumerate(rows) for branch in row for c in (branch.left, branch.right)}
    heading = "".join(name.ljust(pitch) for name in names)
    lines = [(MARGIN + heading).rstrip()]
    for r, row in enumerate(rows):
        canvas = _row_text(r, row, last, len(names), pitch, pen)
        label = ", ".join(dict.fromkeys(branch.label for branch in row))
        lines.append((MARGIN + canvas + cut(label, room)).rstrip())
    return lines


def _in_words(hookup: Hookup, width: int) -> list[str]:
    words = [f"meter across {'-'.join(hookup.across)}"]
    words += [f"wire from {a} to {b}" for a, b in hookup.tied]
    if hookup.sense is not None:
        words.append(f"voltmeter across {'-'.join(hookup.sense)}")
    return [cut(MARGIN + safe(text), width) for text in words]


def _rows(device: Device, hookup: Hookup, column: Mapping[str, int], pen: Pen) -> list[list[_Branch]]:
    def branch(ends: tuple[str, str], body: str, label: str) -> _Branch:
        a, b = sorted((column[ends[0]], column[ends[1]]))
        return _Branch(a, b, body, label)

    coil = pen.turn * COIL_TURNS
    rows = _packed([branch((w.first, w.second), coil, safe(w.name)) for w in device.windings])
    rows += _packed([branch(pair, pen.wire, "wire") for pair in hookup.tied])
    plus = safe(hookup.across[0])
    if hookup.sense is None:
        return [*rows, [branch(hookup.across, "meter", f"meter, + on {plus}")]]
    sensed = f"voltmeter, + on {safe(hookup.sense[0])}"
    return [*rows, [branch(hookup.across, "feed", f"source, + on {plus}")], [branch(hookup.sense, "V", sensed)]]


def _packed(branches: Sequence[_Branch]) -> list[list[_Branch]]:
    """Put branches that do not overlap on one row; those that share a lead may touch there."""
    rows: list[list[_Branch]] = []
    for branch in branches:
        for row in rows:
            if all(branch.left >= other.right or branch.right <= other.left for other in row):
                row.append(branch)
                break
        else:
            rows.append([branch])
    return rows


def _row_text(r: int, row: list[_Branch], last: Mapping[int, int], leads: int, pitch: int, pen: Pen) -> str:
    text = [" "] * (pitch * leads)
    for branch in row:
        a, b = branch.left * pitch, branch.right * pitch
        fill = pen.wire if branch.body == pen.wire else pen.line
        text[a + 1 : b] = [fill] * (b - a - 1)
    for lead in range(leads):
        # A conductor that goes on downwards stays visible where another passes over it.
        if last.get(lead, -1) > r:
            text[lead * pitch] = pen.down
    for branch in row:
        a, b = branch.left * pitch, branch.right * pitch
        text[a] = text[b] = pen.joint
        if branch.body != pen.wire:
            _centre(text, branch.body, a, min(b, a + pitch))
    return "".join(text)


def _centre(text: list[str], body: str, a: int, b: int) -> None:
    """Write `body` between two columns; where they stand close together, fewer turns or the first letter."""
    room = b - a - 1
    if len(body) > room:
        body = body[0] if body.isalpha() and len(set(body)) > 1 else body[:room]
    start = a + 1 + (room - len(body)) // 2
    text[start : start + len(body)] = body


def draw_dots(windings: Sequence[Winding], marks: Mapping[str, tuple[str, int]], pen: Pen = PLAIN) -> list[str]:
    """Draw every winding on a line of its own, with the dot at its marked lead.

    Parameters
    ----------
    windings : sequence of Winding
    marks : mapping of winding name to (lead, kind)
        `kind` counts from 0; windings whose dots are known relative to one another share a kind.
        A winding that is missing gets no dot.
    pen : Pen

    Returns
    -------
    list of str
    """
    rows = []
    for w in windings:
        lead, kind = marks.get(w.name, ("", 0))
        dot = pen.marks[kind % len(pen.marks)]
        left, right = (dot if lead == end else " " for end in (w.first, w.second))
        rows.append(((w.first, left), (right, w.second), w.name))
    return _coils(rows, pen)


def _coils(rows: Sequence[tuple[tuple[str, str], tuple[str, str], str]], pen: Pen) -> list[str]:
    """One line for each of ((lead, mark), (mark, lead), name), leads in columns."""
    coil = pen.line * 2 + pen.turn * COIL_TURNS + pen.line * 2
    shown = [(cut(safe(a), 16), left, right, cut(safe(b), 16), cut(safe(name), 24))
             for (a, left), (right, b), name in rows]  # fmt: skip
    before = max((len(row[0]) for row in shown), default=0)
    after = max((len(row[3]) for row in shown), default=0)
    return [
        f"{MARGIN}{a:>{before}} {left}{coil}{right} {b:<{after}}   {name}".rstrip() for a, left, right, b, name in shown
    ]


def draw_phases(windings: Sequence[Winding], starts: Sequence[str], finishes: Sequence[str], pen: Pen) -> list[str]:
    """Draw every winding from its start to its finish, for windings that no single dot each can describe."""
    names = [w.name for w in windings]
    rows = [((a, ""), ("", b), name) for a, b, name in zip(starts, finishes, names, strict=True)]
    lines = _coils(rows, pen)
    inner = max((len(line) for line in _coils([(r[0], r[1], "") for r in rows], pen)), default=0)
    heading = f"{MARGIN}start".ljust(inner - len("finish") + 1) + "finish"
    return [heading, *lines]
