"""What instruments show of an impedance: each column of readings as a function of Z.

Quality and parallel resistance are compared as their reciprocals (dissipation, parallel
conductance): those stay finite and nearly linear where a resistance goes to zero.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Real = NDArray[np.float64]
Complex = NDArray[np.complex128]
Triple = tuple[Real, Real, Real]


@dataclass(frozen=True)
class Quantity:
    """How one column depends on the impedance.

    Attributes
    ----------
    unit : str
        Unit of the value as read.
    function : callable
        (Z, omega) -> value compared, its derivatives by Re Z and Im Z.
    transfer : bool
        Whether Z is the transfer impedance to the sensed leads.
    loss : bool
        Whether it shows the resistance to first order.
    reciprocal : bool
        Whether the reciprocal of what was read is compared.
    """

    unit: str
    function: Callable[[Complex, Real], Triple]
    transfer: bool = False
    loss: bool = False
    reciprocal: bool = False


def _inductance(z: Complex, omega: Real) -> Triple:
    return z.imag / omega, np.zeros_like(omega), 1 / omega


def _resistance(z: Complex, omega: Real) -> Triple:
    return z.real.copy(), np.ones_like(omega), np.zeros_like(omega)


def _parallel_inductance(z: Complex, omega: Real) -> Triple:
    x, y = z.real, _away_from_zero(z.imag)
    square = x**2 + y**2
    return square / (omega * y), 2 * x / (omega * y), (y**2 - x**2) / (omega * y**2)


def _parallel_conductance(z: Complex, omega: Real) -> Triple:
    x, y = z.real, z.imag
    square = _away_from_zero(x**2 + y**2)
    return x / square, (y**2 - x**2) / square**2, -2 * x * y / square**2


def _dissipation(z: Complex, omega: Real) -> Triple:
    x, y = z.real, _away_from_zero(z.imag)
    return x / y, 1 / y, -x / y**2


def _modulus(z: Complex, omega: Real) -> Triple:
    size = _away_from_zero(np.abs(z))
    return size, z.real / size, z.imag / size


def _argument(z: Complex, omega: Real) -> Triple:
    square = _away_from_zero(np.abs(z) ** 2)
    return np.angle(z), -z.imag / square, z.real / square


def _away_from_zero(x: Real) -> Real:
    return np.where(np.abs(x) < 1e-300, 1e-300, x)


SHOWN = {
    "inductance": Quantity("H", _inductance),
    "resistance": Quantity("ohm", _resistance, loss=True),
    "parallel inductance": Quantity("H", _parallel_inductance),
    "parallel resistance": Quantity("ohm", _parallel_conductance, loss=True, reciprocal=True),
    "quality": Quantity("1", _dissipation, loss=True, reciprocal=True),
    "dissipation": Quantity("1", _dissipation, loss=True),
    "impedance": Quantity("ohm", _modulus),
    "phase": Quantity("rad", _argument, loss=True),
    "transfer inductance": Quantity("H", _inductance, transfer=True),
    "transfer resistance": Quantity("ohm", _resistance, transfer=True, loss=True),
}
NEED_FREQUENCY = frozenset({"resistance", "parallel resistance", "impedance", "transfer resistance"})


def hint(values: dict[str, float], omega: float, transfer: bool) -> tuple[float, float]:
    """Rough series resistance and inductance (ohm, H) from the values of one row; nan where they say nothing."""
    prefix = "transfer " if transfer else ""
    own = {name: value for name, value in values.items() if name in SHOWN and SHOWN[name].transfer == transfer}
    x, y = own.get(prefix + "resistance", np.nan), own.get(prefix + "inductance", np.nan) * omega
    loss = own.get("dissipation", np.nan)
    if own.get("quality"):
        loss = 1 / own["quality"]
    if "impedance" in own:
        angle = own.get("phase", np.arctan(1 / loss) if loss == loss and loss else np.pi / 2)
        x, y = own["impedance"] * np.cos(angle), own["impedance"] * np.sin(angle)
    if "parallel inductance" in own:
        reactance = omega * own["parallel inductance"]
        d = reactance / own["parallel resistance"] if own.get("parallel resistance") else loss
        d = d if d == d else 0.0
        y = reactance / (1 + d * d)
        x = d * y if d else x
    if x != x and y == y and loss == loss:
        x = loss * y
    return x, y / omega if omega else np.nan
