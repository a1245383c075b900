"""Reduced forms of the benchmarks of coverage and of slips, seeded: the full ones are run by hand (DEVELOPERS.md)."""

from __future__ import annotations

import importlib.util
import sys
from pathlib import Path
from types import ModuleType

HERE = Path(__file__).parent / "benchmarks"


def load(name: str) -> ModuleType:
    """A benchmark as a module."""
    sys.path.insert(0, str(HERE))
    spec = importlib.util.spec_from_file_location(f"benchmark_{name}", HERE / f"{name}.py")
    assert spec is not None and spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    sys.modules[spec.name] = module
    spec.loader.exec_module(module)
    return module


def test_true_slips_are_listed() -> None:
    """Three sets of each of ten kinds: the true slip is listed in 26 of 30 or more.

    With 96 % of all listed, fewer than 26 come out once in 300 drawings; the seed is fixed.
    """
    slips = load("slips")
    tallies = [slips.run(kind, 3, seed=7) for kind in slips.KINDS]
    ranks = [rank for tally in tallies for rank in tally.ranks]
    assert len(ranks) == 30
    assert sum(rank > 0 for rank in ranks) >= 26
    lengths = sorted(n for tally in tallies for n in tally.lengths)
    assert lengths[len(lengths) // 2] <= 3


def test_bounds_hold_the_truth() -> None:
    """Sixty recordings: bounds of all classes hold the truth, and are not wider than they must be.

    With a true coverage of 95 % fewer than 87 % of 90 bounds hold once in 700 drawings; the seed is fixed.
    """
    coverage = load("coverage")
    table, signs, _ = coverage.run(range(60), seed=11)
    held = sum(t.held for t in table.values())
    total = sum(t.total for t in table.values())
    assert total > 90 and held / total >= 0.87
    for name in ("M", "k"):
        widths = sorted(table["normal, interior", name].widths or [])
        assert widths and widths[len(widths) // 2] <= 1.1
    assert signs["wrong"] == 0 and signs["given"] > 40
