"""The recording that a described device would give, errors of its instruments included."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, replace
from decimal import Decimal
from math import floor, log10, pi, sqrt

import numpy as np
from numpy.typing import NDArray

from mutual.circuit import compile_hookups, solve
from mutual.described import Described, Planned
from mutual.device import Hookup
from mutual.errors import RefusedInput
from mutual.methods.errors_of_instruments import Choice, Effects, add_impedance_errors, standard
from mutual.methods.shown import SHOWN, Quantity
from mutual.recording.columns import KICKS
from mutual.recording.model import Accuracy, Recording, Row, Value
from mutual.recording.write import dumps

Real = NDArray[np.float64]
Complex = NDArray[np.complex128]

# Where no display step is described, more digits are written than any meter shows.
DIGITS = 8
# Relative to the largest inductance: less than this is what rounding leaves of nothing.
NO_DEFLECTION = 1e-12
# A quality or parallel resistance beyond the reciprocal of this is none.
LEAST_LOSS = 1e-12
# Values of these columns do not depend on the frequency as long as no loop is closed.
_ANY_FREQUENCY = ("inductance", "transfer inductance", *KICKS)


@dataclass(frozen=True)
class _Case:
    """One impedance that is read; the frequency in Hz is None where it does not matter."""

    hookup: Hookup
    frequency: float | None
    instrument: str
    accuracy: Accuracy = field(compare=False)

    @property
    def omega(self) -> float:
        """Angular frequency, rad/s; any will do where it does not matter."""
        return 2 * pi * (1.0 if self.frequency is None else self.frequency)


def simulate(described: Described, seed: int) -> Recording:
    """Read a described device with its instruments.

    An impedance is read as Z (1 + g + j p) and so on, as the interface contract (section 2.1) describes the accuracy
    keys: one draw for each error that readings share, a draw for each reading's own. Errors stated as limits are drawn
    from a rectangle. Where the data sheet leaves open how an error is split into common and each, or whether it is the
    same at all frequencies, that is drawn too.

    Parameters
    ----------
    described : Described
    seed : int
        Not negative; the same seed gives the same recording.

    Returns
    -------
    Recording

    Raises
    ------
    RefusedInput
        The device is not passive, or something is to be read that it cannot give.
    """
    described.check_passive()
    rng = np.random.default_rng(seed)
    chosen = {name: _split(a, rng) for name, a in described.instruments.items()}
    between = {name: bool(rng.integers(2)) for name in chosen}
    cases = _cases(described, chosen)
    read = dict(zip(cases, _as_read(cases, _true(described, cases), Choice({}, between), rng), strict=True))
    turned = rng.random() < described.kick.reversed
    shared: dict[tuple[str, ...], float] = {}
    rows: list[Row] = []
    for planned in described.readings:
        for frequency in planned.frequencies:
            for _ in range(planned.repeats):
                values = _values(planned, frequency, chosen, read, shared, rng)
                kicks = _kicks(described, planned, turned, rng)
                number = len(rows) + 1
                rows.append(Row(number, planned.hookup, None, frequency, values, kicks, planned.instrument))
    device = replace(described.device, name=f"{described.device.name or 'described device'} (simulated)")
    instruments, limits = described.instruments, described.limits
    return Recording(device, tuple(rows), instruments=instruments, kick=described.kick, limits=limits)


def written(recording: Recording, seed: int) -> str:
    """The text of a simulated recording, which says in its notes how it was made."""
    text = dumps(recording)
    lines = text.splitlines(keepends=True)
    preface = sum(line.startswith("#") for line in lines)
    notes = ["# [notes]\n", f'# made = "simulated from a described device, seed {seed}; nobody measured this"\n']
    return "".join([*lines[:preface], *notes, *lines[preface:]])


def _split(accuracy: Accuracy, rng: np.random.Generator) -> Accuracy:
    """Divide errors of unknown split between common and each, at random."""
    parts: dict[str, float | None] = {}
    for part in ("gain", "phase"):
        whole = getattr(accuracy, part)
        if whole is None:
            continue
        share = float(rng.random())
        # Limits add up; standard deviations add up in their squares.
        weights = (share, 1 - share) if accuracy.stated_as == "limit" else (sqrt(share), sqrt(1 - share))
        for kind, weight in zip(("common", "each"), weights, strict=True):
            stated = getattr(accuracy, f"{part}_{kind}") or 0.0
            parts[f"{part}_{kind}"] = stated + weight * whole
        parts[part] = None
    return replace(accuracy, **parts)  # type: ignore[arg-type]


def _instrument(planned: Planned, instruments: Mapping[str, Accuracy]) -> Accuracy:
    name = planned.instrument or "meter"
    if planned.instrument is not None and name not in instruments:
        raise RefusedInput("an instrument without an accuracy table", column="readings.instrument", found=repr(name))
    return instruments.get(name, Accuracy(name))


def _hookup(hookup: Hookup, quantity: Quantity) -> Hookup:
    """The hookup as far as it matters to a quantity: where nothing is sensed, the voltmeter is not there."""
    return hookup if quantity.transfer else Hookup(hookup.across, hookup.tied)


def _cases(described: Described, instruments: Mapping[str, Accuracy]) -> list[_Case]:
    """Every impedance that is read, once; refuses what cannot be read."""
    found: dict[_Case, None] = {}
    for planned in described.readings:
        accuracy = _instrument(planned, instruments)
        for name in planned.quantities:
            if (name in KICKS or SHOWN[name].transfer) and planned.hookup.sense is None:
                raise RefusedInput("no leads to sense", column="readings.sense", expected=f"two leads for {name!r}")
            for frequency in planned.frequencies:
                _check_frequency(described, planned, name, frequency)
                if name in SHOWN:
                    found[_Case(_hookup(planned.hookup, SHOWN[name]), frequency, accuracy.name, accuracy)] = None
    return list(found)


def _check_frequency(described: Described, planned: Planned, name: str, frequency: float | None) -> None:
    if frequency is not None:
        if frequency == 0 and name not in ("resistance", "transfer resistance", *KICKS):
            raise RefusedInput("it cannot be read at direct current", column="readings.quantities", found=repr(name))
        return
    loops = compile_hookups(described.device, [planned.hookup]).loops[0]
    varies = any(len(t.values) > 1 for t in (*described.inductance, *described.coupling.values()))
    if name not in _ANY_FREQUENCY or (name not in KICKS and (loops or varies)):
        reason = f"the frequency is missing, and the {name} of {planned.hookup} depends on it"
        raise RefusedInput(reason, column="readings.frequency")


def _true(described: Described, cases: Sequence[_Case]) -> Complex:
    """Impedance (U,) of each case without errors, ohm."""
    if not cases:
        return np.zeros(0, dtype=complex)
    compiled = compile_hookups(described.device, [case.hookup for case in cases])
    frequencies = [case.frequency or 0.0 for case in cases]
    inductance = np.array([described.inductances(f) for f in frequencies])
    resistance = np.array([described.resistances(f) for f in frequencies])
    omega = np.array([case.omega for case in cases])
    return solve(compiled, np.arange(len(cases)), inductance, resistance, omega).impedance


def _as_read(cases: Sequence[_Case], true: Complex, choice: Choice, rng: np.random.Generator) -> Complex:
    """Impedance (U,) with the errors that the readings of a case share, noise and display apart."""
    effects = Effects()
    for number, case in enumerate(cases):
        add_impedance_errors(effects, number, case.accuracy, choice, case.frequency, case.hookup)
    draws = np.array([_draw(source.rectangular, rng) for source in effects.sources])
    omega = np.array([case.omega for case in cases])
    low_q = [case.accuracy.low_q_factor for case in cases]
    one, none = np.ones(len(cases)), np.zeros(len(cases))
    real = effects.matrix(true, omega, one, none, low_q) @ draws
    imaginary = effects.matrix(true, omega, none, one, low_q) @ draws
    return np.asarray(true + real + 1j * imaginary)


def _draw(rectangular: bool, rng: np.random.Generator) -> float:
    """One error in units of its standard deviation."""
    return float(rng.uniform(-sqrt(3), sqrt(3)) if rectangular else rng.standard_normal())


def _values(
    planned: Planned,
    frequency: float | None,
    instruments: Mapping[str, Accuracy],
    read: Mapping[_Case, complex],
    shared: dict[tuple[str, ...], float],
    rng: np.random.Generator,
) -> dict[str, Value]:
    """What the display shows for the columns of one row."""
    accuracy = _instrument(planned, instruments)
    values = {}
    for name in (q for q in planned.quantities if q in SHOWN):
        quantity = SHOWN[name]
        case = _Case(_hookup(planned.hookup, quantity), frequency, accuracy.name, accuracy)
        shown = float(quantity.function(np.array([read[case]]), np.array([case.omega]))[0][0])
        if quantity.reciprocal:
            if abs(shown) < LEAST_LOSS:
                reason, where = "the described device has no loss there", str(planned.hookup)
                raise RefusedInput(reason, column=f"readings, {name}", found=where)
            shown = 1 / shown
        step = accuracy.resolution.get(quantity.unit)
        if accuracy.counts is not None:
            if step is None:
                reason = "counts are stated without the display step they count"
                wanted = f"a resolution in {quantity.unit}"
                raise RefusedInput(reason, column=f"{accuracy.name}.resolution", expected=wanted)
            size, rectangular = standard(accuracy.counts * step, accuracy.stated_as)
            key = (accuracy.name, str(frequency), quantity.unit)
            shown += size * shared.setdefault(key, _draw(rectangular, rng))
        shown += accuracy.noise.get(quantity.unit, 0.0) * rng.standard_normal()
        values[name] = _displayed(shown, step)
    return values


def _displayed(value: float, resolution: float | None) -> Value:
    """Round to the display step, or to a fixed number of digits where none is known."""
    if resolution is None:
        resolution = 10.0 ** (floor(log10(abs(value))) - DIGITS + 1) if value else 1e-15
    # In decimals, so that 24.3 is the number that a display of 24.3 is read as.
    exact = Decimal(round(value / resolution)) * Decimal(repr(resolution))
    return Value(float(exact), float(Decimal(1).scaleb(floor(log10(resolution) + 1e-9))))


def _kicks(described: Described, planned: Planned, turned: bool, rng: np.random.Generator) -> dict[str, str]:
    """Deflections of one remade connection; make and break share their chance of being wrong."""
    wanted = [name for name in planned.quantities if name in KICKS]
    if not wanted:
        return {}
    # The first instant is decided by inductance alone, whatever the resistances.
    compiled = compile_hookups(described.device, [planned.hookup])
    inductance = described.inductances(0.0)[None]
    induced = solve(compiled, np.zeros(1, dtype=np.int64), inductance, 0 * inductance, np.ones(1)).impedance[0].imag
    if abs(induced) < NO_DEFLECTION * inductance.max():
        induced = 0.0
    wrong = (rng.random() < described.kick.misread) != turned
    sign = float(np.sign(induced)) * (-1 if wrong else 1)
    words = {1.0: "+", -1.0: "-", 0.0: "0"}
    return {name: words[sign if name == "kick on make" else -sign] for name in wanted}
