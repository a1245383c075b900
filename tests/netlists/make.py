"""Make the netlists, ngspice's outputs and the shipped recordings again, or compare what is stored.

Run from anywhere, with numpy at hand and ngspice installed::

    python tests/netlists/make.py            rewrite netlists, outputs and recordings
    python tests/netlists/make.py --check    run ngspice into memory and compare; exit 1 where something differs
"""

from __future__ import annotations

import argparse
import sys
from collections.abc import Iterator
from pathlib import Path

sys.path.insert(0, str(Path(__file__).resolve().parents[1]))

from netlists import random_devices
from netlists.meter import recording_text
from netlists.scenario import Scenario, difference, dumps, kick_netlist_text, loads, netlist_text, solve
from netlists.scenarios import SCENARIOS

HERE = Path(__file__).resolve().parent
RECORDINGS = HERE.parents[1] / "recordings"
TOLERANCE = 1e-6
RANDOM_COUNT, RANDOM_SEED = 400, 20


def netlists(scenario: Scenario) -> Iterator[tuple[str, str]]:
    """Stem and text of the netlists of one scenario."""
    yield scenario.name, netlist_text(scenario)
    kicks = kick_netlist_text(scenario)
    if kicks is not None:
        yield f"{scenario.name}_kick", kicks


def stored(scenario: Scenario, folder: Path = HERE) -> dict[str, dict]:
    """All stored outputs of one scenario in one mapping: `ac`, `op` and `tran`."""
    plots: dict[str, dict] = {}
    for stem, _ in netlists(scenario):
        plots |= loads((folder / f"{stem}.out").read_text(encoding="utf-8"))
    return plots


def write() -> None:
    """Rewrite everything."""
    for scenario in SCENARIOS.values():
        for stem, text in netlists(scenario):
            (HERE / f"{stem}.cir").write_text(text, encoding="utf-8", newline="\n")
            (HERE / f"{stem}.out").write_text(dumps(solve(text)), encoding="utf-8", newline="\n")
        recording = recording_text(scenario, stored(scenario))
        (RECORDINGS / f"{scenario.name}.csv").write_text(recording, encoding="utf-8", newline="\n")
    cases = random_devices.solve(random_devices.generate(RANDOM_COUNT, RANDOM_SEED))
    random_devices.STORE.write_text(random_devices.dumps(cases), encoding="utf-8", newline="\n")


def check(folder: Path = HERE, recordings: Path = RECORDINGS) -> list[str]:
    """Run everything again and say what differs from what is stored; empty when all agrees."""
    wrong = []
    for scenario in SCENARIOS.values():
        for stem, text in netlists(scenario):
            kept = (folder / f"{stem}.cir").read_text(encoding="utf-8")
            if kept != text:
                wrong.append(f"{stem}.cir is not what its scenario says")
            worst = difference(solve(kept), loads((folder / f"{stem}.out").read_text(encoding="utf-8")))
            if not worst <= TOLERANCE:
                wrong.append(f"{stem}.out differs by {worst:.1e} relative")
        kept = (recordings / f"{scenario.name}.csv").read_text(encoding="utf-8")
        if kept != recording_text(scenario, stored(scenario, folder)):
            wrong.append(f"{scenario.name}.csv is not what its outputs and its seed give")
    kept_cases = random_devices.load(folder / random_devices.STORE.name)
    worst = random_devices.difference(kept_cases, random_devices.solve(kept_cases))
    if not worst <= TOLERANCE:
        wrong.append(f"random devices differ by {worst:.1e} relative")
    return wrong


def main(arguments: list[str] | None = None) -> int:
    """Command line; the exit code is 1 where something differs."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--check", action="store_true", help="compare and change nothing")
    if not parser.parse_args(arguments).check:
        write()
        return 0
    wrong = check()
    print("\n".join(wrong) if wrong else f"all netlists agree with what is stored within {TOLERANCE:g}")
    return 1 if wrong else 0


if __name__ == "__main__":
    sys.exit(main())
