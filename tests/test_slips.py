"""Which slip would make contradicting readings agree: five perfect readings and one slip, truth by closed form."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import pytest
from bench import estimate
from references import Pair

import mutual

PAIR = Pair(80e-6, 30e-6, 11e-6, 0.5, 0.3, frequency=1e5)
HOOKUPS = (("A-B", ""), ("C-D", ""), ("A-D", "B-C"), ("A-C", "B-D"), ("A-B", "C-D"), ("A-B", "A-C B-D"))
COLUMNS = "across,tied,frequency [Hz],inductance [H],resistance [ohm]"
METER = {"gain_common": "0.1 %", "gain_each": "0.05 %", "noise": ["5 nH", "2 mohm"]}


def rows() -> list[list[Any]]:
    """What a perfect meter shows."""
    found = []
    for across, tied in HOOKUPS:
        z = PAIR.hookups()[across, tied, ""]
        found.append([across, tied, PAIR.frequency, z.imag / PAIR.omega, z.real])
    return found


def suspects(readings: Sequence[Sequence[Any]]) -> tuple[mutual.Estimate, list[tuple[str, str]]]:
    """The estimate, and row and text of each suspect."""
    found = estimate(COLUMNS, readings, meter=METER)
    return found, [(s.where.rpartition(" ")[2], s.text) for s in found.consistency.suspects]


def test_readings_that_agree_have_no_suspects() -> None:
    found, listed = suspects(rows())
    assert found.consistency.verdict == "consistent" and not listed


@pytest.mark.parametrize(
    ("row", "column", "factor", "word"), [(3, 3, 1e-3, "thousand"), (4, 3, 1e3, "thousand"), (6, 4, 1e3, "thousand")]
)
def test_a_prefix_slip_is_named_first(row: int, column: int, factor: float, word: str) -> None:
    readings = rows()
    readings[row - 1][column] *= factor
    found, listed = suspects(readings)
    assert found.consistency.verdict == "inconsistent" and not found.reliable
    assert listed[0][0] == str(row) and word in listed[0][1]


def test_exchanged_ties_are_named_first_with_the_answer_if_mended() -> None:
    readings = rows()
    readings[5][1] = "A-D B-C"
    found, listed = suspects(readings)
    assert found.consistency.verdict == "inconsistent"
    assert listed[0][0] == "6" and "exchanged" in listed[0][1]
    first = found.consistency.suspects[0]
    assert first.coupling is not None and first.coupling.lower is not None and first.coupling.upper is not None
    assert first.coupling.lower <= PAIR.coupling <= first.coupling.upper
    assert first.p_value > 0.01


def test_values_of_two_rows_exchanged() -> None:
    readings = rows()
    readings[0][3:], readings[4][3:] = readings[4][3:], readings[0][3:]
    readings[1][3:], readings[5][3:] = readings[5][3:], readings[1][3:]
    assert suspects(readings)[0].consistency.verdict == "inconsistent"
    readings = rows()
    readings[1][3:], readings[4][3:] = readings[4][3:], readings[1][3:]
    _, listed = suspects(readings)
    assert any({"2", "5"} >= {row} and "exchanged" in text for row, text in listed)
