"""Readings of an impedance meter: any column that is a function of an impedance, for any hookup."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from math import sqrt

import numpy as np
from numpy.typing import NDArray

from mutual.circuit import Compiled, Response, compile_hookups, solve
from mutual.device import Device, Hookup
from mutual.errors import RefusedInput
from mutual.evidence import NUMBER, Hints, Prediction, Source
from mutual.methods.errors_of_instruments import SHOWN as AS_SHOWN
from mutual.methods.errors_of_instruments import Choice, Effects, add_impedance_errors, standard
from mutual.methods.scatter import Scatter, Shown, scatter_of
from mutual.methods.shown import NEED_FREQUENCY, SHOWN, Quantity, hint
from mutual.recording.model import Accuracy, Row
from mutual.states import States, point_key
from mutual.unknowns import Unknowns

Real = NDArray[np.float64]
Ints = NDArray[np.int64]


@dataclass(frozen=True)
class Item:
    """One row with the instrument that read it.

    Attributes
    ----------
    where : str
        How messages name it.
    """

    row: Row
    accuracy: Accuracy
    where: str

    def columns(self) -> list[str]:
        """Columns of this row that are functions of an impedance."""
        return [name for name in self.row.values if name in SHOWN and np.isfinite(self.row.values[name].value)]


class ReadingsEvidence:
    """All readings of impedances as one piece of evidence.

    Parameters
    ----------
    device : Device
    items : sequence of Item
    states : States
    choice : Choice
        Extreme of what the data sheets leave open.

    Raises
    ------
    RefusedInput
        A frequency is missing where the prediction depends on it.
    """

    def __init__(self, device: Device, items: Sequence[Item], states: States, choice: Choice) -> None:
        self.items = tuple(items)
        hookups: dict[Hookup, int] = {}
        cases: dict[tuple[int, int, int], int] = {}
        self.position: list[tuple[int, str]] = []
        case_of: list[int] = []
        rough: dict[int, tuple[float, float]] = {}
        for number, item in enumerate(items):
            row, point = item.row, point_key(item.row.point)
            _check_frequency(item)
            plain = {name: v.value for name, v in row.values.items()}
            for name in item.columns():
                quantity = SHOWN[name]
                hookup = Hookup(row.hookup.across, row.hookup.tied, row.hookup.sense if quantity.transfer else None)
                key = (
                    hookups.setdefault(hookup, len(hookups)),
                    states.group(row.frequency, point),
                    states.state(row.frequency, point),
                )
                case = cases.setdefault(key, len(cases))
                rough.setdefault(case, hint(plain, states.omegas[key[2]], quantity.transfer))
                case_of.append(case)
                self.position.append((number, name))
        self._quantities = [SHOWN[name] for _, name in self.position]
        self._compiled = compile_hookups(device, list(hookups))
        self._index, self._group, self._state = (np.array([k[i] for k in cases], dtype=np.int64) for i in range(3))
        self._omega = np.array([states.omegas[s] for s in self._state])
        self._case: Ints = np.array(case_of, dtype=np.int64)
        self._rough = np.array([rough[c] for c in range(len(cases))]).reshape(-1, 2)
        self._masks = [(q, np.array([x is q for x in self._quantities])) for q in dict.fromkeys(self._quantities)]
        self._low_q = [items[n].accuracy.low_q_factor for n, _ in self.position]
        self._fill_errors(choice)

    @property
    def sources(self) -> Sequence[Source]:
        """Named sources, those of the instruments and then the wires of the ties."""
        return [*self._effects.sources, *self._tie_sources]

    def _fill_errors(self, choice: Choice) -> None:
        """Values, noise, rounding and the table of effects."""
        shown = []
        for (number, name), case in zip(self.position, self._case, strict=True):
            item = self.items[number]
            value = item.row.values[name]
            shown.append(Shown(number, name, value.value, value.step or 0.0, item.accuracy, int(case)))
        scatter = scatter_of(shown)
        self._effects = Effects()
        self.values, self.noise, self.freedom = scatter.compared, scatter.noise, scatter.freedom
        self.noise = np.maximum(self.noise, self._as_numbers(shown, scatter))
        self.rounding = np.zeros(len(shown))
        self.labels = [f"{s.accuracy.name} noise" for s in shown]
        for v, s in enumerate(shown):
            hookup = (self._index[s.case], self._group[s.case])
            frequency = self.items[s.row].row.frequency
            add_impedance_errors(self._effects, v, s.accuracy, choice, frequency, hookup)
            self._add_shown(v, s, scatter)
        for correlated in scatter.together:
            self.noise[list(correlated.values)] = 0.0
            for k, column in enumerate(correlated.factor.T):
                for v, size in zip(correlated.values, column, strict=True):
                    key = ("noise", correlated.values[0], k)
                    self._effects.add(v, key, self.labels[v], AS_SHOWN, float(size), False, correlated.freedom)
        self._tie_sources = self._ties()

    def _as_numbers(self, shown: Sequence[Shown], scatter: Scatter) -> Real:
        """Least noise (m,) of numbers of which nothing is stated: nine digits of their impedance, even for a nil."""
        rough, omega = np.nan_to_num(self._rough)[self._case], self._omega[self._case]
        size = np.hypot(rough[:, 0], omega * rough[:, 1])
        units = np.array([SHOWN[s.column].unit for s in shown])
        size = np.select([units == "ohm", units == "H"], [size, size / np.where(omega > 0, omega, 1.0)], 1.0)
        bare = np.array([not s.accuracy.stated for s in shown]) & (scatter.step == 0) & (scatter.noise == 0)
        return np.where(bare, NUMBER * size, 0.0)

    def _add_shown(self, v: int, shown: Shown, scatter: Scatter) -> None:
        """Counts and the display step: errors of the number as shown."""
        a, name, unit = shown.accuracy, shown.accuracy.name, SHOWN[shown.column].unit
        row = self.items[shown.row].row
        step = float(scatter.step[v])
        if a.counts is not None and step > 0:
            size, rectangular = standard(a.counts * step, a.stated_as)
            counts = (name, "counts", row.conditions.get("range", row.frequency), unit)
            self._effects.add(v, counts, f"{name} counts", AS_SHOWN, size, rectangular)
        half = step / 2 / sqrt(3)
        if scatter.frozen[v] and np.sum(scatter.group == scatter.group[v]) > 1:
            # Repeats quieter than the display show the same rounding again and again.
            key = (name, "resolution", int(scatter.group[v]))
            self._effects.add(v, key, f"{name} resolution", AS_SHOWN, half, True)
        else:
            self.rounding[v] = half

    def _ties(self) -> list[Source]:
        """Each wire of a hookup: an impedance between nothing and what was stated."""
        c: Compiled = self._compiled
        sources = []
        for part, limit in (("resistance", c.tie_resistance), ("inductance", c.tie_inductance)):
            if limit > 0:
                for h, wire in np.argwhere(c.wires):
                    sources.append(Source(("ties", part, str(h), str(wire)), f"ties, {part}", True))
        return sources

    def _respond(self, unknowns: Unknowns, theta: Real) -> tuple[Response, Real]:
        m = unknowns.matrices(theta)
        inductance, resistance = m.inductance[self._group], m.resistance[self._state]
        return solve(self._compiled, self._index, inductance, resistance, self._omega), m.chain

    def predict(self, unknowns: Unknowns, theta: Real) -> Prediction:
        """Predict all values (m,), derivatives (m, P) and effects (m, s) for unknowns (P,)."""
        response, chain = self._respond(unknowns, theta)
        z, omega = response.impedance[self._case], self._omega[self._case]
        value, by_re, by_im = np.zeros((3, len(z)))
        for quantity, mask in self._masks:
            value[mask], by_re[mask], by_im[mask] = quantity.function(z[mask], omega[mask])
        entry = response.sensitivity(unknowns.first, unknowns.second)[self._case]
        jacobian = np.zeros((len(z), unknowns.size))
        rows, t = np.arange(len(z))[:, None], np.arange(unknowns.entries)
        by_l = 1j * omega[:, None] * entry
        columns = self._group[self._case][:, None] * unknowns.entries + t
        jacobian[rows, columns] = by_re[:, None] * by_l.real + by_im[:, None] * by_l.imag
        columns = (unknowns.groups + self._state[self._case])[:, None] * unknowns.entries + t
        jacobian[rows, columns] = (by_re[:, None] * entry.real + by_im[:, None] * entry.imag) * chain[columns]
        beyond = unknowns.matrices(theta).beyond
        value += jacobian @ beyond
        effects = self._effects.matrix(z, omega, by_re, by_im, self._low_q)
        ties = self._tie_effects(response, omega, by_re, by_im)
        return Prediction(value, jacobian, np.concatenate([effects, ties], axis=1))

    def _tie_effects(self, response: Response, omega: Real, by_re: Real, by_im: Real) -> Real:
        c = self._compiled
        out = np.zeros((len(omega), len(self._tie_sources)))
        column = 0
        for factor, limit in ((np.ones_like(omega) + 0j, c.tie_resistance), (1j * omega, c.tie_inductance)):
            if limit <= 0:
                continue
            for h, wire in np.argwhere(c.wires):
                branch = c.windings + int(wire)
                here = (self._index == h)[self._case]
                change = (response.drive * response.adjoint)[:, branch][self._case] * factor * limit / sqrt(3)
                out[:, column] = np.where(here, by_re * change.real + by_im * change.imag, 0.0)
                column += 1
        return out

    def hints(self) -> Hints:
        """Rough impedances of all cases, for the starting values."""
        return Hints(
            compiled=self._compiled,
            index=self._index,
            group=self._group,
            state=self._state,
            omega=self._omega,
            resistance=self._rough[:, 0],
            inductance=self._rough[:, 1],
            shows_loss=np.array([any(q.loss for q in self._of_case(c)) for c in range(len(self._index))], dtype=bool),
        )

    def _of_case(self, case: int) -> list[Quantity]:
        return [q for q, c in zip(self._quantities, self._case, strict=True) if c == case]

    @property
    def straight(self) -> NDArray[np.bool_]:
        """(m,) which values are linear in the unknowns: no closed loop, and an L or R read."""
        linear = (SHOWN["inductance"].function, SHOWN["resistance"].function)
        plain = np.array([q.function in linear for q in self._quantities], dtype=bool)
        plain &= (self._compiled.loops[self._index] == 0)[self._case]
        return plain

    @property
    def closed(self) -> bool:
        """Whether a hookup has a closed loop."""
        return bool(self._compiled.loops.any())


def _check_frequency(item: Item) -> None:
    if item.row.frequency is not None:
        return
    for name in item.columns():
        if name in NEED_FREQUENCY:
            raise RefusedInput(
                "the frequency is missing, and the value depends on it",
                file=item.where.rpartition(" row ")[0] or None,
                row=item.row.number,
                line=item.row.line,
                column=name,
                found="no frequency",
                expected="a frequency in Hz, 0 for direct current",
            )
