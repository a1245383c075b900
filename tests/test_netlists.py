"""The shipped recordings and the outputs they come from: alike with their netlists, with physics and with ngspice."""

from __future__ import annotations

import csv
import math
import shutil
import tomllib
from pathlib import Path
from typing import Any

import loops
import numpy as np
import pytest
from netlists import make, meter
from netlists.scenario import BREAK_AT, GRID, MAKE_AT, Scenario, difference, kick_netlist_text, response
from netlists.scenarios import SCENARIOS
from ngspice import NgspiceFailed, require_ngspice, run

EVERY = pytest.mark.parametrize("scenario", SCENARIOS.values(), ids=SCENARIOS)


def rows(scenario: Scenario) -> tuple[dict[str, Any], list[dict[str, str]]]:
    """Preface and rows of the shipped recording, by the standard library alone."""
    lines = (make.RECORDINGS / f"{scenario.name}.csv").read_text(encoding="utf-8").splitlines()
    preface = "\n".join(line[2:] for line in lines if line.startswith("#"))
    return tomllib.loads(preface), list(csv.DictReader(line for line in lines if not line.startswith("#")))


@EVERY
def test_recording_and_netlists_are_those_of_the_scenario(scenario: Scenario) -> None:
    kept = (make.RECORDINGS / f"{scenario.name}.csv").read_text(encoding="utf-8")
    assert kept == meter.recording_text(scenario, make.stored(scenario))
    for stem, text in make.netlists(scenario):
        assert (make.HERE / f"{stem}.cir").read_text(encoding="utf-8") == text


@EVERY
def test_recording_says_that_it_is_invented(scenario: Scenario) -> None:
    preface, _ = rows(scenario)
    assert preface["format"] == "mutual-recording-1" and preface["kind"] == "readings"
    assert preface["notes"]["origin"].startswith("invented")
    assert preface["notes"]["story"]


@EVERY
def test_device_is_passive(scenario: Scenario) -> None:
    inductance, resistance = np.array(scenario.inductance), np.array(scenario.resistance)
    for matrix in (inductance, resistance, resistance - np.array(scenario.direct or 0 * resistance)):
        assert np.array_equal(matrix, matrix.T)
        assert np.linalg.eigvalsh(matrix)[0] > 0


@EVERY
def test_stored_outputs_agree_with_loop_equations(scenario: Scenario) -> None:
    plots = make.stored(scenario)
    for number, reading in enumerate(scenario.readings, 1):
        if reading.quantities == ("kick",):
            continue
        for got, exact in zip(
            response(scenario, number, plots), loops.solve_exactly(scenario.case(reading)), strict=True
        ):
            assert (got is None) == (exact is None)
            assert got is None or abs(got - exact) < 1e-9 * abs(exact)


@EVERY
def test_every_value_lies_within_the_stated_accuracy(scenario: Scenario) -> None:
    """Worst case of all limits, five standard deviations of noise, half a printed digit; and not all are too good."""
    _, shipped = rows(scenario)
    readings = [(r, n) for n, r in enumerate(scenario.readings, 1) for _ in range(r.repeats)]
    missed = []
    for row, (reading, _) in zip(shipped, readings, strict=True):
        case = scenario.case(reading)
        across, sensed = loops.solve_exactly(case)
        accuracy = scenario.instruments[reading.instrument or "meter"]
        for name in (q for q in reading.quantities if q != "kick"):
            unit, decimals = scenario.columns[name]
            value = float(row[f"{name} [{unit}]" if unit else name]) * meter.unit_scale(unit)
            z = sensed if name.startswith("transfer") else across
            assert z is not None
            true, limit = allowed(name, z, 2 * math.pi * case["frequency"], accuracy)
            half_digit = 0.5 * 10.0**-decimals * meter.unit_scale(unit)
            assert abs(value - true) <= limit + half_digit, (row, name)
            missed.append(abs(value - true) > half_digit)
    assert np.mean(missed) > 0.5


