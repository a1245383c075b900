"""Estimates made by hand, for the tests of reports: invented numbers, no engine behind them."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

from mutual.result import (
    Arrangement,
    BudgetLine,
    Consistency,
    Estimate,
    Finding,
    Formula,
    Input,
    Limit,
    PairResult,
    Polarity,
    Quantity,
    StateResult,
    Suspect,
    Triple,
    WindingResult,
)

M = Quantity(2.5750e-6, 0.0123e-6, 2.5512e-6, 2.5993e-6)
K = Quantity(0.12015, 0.00057, 0.119034, 0.121282)
SAME = Polarity("same", 0.9999999, (("A", "C"), ("B", "D")))
OPEN = Polarity("undetermined", 0.5)
WINDINGS = {
    "pad": WindingResult(
        ("A", "B"), Quantity(24.3e-6, 0.0115e-6, 24.2774e-6, 24.3226e-6), Quantity(0.11, 0.0012, 0.1076, 0.1123)
    ),
    "latch": WindingResult(("C", "D"), Quantity(18.9e-6, 0.011e-6, 18.8785e-6, 18.9214e-6)),
}
PAIR = PairResult(("pad", "latch"), SAME, mutual=M, mutual_magnitude=M, coupling=K)
AGREED = Consistency(1.2, 1, 0.27, "consistent", "stated")


def pair_estimate(**changes: Any) -> Estimate:
    """Two windings that are known, but for the resistance of the second."""
    made = Estimate(
        device="latch coils, invented",
        coverage=0.95,
        windings=WINDINGS,
        pairs=(PAIR,),
        consistency=AGREED,
        arrangement=Arrangement(text="two windings: one dot each serves"),
        dots=(("A", "C"), ("B", "D")),
        headline_frequency=1e5,
    )
    return replace(made, **changes)


def full_estimate() -> Estimate:
    """Everything that `--detail` can show, with a long name and limits."""
    pair = replace(
        PAIR,
        one_minus_coupling=Quantity(0.87985, 0.00057, 0.87872, 0.88097),
        short_circuit_inductance=(Quantity(23.95e-6, 12e-9, 23.926e-6, 23.974e-6), None),
        open_voltage_ratio=(Quantity(0.106, 0.0005, 0.105, 0.107), None),
        mutual_resistance=Quantity(0.002, None, None, 0.0031, "upper"),
    )
    states = tuple(StateResult(WINDINGS, (pair,), frequency=f) for f in (1e3, 1e5))
    points = tuple(StateResult(WINDINGS, (pair,), frequency=1e5, point={"gap": g}) for g in (0.008, 0.016))
    return pair_estimate(
        pairs=(pair,),
        by_frequency=states,
        by_point=points,
        limits=(
            Limit("coupling pad latch", 0.11, 0.14, "met", 0.99995),
            Limit("inductance pad", None, 25e-6, "undecided", 0.6),
        ),
        formulas=(Formula("series both ways", "(La - Lo)/4", M, K),),
        budget=(
            BudgetLine("meter gain, common", "coupling pad latch", 1e-5, 0.13),
            BudgetLine("meter gain, each", "coupling pad latch", 5.2e-4, 0.87),
            BudgetLine("meter gain, each", "mutual pad latch", 1.2e-8, 0.97),
        ),
        findings=(
            Finding("note", "undetermined", "the resistance of latch was not read"),
            Finding("caution", "gain split unknown", "the share of the two is not known; " * 6, "a.csv"),
        ),
        inputs=(Input("a folder/with a long name/" + "x" * 90 + ".csv", "0" * 64, "readings", 20),),
    )


def contradicting(*suspects: Suspect) -> Estimate:
    """Readings that cannot belong to one device."""
    return pair_estimate(consistency=Consistency(88.0, 2, 7.8e-20, "inconsistent", "stated", suspects))


def suspect(text: str = "two ties were exchanged", **changes: Any) -> Suspect:
    """A slip that would explain it."""
    made = Suspect("a.csv row 4", "A-C tied B-D", text, 0.42, coupling=K, mutual=M)
    return replace(made, **changes)


def phases() -> Estimate:
    """Three phase windings, of which no dots exist."""
    names = ("u", "v", "w")
    leads = {"u": ("a", "b"), "v": ("c", "d"), "w": ("e", "f")}
    words = {("u", "v"): "opposite", ("u", "w"): "same", ("v", "w"): "same"}
    pairs = tuple(
        PairResult(p, Polarity(w, 1.0 if w == "same" else 0.0), coupling=Quantity(0.38, 0.001, 0.378, 0.382))
        for p, w in words.items()
    )
    return Estimate(
        device="stator, invented",
        coverage=0.95,
        windings={n: WindingResult(leads[n], Quantity(8.4e-3, 1e-5, 8.38e-3, 8.42e-3)) for n in names},
        pairs=pairs,
        consistency=AGREED,
        arrangement=Arrangement(
            "three-phase", (Triple(names, -1),), (("a", "c", "f"), ("b", "d", "e")), "the signs multiply to -1"
        ),
    )
