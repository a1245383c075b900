"""The JSON of every shipped recording against the contract, and the schema against broken results."""

from __future__ import annotations

import copy
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
from schema import parse, problems

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

ROOT = Path(__file__).parent.parent
RECORDINGS = sorted(path.name for path in (ROOT / "recordings").glob("*.csv"))


def run(*words: str) -> tuple[dict[str, Any], int]:
    """Run the command as a process of its own, so that all of its standard output is seen."""
    code = "import sys; from mutual.cli import main; sys.exit(main())"
    done = subprocess.run([sys.executable, "-c", code, *words], cwd=ROOT, capture_output=True, text=True, check=False)
    assert done.returncode in (0, 3, 4), done.stderr
    return parse(done.stdout), done.returncode


def test_six_recordings_ship():
    assert len(RECORDINGS) >= 6


@pytest.mark.parametrize("name", RECORDINGS or ["no recording ships"])
def test_shipped_recordings(name):
    result, code = run("estimate", "--json", f"recordings/{name}")
    assert problems(result) == []
    levels = {finding["level"] for finding in result["findings"]}
    assert (code == 3) == (result["consistency"]["verdict"] == "inconsistent" or "refusal" in levels)
    assert [Path(i["file"]).name for i in result["inputs"]] == [name]
    checked, code = run("check", "--json", f"recordings/{name}")
    assert code == 0
    assert problems(checked) == []
    assert [i["sha256"] for i in checked["inputs"]] == [i["sha256"] for i in result["inputs"]]


def test_pair_prints_the_same_object():
    words = "--first 24.3uH --second 18.9uH --one-way 48.4uH --other-way 38.1uH --gain 0.1% --json"
    result, code = run("pair", *words.split())
    assert problems(result) == []
    assert code == 0


# -- the schema itself --


def made_by_hand() -> Estimate:
    """An estimate with something in every place, none of it computed."""
    q = Quantity(1e-6, 1e-8, 0.98e-6, 1.02e-6)
    k = Quantity(0.9, None, 0.85, None, "lower")
    rest = Quantity(0.1, None, None, 0.15, "upper")
    windings = {"pad": WindingResult(("A", "B"), q, q, None), "latch": WindingResult(("C", "D"), q)}
    pair = PairResult(
        ("pad", "latch"),
        Polarity("same", 0.99999, (("A", "C"), ("B", "D"))),
        mutual=q,
        mutual_magnitude=q,
        mutual_resistance=Quantity(-1e-3, 1e-4, -1.2e-3, -0.8e-3),
        coupling=k,
        one_minus_coupling=rest,
        short_circuit_inductance=(q, None),
        open_voltage_ratio=(q, q),
    )
    return Estimate(
        device="coils of no one",
        coverage=0.95,
        windings=windings,
        pairs=(pair,),
        consistency=Consistency(
            30.1, 2, 3e-7, "inconsistent", "stated", (Suspect("a.csv row 4", "A-C", "ties exchanged", 0.4, k, q),)
        ),
        arrangement=Arrangement("free", (Triple(("a", "b", "c"), -1),), (("A", "C"), ("B", "D")), "text"),
        dots=(("A", "C"), ("B", "D")),
        headline_frequency=1e5,
        headline_point={"gap": 0.008},
        by_frequency=(StateResult(windings, (pair,), 1e3), StateResult(windings, (pair,), 1e5)),
        by_point=tuple(StateResult(windings, (pair,), None, {"gap": gap}) for gap in (0.0, "far")),
        limits=(Limit("coupling pad latch", 0.11, None, "met", 0.99), Limit("x", 0, 1, "undecided", None)),
        formulas=(Formula("series both ways", "(La - Lo)/4", q, None),),
        budget=(BudgetLine("meter gain, common", "mutual pad latch", 1e-9, 0.13),),
        findings=(Finding("note", "bounded", "text", None),),
        inputs=(Input("a.csv", "0" * 64, "readings", 20),),
    )


CHECKED = {
    "format": "mutual-check-1",
    "inputs": [{"file": "a.csv", "sha256": "f" * 64, "kind": "readings", "rows": 0}],
    "findings": [{"level": "caution", "code": "left out", "text": "row 3 was left out", "where": "a.csv row 3"}],
}


def test_an_estimate_made_by_hand_fits():
    assert problems(made_by_hand().to_dict()) == []
    assert problems(CHECKED) == []


def test_keys_may_be_added():
    result = made_by_hand().to_dict()
    result["more"] = result["pairs"][0]["more"] = result["consistency"]["more"] = 1
    assert problems(result) == []


def _paths(result: Any, path: tuple[Any, ...] = ()) -> list[tuple[Any, ...]]:
    """The way to every key in a result."""
    found: list[tuple[Any, ...]] = []
    if isinstance(result, dict):
        for key, value in result.items():
            found += [(*path, key), *_paths(value, (*path, key))]
    elif isinstance(result, list):
        for i, value in enumerate(result):
            found += _paths(value, (*path, i))
    return found


# Every key of the contract, word for word; a result may hold more.
PROMISED = {
    "estimate": """
        format device coverage_probability headline_basis headline_frequency_Hz headline_point windings leads
        inductance_H resistance_ohm capacitance_F pairs mutual_H mutual_magnitude_H mutual_resistance_ohm coupling
        one_minus_coupling short_circuit_inductance_H open_voltage_ratio polarity verdict probability_same dot_leads
        dots arrangement declared triples sign_product phase_starts text by_frequency frequency_Hz by_point point
        consistency chi_square degrees_of_freedom p_value bounds_basis suspects where hookup if_mended limits
        quantity lower upper probability formulas name expression budget source standard_uncertainty share findings
        level code inputs file sha256 kind rows value bound
    """,
    "check": "format inputs findings file sha256 kind rows level code text where",
}