def allowed(name: str, z: complex, omega: float, accuracy: Any) -> tuple[float, float]:
    """What a column should show and how far it may be off, SI units."""

    def stated(key: str, unit: str) -> float:
        said = accuracy.get(key, [])
        values = [meter.quantity(text) for text in ([said] if isinstance(said, str) else said)]
        return sum(v for v, u in values if u == unit)

    g = sum(stated(key, "1") for key in ("gain", "gain_common", "gain_each"))
    p = sum(stated(key, "rad") for key in ("phase", "phase_common", "phase_each"))
    extra = {u: stated("floor", u) + 5 * stated("noise", u) for u in ("H", "ohm", "rad")}
    if name.endswith("inductance"):
        return z.imag / omega, g * abs(z.imag) / omega + p * abs(z.real) / omega + extra["H"]
    if name.endswith("resistance"):
        return z.real, g * abs(z.real) + p * abs(z.imag) + extra["ohm"]
    if name == "impedance":
        return abs(z), g * abs(z) + extra["ohm"]
    if name == "phase":
        return math.atan2(z.imag, z.real), p + extra["rad"]
    # Q and D turn with the phase only; D' = -p (1 + D^2), with a little for the second order.
    ratio = z.imag / z.real if name == "quality" else z.real / z.imag
    return ratio, 1.1 * p * (1 + ratio**2)


def test_three_phases_and_one_limb() -> None:
    """Sign products, which no exchange of leads changes: -1 for phases 120 degrees apart, +1 on one limb."""
    for name, product in (("six_lead_stator", -1), ("three_on_one_limb", 1)):
        m = SCENARIOS[name].inductance
        assert np.sign(m[0][1] * m[1][2] * m[0][2]) == product
    flip = np.diag([1, -1, 1])  # the second winding was listed finish first
    between_starts = flip @ np.array(SCENARIOS["six_lead_stator"].inductance) @ flip
    assert np.all(between_starts[np.triu_indices(3, 1)] < 0)


def test_kicks_go_by_the_sign_of_m() -> None:
    scenario = SCENARIOS["six_lead_stator"]
    index = {"-".join(leads): i for i, (_, *leads) in enumerate(scenario.windings)}
    kicks = [row for row in rows(scenario)[1] if row["kick on make"]]
    assert len(kicks) == 7
    for row in kicks:
        m = scenario.inductance[index[row["across"]]][index[row["sense"]]]
        assert (row["kick on make"], row["kick on break"]) == (("+", "-") if m > 0 else ("-", "+"))


def test_kick_transient_is_the_solution_of_its_differential_equation() -> None:
    """L di/dt + R i = v, driven winding behind 15 ohm, sensed one on 10 kohm, by the matrix exponential."""
    from scipy.linalg import expm

    scenario = SCENARIOS["six_lead_stator"]
    volts = make.stored(scenario)["tran"]["v(h14_3)"].real
    inductance = np.array(scenario.inductance)[:2, :2]
    assert scenario.direct is not None
    rate = -np.linalg.solve(inductance, np.diag([scenario.direct[0][0] + 15, scenario.direct[1][1] + 10e3]))
    push = np.linalg.solve(inductance, [1.0, 0.0])
    # State: both currents, the battery's voltage and its slope, exact through every piece of the battery's polygon.
    full = np.zeros((4, 4))
    full[:2, :2], full[:2, 2], full[2, 3] = rate, push, 1.0
    pieces = [(0.0, 0.0, 0.0), (MAKE_AT, 0.0, 1.5e5), (MAKE_AT + 1e-5, 1.5, 0.0)]
    pieces += [(BREAK_AT, 1.5, -1.5e5), (BREAK_AT + 1e-5, 0.0, 0.0)]
    expected = []
    for time in GRID:
        current, last = np.zeros(2), len([p for p in pieces if p[0] <= time]) - 1
        for i, (begin, level, slope) in enumerate(pieces[: last + 1]):
            end = time if i == last else pieces[i + 1][0]
            current = (expm(full * (end - begin)) @ [*current, level, slope])[:2]
        expected.append(-10e3 * current[1])
    assert np.max(np.abs(expected)) > 0.3
    assert np.max(np.abs(volts - expected)) < 2e-6 * np.max(np.abs(expected))


def test_the_slip_and_the_low_q_short_matter() -> None:
    """The stories hold: row 5 misses by 30 %, and the bare formula sqrt(1 - Ls/Lo) by 13 %."""
    miswired = SCENARIOS["miswired"]
    written = {**miswired.case(miswired.readings[4]), "tied": [["A", "C"], ["B", "D"]]}
    true = loops.solve(miswired.case(miswired.readings[4]))[0].imag
    assert true < 0.7 * loops.solve(written)[0].imag
    low_q = SCENARIOS["open_short_low_q"]
    opened, shorted = (loops.solve(low_q.case(r))[0].imag for r in low_q.readings[:2])
    assert math.sqrt(1 - shorted / opened) < 0.87 * 0.985


