"""The frozen Estimate: what the engine found, in the shape of the interface contract, section 4."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

FORMAT = "mutual-estimate-1"


@dataclass(frozen=True)
class Quantity:
    """One quantity with its bounds, in SI units.

    Attributes
    ----------
    value : float
        Best point within the physical region.
    standard_uncertainty : float or None
        None where the data bound the quantity on one side only.
    lower, upper : float or None
        Ends of the coverage interval; the idle side may be None.
    bound : {"both", "lower", "upper"}
        Which side the data bound.
    """

    value: float
    standard_uncertainty: float | None
    lower: float | None
    upper: float | None
    bound: str = "both"

    def to_dict(self) -> dict[str, Any]:
        """The object `Q` of the contract."""
        return {
            "value": self.value,
            "standard_uncertainty": self.standard_uncertainty,
            "lower": self.lower,
            "upper": self.upper,
            "bound": self.bound,
        }


@dataclass(frozen=True)
class Finding:
    """Something the user should know. `level` is "note", "caution" or "refusal"."""

    level: str
    code: str
    text: str
    where: str | None = None

    def to_dict(self) -> dict[str, Any]:
        """The object listed under "findings"."""
        return {"level": self.level, "code": self.code, "text": self.text, "where": self.where}


@dataclass(frozen=True)
class WindingResult:
    """Self-inductance (H), resistance (ohm) and capacitance (F) of one winding.

    `direct_resistance` is that to direct current, which belongs to no frequency.
    """

    leads: tuple[str, str]
    inductance: Quantity | None = None
    resistance: Quantity | None = None
    capacitance: Quantity | None = None
    direct_resistance: Quantity | None = None

    def to_dict(self) -> dict[str, Any]:
        """The object listed under "windings"."""
        return {
            "leads": list(self.leads),
            "inductance_H": _q(self.inductance),
            "resistance_ohm": _q(self.resistance),
            "capacitance_F": _q(self.capacitance),
            "direct_current_resistance_ohm": _q(self.direct_resistance),
        }


@dataclass(frozen=True)
class Polarity:
    """Verdict for one pair: "same", "opposite" or "undetermined"."""

    verdict: str
    probability_same: float
    dot_leads: tuple[tuple[str, str], tuple[str, str]] | None = None

    def to_dict(self) -> dict[str, Any]:
        """The object "polarity" of a pair."""
        leads = None if self.dot_leads is None else [list(side) for side in self.dot_leads]
        return {"verdict": self.verdict, "probability_same": self.probability_same, "dot_leads": leads}


@dataclass(frozen=True)
class PairResult:
    """Everything about two windings; names of fields as in the contract without units."""

    windings: tuple[str, str]
    polarity: Polarity
    mutual: Quantity | None = None
    mutual_magnitude: Quantity | None = None
    mutual_resistance: Quantity | None = None
    coupling: Quantity | None = None
    one_minus_coupling: Quantity | None = None
    short_circuit_inductance: tuple[Quantity | None, Quantity | None] = (None, None)
    open_voltage_ratio: tuple[Quantity | None, Quantity | None] = (None, None)

    def to_dict(self) -> dict[str, Any]:
        """The object listed under "pairs"."""
        return {
            "windings": list(self.windings),
            "mutual_H": _q(self.mutual),
            "mutual_magnitude_H": _q(self.mutual_magnitude),
            "mutual_resistance_ohm": _q(self.mutual_resistance),
            "coupling": _q(self.coupling),
            "one_minus_coupling": _q(self.one_minus_coupling),
            "short_circuit_inductance_H": [_q(q) for q in self.short_circuit_inductance],
            "open_voltage_ratio": [_q(q) for q in self.open_voltage_ratio],
            "polarity": self.polarity.to_dict(),
        }


@dataclass(frozen=True)
class StateResult:
    """Windings and pairs at one frequency (Hz) or one point (name to SI value or text)."""

    windings: Mapping[str, WindingResult]
    pairs: tuple[PairResult, ...]
    frequency: float | None = None
    point: Mapping[str, Any] | None = None

    def to_dict(self) -> dict[str, Any]:
        """The object listed under "by_frequency" or "by_point"."""
        head: dict[str, Any] = {"frequency_Hz": self.frequency} if self.point is None else {"point": dict(self.point)}
        head["windings"] = {name: w.to_dict() for name, w in self.windings.items()}
        head["pairs"] = [pair.to_dict() for pair in self.pairs]
        return head


@dataclass(frozen=True)
class Triple:
    """Sign of M12 M23 M13 of three windings; None while it is not known."""

    windings: tuple[str, str, str]
    sign_product: int | None

    def to_dict(self) -> dict[str, Any]:
        """The object listed under "triples"."""
        return {"windings": list(self.windings), "sign_product": self.sign_product}


@dataclass(frozen=True)
class Arrangement:
    """What the signs say of how the windings sit on the core."""

    declared: str = "free"
    triples: tuple[Triple, ...] = ()
    phase_starts: tuple[tuple[str, ...], tuple[str, ...]] | None = None
    text: str = ""

    def to_dict(self) -> dict[str, Any]:
        """The object "arrangement"."""
        starts = None if self.phase_starts is None else [list(side) for side in self.phase_starts]
        return {
            "declared": self.declared,
            "triples": [t.to_dict() for t in self.triples],
            "phase_starts": starts,
            "text": self.text,
        }


@dataclass(frozen=True)
class Suspect:
    """One slip that alone would make contradicting readings agree, and the answer if it is mended."""

    where: str
    hookup: str
    text: str
    p_value: float
    coupling: Quantity | None = None
    mutual: Quantity | None = None

    def to_dict(self) -> dict[str, Any]:
        """The object listed under "suspects"."""
        mended = {"p_value": self.p_value, "coupling": _q(self.coupling), "mutual_H": _q(self.mutual)}
        return {"where": self.where, "hookup": self.hookup, "text": self.text, "if_mended": mended}


@dataclass(frozen=True)
class Consistency:
    """Whether the readings can belong to one device."""

    chi_square: float
    degrees_of_freedom: int
    p_value: float | None
    verdict: str
    bounds_basis: str
    suspects: tuple[Suspect, ...] = ()

    def to_dict(self) -> dict[str, Any]:
        """The object "consistency"."""
        return {
            "chi_square": self.chi_square,
            "degrees_of_freedom": self.degrees_of_freedom,
            "p_value": self.p_value,
            "verdict": self.verdict,
            "bounds_basis": self.bounds_basis,
            "suspects": [s.to_dict() for s in self.suspects],
        }


@dataclass(frozen=True)
class Limit:
    """A stated limit and whether the device keeps it."""

    quantity: str
    lower: float | None
    upper: float | None
    verdict: str
    probability: float | None

    def to_dict(self) -> dict[str, Any]:
        """The object listed under "limits"."""
        return dict(vars(self))


@dataclass(frozen=True)
class Formula:
    """A textbook formula evaluated on the readings as they stand, to redo by hand."""

    name: str
    expression: str
    mutual: Quantity | None = None
    coupling: Quantity | None = None

    def to_dict(self) -> dict[str, Any]:
        """The object listed under "formulas"."""
        return {
            "name": self.name,
            "expression": self.expression,
            "mutual_H": _q(self.mutual),
            "coupling": _q(self.coupling),
        }


@dataclass(frozen=True)
class BudgetLine:
    """Contribution of one named source to the standard uncertainty of one quantity."""

    source: str
    quantity: str
    standard_uncertainty: float
    share: float

    def to_dict(self) -> dict[str, Any]:
        """The object listed under "budget"."""
        return dict(vars(self))


@dataclass(frozen=True)
class Input:
    """A file that went into the estimate."""

    file: str
    sha256: str
    kind: str
    rows: int

    def to_dict(self) -> dict[str, Any]:
        """The object listed under "inputs"."""
        return dict(vars(self))


@dataclass(frozen=True)
class Estimate:
    """The circuit that explains the evidence, with bounds. All numbers in SI units."""

    device: str
    coverage: float
    windings: Mapping[str, WindingResult]
    pairs: tuple[PairResult, ...]
    consistency: Consistency
    arrangement: Arrangement = Arrangement()
    dots: tuple[tuple[str, ...], tuple[str, ...]] | None = None
    headline_basis: str = "all"
    headline_frequency: float | None = None
    headline_point: Mapping[str, Any] | None = None
    by_frequency: tuple[StateResult, ...] = ()
    by_point: tuple[StateResult, ...] = ()
    limits: tuple[Limit, ...] = ()
    formulas: tuple[Formula, ...] = ()
    budget: tuple[BudgetLine, ...] = ()
    findings: tuple[Finding, ...] = ()
    inputs: tuple[Input, ...] = field(default=())

    def pair(self, first: str, second: str) -> PairResult:
        """The result for two windings, in either order.

        Raises
        ------
        KeyError
            No such pair.
        """
        for pair in self.pairs:
            if set(pair.windings) == {first, second}:
                return pair
        raise KeyError((first, second))

    @property
    def reliable(self) -> bool:
        """Whether the result may be relied on as it stands (exit code other than 3)."""
        return self.consistency.verdict != "inconsistent" and all(f.level != "refusal" for f in self.findings)

    def to_dict(self) -> dict[str, Any]:
        """The JSON object of the interface contract, section 4."""
        return {
            "format": FORMAT,
            "device": self.device,
            "coverage_probability": self.coverage,
            "headline_basis": self.headline_basis,
            "headline_frequency_Hz": self.headline_frequency,
            "headline_point": None if self.headline_point is None else dict(self.headline_point),
            "windings": {name: w.to_dict() for name, w in self.windings.items()},
            "pairs": [pair.to_dict() for pair in self.pairs],
            "dots": None if self.dots is None else [list(side) for side in self.dots],
            "arrangement": self.arrangement.to_dict(),
            "by_frequency": [s.to_dict() for s in self.by_frequency],
            "by_point": [s.to_dict() for s in self.by_point],
            "consistency": self.consistency.to_dict(),
            "limits": [x.to_dict() for x in self.limits],
            "formulas": [x.to_dict() for x in self.formulas],
            "budget": [x.to_dict() for x in self.budget],
            "findings": [x.to_dict() for x in self.findings],
            "inputs": [x.to_dict() for x in self.inputs],
        }


def _q(quantity: Quantity | None) -> dict[str, Any] | None:
    return None if quantity is None else quantity.to_dict()
