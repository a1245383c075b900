"""What the interface contract (sections 4 and 3) says of the JSON that commands print, as a check for any test."""

from __future__ import annotations

import json
from collections.abc import Iterator
from pathlib import Path
from typing import Any

from jsonschema import Draft202012Validator
from referencing import Registry, Resource

HERE = Path(__file__).parent
SCHEMAS = {
    schema["$id"]: schema
    for schema in (json.loads((HERE / f"{name}.schema.json").read_text("utf-8")) for name in ("estimate", "check"))
}
REGISTRY: Registry[Any] = Registry().with_resources((k, Resource.from_contents(v)) for k, v in SCHEMAS.items())


def problems(result: dict[str, Any]) -> list[str]:
    """Everything in which a result departs from the contract; the schema is chosen by its `format`."""
    schema = SCHEMAS.get(result.get("format", ""))
    if schema is None:
        return [f"format: {result.get('format')!r} is not known"]
    found = [
        f"{error.json_path}: {error.message}"
        for error in Draft202012Validator(schema, registry=REGISTRY).iter_errors(result)
    ]
    return found or list(_beyond_the_schema(result))


def parse(text: str) -> dict[str, Any]:
    """Strict JSON of one object; the NaN and Infinity that Python would take are no JSON."""

    def refuse(name: str) -> None:
        raise ValueError(f"{name} is not JSON")

    result = json.loads(text, parse_constant=refuse)
    assert isinstance(result, dict)
    return result


def _beyond_the_schema(result: dict[str, Any]) -> Iterator[str]:
    """What a JSON schema cannot say: order of bounds, names that must fit one another."""
    for path, q in _quantities(result, "$"):
        for low, high in (("lower", "value"), ("value", "upper")):
            if q[low] is not None and q[high] is not None and q[low] > q[high]:
                yield f"{path}: {low} lies above {high}"
    if result["format"] != "mutual-estimate-1":
        return
    names = list(result["windings"])
    wanted = [[a, b] for i, a in enumerate(names) for b in names[i + 1 :]]
    parts = [(f"$.{key}", state) for key in ("by_frequency", "by_point") for state in result[key]]
    for where, state in [("$", result), *parts]:
        if list(state["windings"]) != names:
            yield f"{where}.windings: not those of the headline, in order"
        if [pair["windings"] for pair in state["pairs"]] != wanted:
            yield f"{where}.pairs: not every two windings once, in order"
    for key, ends in (("dots", result["dots"]), ("phase_starts", result["arrangement"]["phase_starts"])):
        if ends is not None:
            taken = [set(two) for two in zip(*ends, strict=False)]
            if ends[0][0] != result["windings"][names[0]]["leads"][0]:
                yield f"$.{key}: does not begin with the first winding's first lead"
            if key == "dots" and taken != [set(w["leads"]) for w in result["windings"].values()]:
                yield "$.dots: not one lead of each winding against its other"
    if result["headline_basis"] == "none":
        given = [path for path, _ in _quantities([result["windings"], result["pairs"]], "$")]
        if given:
            yield f"{given[0]}: a value in the headline under headline_basis 'none'"


def _quantities(item: Any, path: str) -> Iterator[tuple[str, dict[str, Any]]]:
    if isinstance(item, dict):
        if {"value", "bound"} <= set(item):
            yield path, item
        for key, value in item.items():
            yield from _quantities(value, f"{path}.{key}")
    elif isinstance(item, list):
        for i, value in enumerate(item):
            yield from _quantities(value, f"{path}[{i}]")
