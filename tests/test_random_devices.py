"""The random devices that other tests lean on: what they cover, and that ngspice's answers are right to 1e-9."""

from __future__ import annotations

import math

import loops
import numpy as np
from netlists import netlist, random_devices
from ngspice import require_ngspice

STORED = random_devices.load()
# ngspice eliminates in node voltages with its own choice of pivots: 4e-11 was the worst of 6 000 cases.
RIGHT = 1e-9


def couplings(case: dict) -> np.ndarray:
    """Signed couplings of all pairs."""
    matrix = np.array(case["L"])
    scale = np.sqrt(np.diag(matrix))
    return (matrix / np.outer(scale, scale))[np.triu_indices(len(matrix), 1)]


def test_what_the_stored_set_covers() -> None:
    assert len(STORED) == 400 and random_devices.STORE.stat().st_size < 400e3
    assert {case["kind"] for case in STORED} == set(random_devices.KINDS)
    assert {len(case["windings"]) for case in STORED} == {2, 3, 4, 5, 6}
    assert len({case["frequency"] for case in STORED}) == 8
    shared = sum(len(netlist.leads(case)) < 2 * len(case["windings"]) for case in STORED)
    assert shared > 200  # taps, stars
    assert sum(loop_without_ties(case) for case in STORED) > 20  # deltas, windings joined at both ends
    assert sum(case["sense"] is not None for case in STORED) > 150
    assert sum(np.count_nonzero(case["R"]) > len(case["R"]) for case in STORED) > 200  # mutual resistance
    tightest = np.array([np.max(np.abs(couplings(case))) for case in STORED])
    assert np.max(tightest) < 0.99999 and np.sum(tightest > 0.9999) > 10 and np.sum(tightest < 0.9) > 100
    assert np.sum([np.any(couplings(case) < 0) for case in STORED]) > 100


def loop_without_ties(case: dict) -> bool:
    """Whether windings alone close a loop."""
    whole = {**case, "across": case["windings"][0][1:], "tied": [], "sense": None}
    return loops.paths(whole)[2].shape[1] > 0


def test_devices_are_passive() -> None:
    for case in STORED:
        for name in ("L", "R"):
            matrix = np.array(case[name])
            scale = np.sqrt(np.diag(matrix))
            assert np.array_equal(matrix, matrix.T)
            assert np.linalg.eigvalsh(matrix / np.outer(scale, scale))[0] > 1e-6


def test_stored_answers_are_right() -> None:
    """Against loop equations in rational arithmetic, which has no rounding at all."""
    for case in STORED:
        for name, exact in zip(("impedance", "transfer"), loops.solve_exactly(case), strict=True):
            assert (case[name] is None) == (exact is None)
            assert exact is None or abs(complex(*case[name]) - exact) < RIGHT * abs(exact), case


def test_ngspice_gives_the_stored_answers() -> None:
    require_ngspice()
    assert random_devices.difference(random_devices.solve(STORED), STORED) < RIGHT


def test_fresh_answers_are_right() -> None:
    require_ngspice()
    for case in random_devices.solve(random_devices.generate(300, seed=31, frequencies=5)):
        for name, exact in zip(("impedance", "transfer"), loops.solve_exactly(case), strict=True):
            assert exact is None or abs(complex(*case[name]) - exact) < RIGHT * abs(exact), case


def test_loops_in_doubles_are_right() -> None:
    for case in STORED:
        assert abs(loops.solve(case)[0] - loops.solve_exactly(case)[0]) < 1e-11 * abs(loops.solve(case)[0])


def test_the_store_reads_back_as_written() -> None:
    text = random_devices.STORE.read_text(encoding="utf-8")
    assert random_devices.dumps(STORED) == text


def test_a_seed_gives_the_same_devices() -> None:
    first, again, other = (random_devices.generate(12, seed=s, frequencies=2) for s in (5, 5, 6))
    assert first == again and first != other


def test_reciprocity() -> None:
    """What sits across and what is sensed may change places (closed loops or not)."""
    count = 0
    for case in (c for c in STORED if c["sense"] is not None):
        there = loops.solve_exactly(case)[1]
        back = loops.solve_exactly({**case, "across": case["sense"], "sense": case["across"]})[1]
        assert there is not None and back is not None
        assert math.isclose(abs(there - back), 0.0, abs_tol=1e-15 * abs(there))
        count += 1
    assert count > 150
