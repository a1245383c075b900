"""Write a described device and its hookups as a SPICE netlist.

A device is plain data: `windings` [[name, first lead, second lead], ...], `L` and `R` (n x n, H and ohm); a hookup is
`across` [a, b], `tied` [[a, b], ...] and `sense` [a, b] or None. Nothing here is shared with the package under test.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from typing import Any

Case = Mapping[str, Any]


def subcircuit(name: str, device: Case) -> list[str]:
    """The device once, as `.subckt`, with its leads as nodes.

    Each winding is, from its first lead: a 0 V source that senses its current, its resistance, its inductance, then
    one current-controlled source for every mutual resistance.
    """
    windings, inductance, resistance = device["windings"], device["L"], device["R"]
    lines = [f".subckt {name} " + " ".join(leads(device))]
    for i, (winding, first, second) in enumerate(windings):
        others = [j for j in range(len(windings)) if j != i and resistance[i][j] != 0.0]
        joints = [f"{winding}_{step}" for step in range(1, 3 + len(others))] + [second]
        lines += [
            f"V{winding} {first} {joints[0]} 0",
            f"R{winding} {joints[0]} {joints[1]} {resistance[i][i]!r}",
            f"L{winding} {joints[1]} {joints[2]} {inductance[i][i]!r}",
        ]
        for step, j in enumerate(others, start=2):
            other = windings[j][0]
            lines.append(f"H{winding}_{other} {joints[step]} {joints[step + 1]} V{other} {resistance[i][j]!r}")
    for i, (winding, _, _) in enumerate(windings):
        for j in range(i):
            if inductance[i][j] != 0.0:
                k = inductance[i][j] / math.sqrt(inductance[i][i] * inductance[j][j])
                lines.append(f"K{windings[j][0]}_{winding} L{windings[j][0]} L{winding} {k!r}")
    return [*lines, ".ends"]


def leads(device: Case) -> list[str]:
    """Leads in order of appearance."""
    return list(dict.fromkeys(lead for _, first, second in device["windings"] for lead in (first, second)))


def nodes(device: Case, hookup: Case, copy: str) -> dict[str, str]:
    """Node of every lead in one copy of the device, with one node of every floating part grounded.

    Tied leads become one node. Ground is the second `across` lead, else the second `sense` lead, else the first lead
    of the part: no current flows there, so it changes nothing but the reference of voltages.
    """
    tied = joined(leads(device), hookup["tied"])
    parts = joined(leads(device), [*hookup["tied"], *([a, b] for _, a, b in device["windings"])])
    grounded: dict[str, str] = {}
    for lead in [hookup["across"][1], *(hookup.get("sense") or [])[1:], *leads(device)]:
        grounded.setdefault(parts[lead], tied[lead])
    return {lead: "0" if tied[lead] in grounded.values() else f"{copy}_{tied[lead]}" for lead in leads(device)}


def driven(subckt: str, device: Case, hookup: Case, copy: str) -> list[str]:
    """One copy of the device with 1 A into the first `across` lead; `.save` keeps the voltages that matter."""
    node = nodes(device, hookup, copy)
    kept = [node[lead] for lead in [*hookup["across"], *(hookup.get("sense") or [])] if node[lead] != "0"]
    return [
        f"X{copy} " + " ".join(node[lead] for lead in leads(device)) + f" {subckt}",
        f"I{copy} {node[hookup['across'][1]]} {node[hookup['across'][0]]} DC 1 AC 1",
        ".save " + " ".join(f"v({name})" for name in dict.fromkeys(kept)),
    ]


def voltage(vectors: Mapping[str, Any], device: Case, hookup: Case, copy: str, pair: Sequence[str]) -> complex:
    """Voltage between two leads of one copy in an `ac` or `op` result (first point)."""
    node = nodes(device, hookup, copy)
    plus, minus = (0.0 if node[lead] == "0" else vectors[f"v({node[lead]})".lower()][0] for lead in pair)
    return complex(plus - minus)


def describe(hookup: Case) -> str:
    """One line for a comment."""
    text = "-".join(hookup["across"])
    if hookup["tied"]:
        text += " tied " + " ".join("-".join(pair) for pair in hookup["tied"])
    if hookup.get("sense"):
        text += " sense " + "-".join(hookup["sense"])
    return text


def joined(names: Sequence[str], joined: Sequence[Sequence[str]]) -> dict[str, str]:
    """Representative of the set that each name ends in when pairs are joined."""
    of = {name: name for name in names}
    for a, b in joined:
        keep, drop = of[a], of[b]
        of = {name: keep if rep == drop else rep for name, rep in of.items()}
    return of
