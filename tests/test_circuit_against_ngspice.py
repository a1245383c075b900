"""`mutual.circuit` on random devices, against ngspice and against loop equations in rational arithmetic."""

from __future__ import annotations

import math
from typing import Any

import loops
import numpy as np
import pytest
from netlists import random_devices
from ngspice import require_ngspice

from mutual.circuit import Response, compile_hookups, solve
from mutual.device import Device, Hookup, Winding, check_hookup

STORED = random_devices.load()
AGREES = 1e-9


def declared(case: dict[str, Any]) -> tuple[Device, Hookup]:
    """The case in the words of the package."""
    device = Device("random", tuple(Winding(*w) for w in case["windings"]))
    sense = None if case["sense"] is None else tuple(case["sense"])
    return device, Hookup(tuple(case["across"]), tuple((a, b) for a, b in case["tied"]), sense)


def answer(case: dict[str, Any], sensed: bool) -> Response:
    """What the package says of one case, of its sensed voltage or of the impedance across."""
    device, hookup = declared(case)
    check_hookup(device, hookup)
    if not sensed:
        hookup = Hookup(hookup.across, hookup.tied)
    return solve(
        compile_hookups(device, [hookup]),
        np.array([0]),
        np.array([case["L"]]),
        np.array([case["R"]]),
        np.array([2 * math.pi * case["frequency"]]),
    )


def worst(cases: list[dict[str, Any]]) -> float:
    """Largest relative difference between the package and the results that came with the cases."""
    return max(
        abs(complex(answer(case, name == "transfer").impedance[0]) - complex(*case[name])) / abs(complex(*case[name]))
        for case in cases
        for name in ("impedance", "transfer")
        if case[name] is not None
    )


def test_stored_cases_agree_with_ngspice() -> None:
    assert worst(STORED) < AGREES


def test_fresh_cases_agree_with_ngspice() -> None:
    require_ngspice()
    assert worst(random_devices.solve(random_devices.generate(240, seed=61, frequencies=6))) < AGREES


def test_stored_cases_agree_with_exact_loop_equations() -> None:
    """Rational arithmetic has no rounding to hide behind, so this holds tighter than ngspice can be asked to."""
    for case in STORED:
        for sensed, exact in zip((False, True), loops.solve_exactly(case), strict=True):
            if exact is not None:
                assert abs(complex(answer(case, sensed).impedance[0]) - exact) < 1e-10 * abs(exact), case


def test_many_hookups_of_one_device_at_once() -> None:
    """Vectorised over hookups and frequencies: the same numbers as one at a time, exactly shaped."""
    case = next(c for c in STORED if len(c["windings"]) == 4)
    device, _ = declared(case)
    leads = device.leads
    ends = [(w.first, w.second) for w in device.windings]
    hookups = [Hookup(ends[i], (ends[j],), ends[k]) for i in range(4) for j in range(4) for k in range(4)]
    hookups = [h for h in hookups if h.tied[0] != h.across and h.sense not in h.tied]
    frequencies = np.array([11.0, 1.7e3, 2.9e5])
    index = np.repeat(np.arange(len(hookups)), 3)
    omega = 2 * np.pi * np.tile(frequencies, len(hookups))
    many = [np.broadcast_to(case[name], (len(index), 4, 4)) for name in ("L", "R")]
    got = solve(compile_hookups(device, hookups), index, *many, omega).impedance
    assert len(leads) >= 4 and got.shape == (3 * len(hookups),)
    for u, value in enumerate(got):
        hookup = hookups[index[u]]
        plain = {
            **case, "frequency": float(frequencies[u % 3]), "across": list(hookup.across),
            "tied": [list(pair) for pair in hookup.tied], "sense": list(hookup.sense or ()),
        }  # fmt: skip
        exact = loops.solve_exactly(plain)[1]
        assert exact is not None
        assert abs(complex(value) - exact) < 1e-10 * abs(exact)


def test_direct_current() -> None:
    """At 0 Hz only resistances count; shorted and parallel windings share the current by them."""
    for case in STORED[:: len(STORED) // 60]:
        still = {**case, "frequency": 0.0}
        exact, sensed = loops.solve_exactly(still)
        assert complex(answer(still, False).impedance[0]) == pytest.approx(exact, rel=1e-10)
        if sensed is not None:
            # An open winding senses nothing: 0 is asked to be 0 next to the impedance across.
            assert abs(complex(answer(still, True).impedance[0]) - sensed) < 1e-10 * max(abs(sensed), abs(exact))


@pytest.mark.parametrize("kind", ["L", "R"])
def test_sensitivities(kind: str) -> None:
    """Against central differences of the loop equations in rational arithmetic, every element of sixty devices."""
    seen = 0
    for case in STORED[:: len(STORED) // 60]:
        n = len(case["windings"])
        first, second = np.triu_indices(n)
        unit = 2j * math.pi * case["frequency"] if kind == "L" else 1.0
        for sensed in (False, True):
            if sensed and case["sense"] is None:
                continue
            got = answer(case, sensed)
            slopes = unit * got.sensitivity(first, second)[0]
            # Each in proportion: what the impedance changes by when the element changes by its natural size.
            size = np.sqrt(np.outer(np.diag(case[kind]), np.diag(case[kind])))[first, second]
            exact = np.array(
                [loops.slope_exactly(case, kind, i, j)[sensed] for i, j in zip(first, second, strict=True)]
            ).astype(complex)
            scale = np.max(np.abs(exact * size))
            assert np.max(np.abs(slopes - exact) * size) < 1e-9 * scale, case
            seen += len(exact)
    assert seen > 800