def test_ngspice_gives_what_is_stored() -> None:
    require_ngspice()
    assert make.check() == []


def test_the_comparison_tells_what_differs(tmp_path: Path) -> None:
    """A millionth and a half in one output, an edited netlist, an edited recording."""
    require_ngspice()
    folder, recordings = tmp_path / "netlists", tmp_path / "recordings"
    shutil.copytree(make.HERE, folder, ignore=shutil.ignore_patterns("*.py", "__pycache__"))
    shutil.copytree(make.RECORDINGS, recordings)
    out = folder / "tapped_choke.out"
    head, *lines = out.read_text().splitlines()
    kind, point, name, real, imaginary = lines[-1].split(",")
    changed = ",".join([kind, point, name, f"{float(real) * (1 + 1.5e-6)!r}", f"{float(imaginary) * (1 + 1.5e-6)!r}"])
    out.write_text("\n".join([head, *lines[:-1], changed, ""]))
    circuit = folder / "null_pair.cir"
    circuit.write_text(circuit.read_text().replace("0.312", "0.313"))
    recording = recordings / "aerial_coils.csv"
    recording.write_text(recording.read_text().replace("143.4", "143.5"))
    store = folder / "random_devices.json"
    store.write_text(store.read_text().replace('"impedance":[', '"impedance":[1', 1))
    said = " ".join(make.check(folder, recordings))
    assert "tapped_choke.out differs by 1.5e-06" in said
    assert "null_pair.cir is not" in said and "null_pair.out differs" in said
    assert "aerial_coils.csv is not" in said and "random devices differ" in said
    assert "charging" not in said and "stator" not in said


def test_difference_notices_what_is_missing() -> None:
    plots = make.stored(SCENARIOS["six_lead_stator"])
    assert difference(plots, plots) == 0.0
    less = {kind: dict(vectors) for kind, vectors in plots.items()}
    del less["ac"]["v(h1_1)"]
    assert difference(less, plots) == difference(plots, less) == math.inf
    late = {**plots, "tran": {name: v[1:] for name, v in plots["tran"].items()}}
    assert difference(late, plots) == math.inf


@pytest.mark.parametrize(
    "netlist",
    [
        "* a node that nothing holds\nI1 0 a 1\nC1 a b 1n\nL1 c d 1m\n.op\n.end\n",
        "* no such element\nQ1 a b\nR1 a 0 1\n.op\n.end\n",
        "* coupled to nothing\nI1 0 a AC 1\nL1 a 0 1m\nL2 b 0 1m\nR2 b 0 1\nK1 L1 L3 0.5\n.ac lin 1 1k 1k\n.end\n",
        "* no analysis\nR1 a 0 1\n.end\n",
    ],
)
def test_a_netlist_that_fails_is_reported(netlist: str) -> None:
    require_ngspice()
    with pytest.raises(NgspiceFailed):
        run(netlist)


def test_known_answers_of_the_runner() -> None:
    """Series R and L by hand: 3 + 4j ohm, 3 ohm at direct current, and 6 V that stay."""
    require_ngspice()
    henry = 4 / (2 * math.pi * 1e3)
    parts = f"I1 0 a DC 2 AC 1\nR1 a b 3\nL1 b 0 {henry!r}\n"
    text = f"* coil\n{parts}.op\n.ac lin 1 1k 1k\n.tran 1u 10u\n.save v(a)\n.end\n"
    plots = run(text)
    assert plots["ac"]["v(a)"] == pytest.approx(np.array([3 + 4j]), rel=1e-14)
    assert plots["ac"]["frequency"] == pytest.approx(np.array([1e3]), rel=1e-15)
    assert plots["op"]["v(a)"] == pytest.approx(np.array([6.0]), rel=1e-14)
    assert plots["tran"]["v(a)"][-1] == pytest.approx(6.0, rel=1e-9)


def test_missing_ngspice_skips_but_not_in_ci(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("PATH", "")
    monkeypatch.delenv("MUTUAL_CI", raising=False)
    with pytest.raises(pytest.skip.Exception, match="ngspice is not installed"):
        require_ngspice()
    monkeypatch.setenv("MUTUAL_CI", "1")
    with pytest.raises(pytest.fail.Exception, match="no check may be skipped"):
        require_ngspice()


def test_only_the_stator_has_kicks() -> None:
    assert [name for name, s in SCENARIOS.items() if kick_netlist_text(s) is not None] == ["six_lead_stator"]
