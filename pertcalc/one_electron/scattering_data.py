"""Published scattering of slow electrons by noble gases, set beside what a potential gives; atomic units inside.

The table is ``pertcalc/data/one_electron/phase_shifts.csv``; notes/electron-gas.md says what is doubtful in it.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cache

import numpy as np
from numpy.typing import NDArray

from pertcalc import constants
from pertcalc.errors import DataFileError
from pertcalc.one_electron.scattering import Scatterer, cross_sections, phase_shifts, scattering_length
from pertcalc.shipped import shipped_rows
from pertcalc.species import GASES, noble_gas_symbol

Array = NDArray[np.float64]

QUANTITIES = (
    "scattering_length", "delta_0", "delta_1", "delta_2", "elastic", "momentum_transfer", "elastic_minimum",
    "momentum_transfer_minimum",
)  # fmt: skip
SOLVED = 3  # partial waves from the potential; the others are the tail's
AROUND_MINIMUM = np.array([0.85, 0.95, 1.05, 1.15])  # a parabola through these gives the minimum


@dataclass(frozen=True, slots=True)
class ScatteringDatum:
    """One published number of electron-gas scattering.

    ``quantity`` of QUANTITIES at ``energy_eV`` [eV] (0 for the scattering length); ``value`` and ``error`` [``unit``:
    bohr, rad or angstrom^2]; ``energy_error_eV`` [eV] of a minimum, else None. ``grade`` high, medium, low; ``mark``
    READ or FROM MEMORY; ``use`` "fit" or "check".
    """

    gas: str
    quantity: str
    energy_eV: float
    value: float
    unit: str
    error: float
    energy_error_eV: float | None
    grade: str
    mark: str
    source: str
    use: str


def scattering_data(symbol: str) -> tuple[ScatteringDatum, ...]:
    """Return the published numbers of a gas. Raises UnknownNameError for a name, DataFileError for a spoilt table."""
    gas = noble_gas_symbol(symbol).removeprefix("3")
    return tuple(row for row in _all() if row.gas == gas)


def predicted(gas: Scatterer, data: Sequence[ScatteringDatum]) -> tuple[Array, Array]:
    """What a potential gives for published numbers.

    Parameters
    ----------
    gas : Scatterer
        Potential [atomic units].
    data : sequence of ScatteringDatum
        n numbers.

    Returns
    -------
    value, energy : ndarray, shape (n,)
        In the unit of each datum [bohr, rad, angstrom^2] and at what energy [eV]; only a minimum has its own energy.
        s phases are taken between 0.8 - pi and 0.8, the branch that reaches zero at zero energy.
    """
    groups = [one.energy_eV * (AROUND_MINIMUM if one.quantity.endswith("_minimum") else np.ones(1)) for one in data]
    ends = np.cumsum([len(group) for group in groups])
    E = np.maximum(np.concatenate(groups), 1e-6) / constants.HARTREE_EV  # the scattering length sits at 0
    curves = dict(zip(("elastic", "momentum_transfer"), cross_sections(gas, E, SOLVED), strict=True))
    curves = {key: sigma * constants.BOHR2_ANGSTROM2 for key, sigma in curves.items()}
    curves |= {f"delta_{l}": phase_shifts(gas, E, l) for l in range(SOLVED)}
    curves["delta_0"] = np.where(curves["delta_0"] > 0.8, curves["delta_0"] - np.pi, curves["delta_0"])
    value, energy = np.empty(len(data)), np.array([one.energy_eV for one in data])
    for i, (one, end, group) in enumerate(zip(data, ends, groups, strict=True)):
        if one.quantity == "scattering_length":
            value[i] = scattering_length(gas)
            continue
        found = curves[one.quantity.removesuffix("_minimum")][end - len(group) : end]
        value[i] = found[0]
        if len(group) > 1:
            c = np.polyfit(AROUND_MINIMUM, found, 2)
            at = float(np.clip(-0.5 * c[1] / c[0], 0.5, 2.0))
            value[i], energy[i] = np.polyval(c, np.clip(at, 0.8, 1.2)), at * one.energy_eV
    return value, energy


@cache
def _all() -> tuple[ScatteringDatum, ...]:
    table = "phase_shifts.csv"
    found = shipped_rows("one_electron", table, _datum)
    bad = [f"{one.gas} {one.quantity}" for one in found if one.quantity not in QUANTITIES or one.gas not in GASES]
    if bad:
        raise DataFileError(
            "phase_shifts.csv", [f"{name}: unknown gas or quantity; reinstall pertcalc" for name in bad]
        )
    return found


def _datum(row: dict[str, str]) -> ScatteringDatum:
    numbers = {key: float(row[key]) for key in ("energy_eV", "value", "error")}
    words = {key: row[key] for key in ("gas", "quantity", "unit", "grade", "mark", "source", "use")}
    spread = row["energy_error_eV"]
    return ScatteringDatum(**numbers, **words, energy_error_eV=float(spread) if spread else None)  # type: ignore[arg-type]
