"""Kicks typed as rows, as tests need them; nothing here knows an answer."""

from __future__ import annotations

from typing import Any

from bench import recording

import mutual
from mutual.result import Estimate

KICKED = "across,sense,kick on make,kick on break"
# Deflections at make and at break.
UP, DOWN = ("+", "-"), ("-", "+")


def kicked(rows: list[tuple[str, str, tuple[str, str], int]], **tables: Any) -> Estimate:
    """The estimate from kicks alone: battery, voltmeter, deflections at make and break, and how often."""
    every = [(across, sense, *seen) for across, sense, seen, times in rows for _ in range(times)]
    return mutual.estimate(recording(KICKED, every, **tables))


def same(found: Estimate, first: str = "one", second: str = "two") -> float:
    """Probability that M > 0."""
    return found.pair(first, second).polarity.probability_same


def word(found: Estimate, first: str = "one", second: str = "two") -> str:
    """Verdict of a pair."""
    return found.pair(first, second).polarity.verdict
