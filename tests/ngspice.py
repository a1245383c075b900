"""Run ngspice in batch and read what it computed, bit for bit."""

from __future__ import annotations

import os
import shutil
import subprocess
import tempfile
from pathlib import Path

import numpy as np

PLOT_NAMES = {"AC Analysis": "ac", "Operating Point": "op", "Transient Analysis": "tran"}


class NgspiceFailed(RuntimeError):
    """The program ended badly or left out what was asked for."""


def available() -> bool:
    """Whether the program is installed."""
    return shutil.which("ngspice") is not None


def require_ngspice() -> None:
    """Skip a test where the program is missing, but fail where the checks must be complete (`MUTUAL_CI=1`)."""
    import pytest

    if available():
        return
    if os.environ.get("MUTUAL_CI") == "1":
        pytest.fail("ngspice is missing, and with MUTUAL_CI=1 no check may be skipped")
    pytest.skip("the external program ngspice is not installed")


def run(netlist: str) -> dict[str, dict[str, np.ndarray]]:
    """Run a netlist that holds its own analysis lines (`.ac`, `.op`, `.tran`).

    Parameters
    ----------
    netlist : str
        The whole netlist; its first line is the title.

    Returns
    -------
    dict of dict of ndarray
        Analysis ("ac", "op", "tran") to vector, names in small letters as ngspice has them (`v(a)`, `frequency`,
        `time`). The binary raw file is read, so nothing is lost by printing.

    Raises
    ------
    NgspiceFailed
        It did not end well, complained of a singular matrix, or gave numbers that are not finite.
    """
    with tempfile.TemporaryDirectory() as folder:
        source, raw = Path(folder, "device.cir"), Path(folder, "device.raw")
        source.write_text(netlist, encoding="utf-8")
        # -n: a user's own start-up file must not change the answer.
        done = subprocess.run(
            ["ngspice", "-b", "-n", "-r", str(raw), str(source)],
            capture_output=True, text=True, timeout=300, cwd=folder,
            env={k: v for k, v in os.environ.items() if k != "SPICE_ASCIIRAWFILE"},
        )  # fmt: skip
        said = done.stdout + done.stderr
        bad = [line for line in said.splitlines() if any(w in line.lower() for w in ("error", "singular", "warning"))]
        if done.returncode != 0 or bad or not raw.exists():
            raise NgspiceFailed(f"exit code {done.returncode}: " + "; ".join(bad or said.splitlines()[-5:]))
        plots = _plots(raw.read_bytes())
    for kind, vectors in plots.items():
        for name, values in vectors.items():
            if not np.all(np.isfinite(values)):
                raise NgspiceFailed(f"{kind} {name} is not finite")
    return plots


def on_grid(vectors: dict[str, np.ndarray], times: np.ndarray) -> dict[str, np.ndarray]:
    """A transient at the given times (s), by straight lines between the steps that ngspice chose.

    Its own `.options interp` spoils the binary raw file (version 39), and its steps are not the same in every version.
    """
    values = {name: np.interp(times, vectors["time"], v) for name, v in vectors.items() if name != "time"}
    return {"time": times, **values}


def _plots(data: bytes) -> dict[str, dict[str, np.ndarray]]:
    """Split a binary raw file into its plots; each is a text head, `Binary:`, and doubles point by point."""
    plots: dict[str, dict[str, np.ndarray]] = {}
    while data:
        head, mark, rest = data.partition(b"Binary:\n")
        if not mark:
            raise NgspiceFailed("the raw file has no binary part")
        fields: dict[str, str] = {}
        names: list[str] = []
        for line in head.decode("utf-8").splitlines():
            if line.startswith("\t"):
                names.append(line.split()[1].lower())
            else:
                key, _, value = line.partition(":")
                fields[key] = value.strip()
        numbers = np.dtype(np.complex128 if "complex" in fields["Flags"] else np.float64)
        count = len(names) * int(fields["No. Points"])
        size = count * numbers.itemsize
        if len(rest) < size:
            raise NgspiceFailed("the raw file is cut short")
        table = np.frombuffer(rest[:size], dtype=numbers).reshape(-1, len(names))
        plots[PLOT_NAMES[fields["Plotname"]]] = {name: table[:, j].copy() for j, name in enumerate(names)}
        if "frequency" in names:  # its imaginary part is whatever stood in memory
            plots["ac"]["frequency"] = plots["ac"]["frequency"].real.copy()
        data = rest[size:]
    return plots
