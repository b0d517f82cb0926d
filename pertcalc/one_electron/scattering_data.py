"""Published scattering of slow electrons by noble gases, set beside what a potential gives; atomic units inside.

The table is ``pertcalc/data/one_electron/phase_shifts.csv``; notes/electron-gas.md says what is doubtful in it.
"""

from __future__ import annotations

import csv
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cache
from importlib.resources import files

import numpy as np
from numpy.typing import NDArray

from pertcalc import constants
from pertcalc.errors import DataFileError
from pertcalc.one_electron.scattering import Scatterer, cross_sections, phase_shifts, scattering_length
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
    value, energy = np.empty(len(data)), np.array([one.energy_eV for one in data])
    for i, one in enumerate(data):
        if one.quantity == "scattering_length":
            value[i] = scattering_length(gas)
        elif one.quantity.startswith("delta_"):
            value[i] = _phase(gas, one.energy_eV, int(one.quantity[-1]))
        elif one.quantity.endswith("_minimum"):
            E = one.energy_eV * AROUND_MINIMUM
            c = np.polyfit(AROUND_MINIMUM, _cross_section(gas, E, one.quantity.removesuffix("_minimum")), 2)
            at = float(np.clip(-0.5 * c[1] / c[0], 0.5, 2.0))
            value[i], energy[i] = np.polyval(c, np.clip(at, 0.8, 1.2)), at * one.energy_eV
        else:
            value[i] = _cross_section(gas, np.array([one.energy_eV]), one.quantity)[0]
    return value, energy


def _phase(gas: Scatterer, energy_eV: float, l: int) -> float:
    """Phase on the branch that is continuous down to zero energy; repulsive s waves go below -pi/2."""
    delta = float(phase_shifts(gas, energy_eV / constants.HARTREE_EV, l))
    return delta - np.pi if l == 0 and delta > 0.8 else delta


def _cross_section(gas: Scatterer, energy_eV: Array, which: str) -> Array:
    elastic, transfer = cross_sections(gas, energy_eV / constants.HARTREE_EV, SOLVED)
    return (elastic if which == "elastic" else transfer) * constants.BOHR2_ANGSTROM2


@cache
def _all() -> tuple[ScatteringDatum, ...]:
    path = files("pertcalc") / "data" / "one_electron" / "phase_shifts.csv"
    try:
        lines = path.read_text(encoding="utf-8").splitlines()
        rows = csv.DictReader(line for line in lines if not line.startswith("#"))
        found = tuple(_datum(row) for row in rows)
    except (OSError, KeyError, TypeError, ValueError) as problem:
        raise DataFileError(path, f"{problem!r}; reinstall pertcalc") from problem
    bad = [f"{one.gas} {one.quantity}" for one in found if one.quantity not in QUANTITIES or one.gas not in GASES]
    if bad:
        raise DataFileError(path, [f"{name}: unknown gas or quantity; reinstall pertcalc" for name in bad])
    return found


def _datum(row: dict[str, str]) -> ScatteringDatum:
    numbers = {key: float(row[key]) for key in ("energy_eV", "value", "error")}
    words = {key: row[key] for key in ("gas", "quantity", "unit", "grade", "mark", "source", "use")}
    spread = row["energy_error_eV"]
    return ScatteringDatum(**numbers, **words, energy_error_eV=float(spread) if spread else None)  # type: ignore[arg-type]