@pytest.mark.parametrize(("name", "whole"), [("estimate", made_by_hand().to_dict()), ("check", CHECKED)])
def test_no_key_may_be_missing(name, whole):
    promised = set(PROMISED[name].split())
    paths = [path for path in _paths(whole) if path[-1] in promised]
    assert {path[-1] for path in paths} == promised
    for *parents, key in paths:
        broken = copy.deepcopy(whole)
        holder = broken
        for step in parents:
            holder = holder[step]
        del holder[key]
        assert problems(broken), f"{parents} without {key} was taken"


def _set(*path: Any, to: Any) -> Callable[[dict[str, Any]], None]:
    def change(result: dict[str, Any]) -> None:
        holder = result
        for step in path[:-1]:
            holder = holder[step]
        holder[path[-1]] = to

    return change


L = ("windings", "pad", "inductance_H")
K = ("pairs", 0, "coupling")
BROKEN = {
    "another format": _set("format", to="mutual-estimate-2"),
    "coverage of 95": _set("coverage_probability", to=95),
    "unknown basis": _set("headline_basis", to="some"),
    "headline at direct current": _set("headline_frequency_Hz", to=0),
    "empty point": _set("headline_point", to={}),
    "three leads": _set("windings", "pad", "leads", to=["A", "B", "C"]),
    "negative inductance": _set(*L, "lower", to=-1e-6),
    "no lower under both": _set(*L, "lower", to=None),
    "no upper under both": _set(*L, "upper", to=None),
    "no uncertainty under both": _set(*L, "standard_uncertainty", to=None),
    "negative uncertainty": _set(*L, "standard_uncertainty", to=-1e-9),
    "no value": _set(*L, "value", to=None),
    "bare number": _set(*L, to=1e-6),
    "bounds exchanged": _set(*L, "upper", to=0.5e-6),
    "unknown bound": _set(*L, "bound", to="none"),
    "no lower under lower": _set(*K, "lower", to=None),
    "no upper under upper": _set("pairs", 0, "one_minus_coupling", "upper", to=None),
    "coupling above 1": _set(*K, "value", to=1.0004),
    "coupling bound above 1": _set(*K, "upper", to=1.0004),
    "negative coupling": _set(*K, "lower", to=-0.1),
    "negative magnitude": _set("pairs", 0, "mutual_magnitude_H", "lower", to=-1e-9),
    "one short circuit": _set("pairs", 0, "short_circuit_inductance_H", to=[None]),
    "pair of one": _set("pairs", 0, "windings", to=["pad", "pad"]),
    "pair turned round": _set("pairs", 0, "windings", to=["latch", "pad"]),
    "pair left out": _set("pairs", to=[]),
    "pair left out at a frequency": _set("by_frequency", 1, "pairs", to=[]),
    "winding left out at a point": _set("by_point", 0, "windings", to={}),
    "unknown polarity": _set("pairs", 0, "polarity", "verdict", to="alike"),
    "sure too early": _set("pairs", 0, "polarity", "probability_same", to=0.99),
    "undetermined with dots": _set("pairs", 0, "polarity", "verdict", to="undetermined"),
    "opposite with the odds of same": _set("pairs", 0, "polarity", "verdict", to="opposite"),
    "dots from the wrong end": _set("dots", to=[["B", "D"], ["A", "C"]]),
    "dots of one winding only": _set("dots", to=[["A", "A"], ["B", "D"]]),
    "product of 0": _set("arrangement", "triples", 0, "sign_product", to=0),
    "undeclared arrangement": _set("arrangement", "declared", to="two limbs"),
    "one frequency listed": lambda result: result["by_frequency"].pop(),
    "one point listed": lambda result: result["by_point"].pop(),
    "no p under inconsistent": _set("consistency", "p_value", to=None),
    "inconsistent at 0.2": _set("consistency", "p_value", to=0.2),
    "consistent at 3e-7": _set("consistency", "verdict", to="consistent"),
    "unknown verdict": _set("consistency", "verdict", to="fair"),
    "freedom of 1.5": _set("consistency", "degrees_of_freedom", to=1.5),
    "unknown basis of bounds": _set("consistency", "bounds_basis", to="guessed"),
    "slip that mends nothing": _set("consistency", "suspects", 0, "if_mended", "p_value", to=1e-5),
    "limit neither met nor not": _set("limits", 0, "verdict", to="perhaps"),
    "met without a probability": _set("limits", 0, "probability", to=None),
    "formula of nothing": _set("formulas", 0, "expression", to=""),
    "share in percent": _set("budget", 0, "share", to=13),
    "unknown level": _set("findings", 0, "level", to="warning"),
    "short digest": _set("inputs", 0, "sha256", to="00"),
    "unknown kind": _set("inputs", 0, "kind", to="csv"),
    "values under no headline": _set("headline_basis", to="none"),
}


@pytest.mark.parametrize("change", BROKEN.values(), ids=BROKEN)
def test_broken_results_are_rejected(change):
    result = made_by_hand().to_dict()
    change(result)
    assert problems(result)


@pytest.mark.parametrize("text", ['{"a": NaN}', '{"a": Infinity}', '{"a": 1} done', "[]", ""])
def test_only_strict_json_is_parsed(text):
    with pytest.raises((ValueError, AssertionError)):
        parse(text)
