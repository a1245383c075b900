"""Readings typed as rows, as tests need them; nothing here knows an answer."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

import pandas as pd

import mutual
from mutual.result import Estimate, Formula, PairResult, Quantity

TWO = {"one": ("A", "B"), "two": ("C", "D")}
THREE = {**TWO, "three": ("E", "F")}


def recording(
    columns: str, rows: Sequence[Sequence[Any]], windings: Mapping[str, tuple[str, str]] = TWO, **tables: Any
) -> mutual.Recording:
    """Rows under the titles in `columns`, separated by commas. A text such as "1.67" has a last printed digit."""
    frame = pd.DataFrame([list(row) for row in rows], columns=columns.split(","), dtype=object)
    return mutual.Recording.from_readings(frame, windings=windings, **tables)


def estimate(columns: str, rows: Sequence[Sequence[Any]], **tables: Any) -> Estimate:
    """The estimate from those rows."""
    return mutual.estimate(recording(columns, rows, **tables))


def known(quantity: Quantity | None) -> Quantity:
    """A quantity that must be there."""
    assert quantity is not None
    return quantity


def inductance(found: Estimate, name: str) -> Quantity:
    """Self-inductance of a winding, H."""
    return known(found.windings[name].inductance)


def formula(found: Estimate, name: str) -> Formula:
    """The one textbook formula of that name."""
    (only,) = (f for f in found.formulas if f.name == name)
    return only


def codes(found: Estimate, level: str | None = None) -> set[str]:
    """Codes of all findings, or of those of one level."""
    return {f.code for f in found.findings if level in (None, f.level)}


def quantities(pair: PairResult) -> dict[str, Quantity | None]:
    """All quantities of a pair by name."""
    return {
        "mutual": pair.mutual,
        "mutual magnitude": pair.mutual_magnitude,
        "coupling": pair.coupling,
        "one minus coupling": pair.one_minus_coupling,
        "shorted, first": pair.short_circuit_inductance[0],
        "shorted, second": pair.short_circuit_inductance[1],
        "ratio, first": pair.open_voltage_ratio[0],
        "ratio, second": pair.open_voltage_ratio[1],
    }
