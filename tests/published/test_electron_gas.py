"""The default electron-gas potentials against published scattering (phase_shifts.csv: each row names its source).

All rows FROM MEMORY; "fit" rows made the parameters, "check" rows did not.
"""

from __future__ import annotations

import numpy as np
import pytest

from pertcalc.one_electron.gas_electron import gas_electron
from pertcalc.one_electron.scattering_data import predicted, scattering_data
from pertcalc.species import GASES

ROWS = [(gas, one) for gas in GASES for one in scattering_data(gas)]


def name(pair):
    gas, one = pair
    return f"{gas}-{one.use}-{one.quantity}-{one.energy_eV:g}"


@pytest.mark.parametrize("pair", ROWS, ids=name)
def test_within_two_errors(pair):
    gas, one = pair
    value, energy = predicted(gas_electron(gas), [one])
    assert abs(value[0] - one.value) <= 2.0 * one.error
    if one.energy_error_eV is not None:
        assert abs(energy[0] - one.energy_eV) <= 2.0 * one.energy_error_eV


@pytest.mark.parametrize("gas", GASES)
def test_rows_are_complete(gas):
    for one in scattering_data(gas):
        assert one.mark == "FROM MEMORY"
        assert one.source
        assert one.error > 0
        assert one.use in ("fit", "check")


# Modified effective range expansions, constants in atomic units (FROM MEMORY, sources in the table):
# tan d0 = -Ak[1 + (4 alpha/3)k^2 ln k] - pi alpha k^2/3 + D k^3 + F k^4, tan d1 = pi alpha k^2/15 - A1 k^3.
EXPANSIONS = {"Ne": (2.672, 0.2135, 3.86, -2.656, 1.846), "Ar": (11.08, -1.459, 68.93, -97.0, 8.69)}


@pytest.mark.parametrize("gas", EXPANSIONS)
def test_low_energy_phases_of_the_table_are_those_of_the_expansion(gas):
    alpha, A, D, F, A1 = EXPANSIONS[gas]
    rows = [one for one in scattering_data(gas) if one.quantity in ("delta_0", "delta_1") and one.energy_eV <= 1]
    assert len(rows) >= 8
    for one in rows:
        k = np.sqrt(2 * one.energy_eV / 27.211386)
        s = -A * k * (1 + 4 * alpha / 3 * k * k * np.log(k)) - np.pi * alpha * k * k / 3 + D * k**3 + F * k**4
        p = np.pi * alpha * k * k / 15 - A1 * k**3
        assert one.value == pytest.approx(np.arctan(s if one.quantity == "delta_0" else p), abs=6e-5)
