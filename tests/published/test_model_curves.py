"""The one-electron model beside wells and satellites of other authors; nothing in it is fitted to a neutral pair.

Allowed everywhere: twice the quadrature sum of the published error and the error the curve file itself states, so a
test fails when the stated error is too small. FROM MEMORY wells count with 10 % in De and 2 % in Re of their own.
"""

from __future__ import annotations

from functools import cache

import numpy as np
import pytest
from scipy.optimize import minimize_scalar

from pertcalc.constants import BOHR_ANGSTROM, HARTREE_CM1
from pertcalc.curves import fine_structure
from pertcalc.one_electron.curve_file import curve_set, uncertainty
from pertcalc.one_electron.model_curves import ModelCurves, compute_model
from pertcalc.one_electron.pair import Basis

LAPATOVICH = "Lapatovich et al., J. Chem. Phys. 73, 5419 (1980), abstract READ at ouci.dntb.gov.ua/en/works/9JBqBgq9"
SCHWARZHANS = "Schwarzhans and Zimmermann, Verhandl. DPG 1997 Mainz MO 7.1, READ at dpg-verhandlungen.de"
ZIMMERMANN = "Zimmermann et al., Verhandl. DPG 1999 Heidelberg A 15.4, READ: mean of A1/2 and A3/2"
LIN = "Lin, PhD thesis, U. New Hampshire 1987, abstract READ at scholars.unh.edu/dissertation/1510; half of Na G_2"
BRUEHL = "Bruehl and Zimmermann, J. Chem. Phys. 114, 3035 (2001), FROM MEMORY"
BOKELMANN = "Bokelmann and Zimmermann, J. Chem. Phys. 104, 923 (1996), FROM MEMORY"
ZANGER = "Zanger, Schmatloch and Zimmermann, J. Chem. Phys. 88, 5396 (1988), FROM MEMORY"
MEDVEDEV = "Medvedev et al., PCCP 20, 25974 (2018); Goll et al. (2006), FROM MEMORY, low confidence"
# alkali, gas, state, De and error [cm^-1], Re and error [angstrom] (None: not stated), source.
WELLS = [
    ("Na", "Ne", "X", 8.1, 0.9, 5.29, 0.05, LAPATOVICH),
    ("Na", "Ne", "A", 145.0, 5.0, 2.70, 0.05, LAPATOVICH),
    ("Na", "Ne", "B", 3.0, 0.5, 7.62, 0.16, LAPATOVICH),
    ("Na", "Ar", "X", 41.9, 0.5, 5.01, 0.02, SCHWARZHANS),
    ("Na", "Ar", "A", 582.0, 3.0, 2.935, 0.01, ZIMMERMANN),
    ("Na", "He", "A", 410.0, 55.0, None, None, LIN),
    ("Na", "Kr", "A", 678.0, 90.0, None, None, LIN),
    ("Li", "Ar", "X", 42.5, 4.25, 4.89, 0.10, BRUEHL),
    ("K", "Ar", "X", 42.0, 4.2, 5.40, 0.11, BOKELMANN),
    ("K", "Ar", "A", 394.0, 39.4, 3.43, 0.07, BOKELMANN),
    ("Na", "Kr", "X", 68.5, 6.85, 4.92, 0.10, ZANGER),
    ("Cs", "Ar", "X", 38.0, 3.8, 5.80, 0.12, MEDVEDEV),
]
# Far side of the blue satellite of D2 from the line centre [cm^-1].
SATELLITES = [("Cs", "Ar", 216.0, "8367 A, READ"), ("Cs", "He", 388.0, "about 825 nm, READ")]
# The extremum of the difference curve and the maximum of a satellite in a hot vapour differ by tens of cm^-1, and the B
# wall of the model is judged good to 20 %.
SATELLITE_TOLERANCE = 0.30


@cache
def model(alkali: str, gas: str) -> ModelCurves:
    return compute_model(alkali, gas, basis=Basis(n_states=20, l_max=5, nodes=48))


@pytest.mark.parametrize("alkali, gas, state, De, De_error, Re, Re_error, source", WELLS)
def test_wells(alkali, gas, state, De, De_error, Re, Re_error, source):
    found, stated = model(alkali, gas), uncertainty(model(alkali, gas), state)
    well = found.well(state)
    assert well is not None
    depth, position = well.depth * HARTREE_CM1, well.position * BOHR_ANGSTROM
    assert abs(depth - De) < 2 * np.hypot(De_error, stated["De"] * depth), source
    if Re is not None:
        assert abs(position - Re) < 2 * np.hypot(Re_error, stated["Re"] * position), source


def test_the_ground_well_of_sodium_with_argon():
    # SCHWARZHANS: 41.9(5) cm^-1 at 5.01(2) angstrom, the best known ground well of all pairs. Electron scattering,
    # term energies and the ion-gas well give it within 5 % and 0.5 %; closer than the error stated for X in general.
    well = model("Na", "Ar").well("X")
    assert well is not None
    assert well.depth * HARTREE_CM1 == pytest.approx(41.9, rel=0.05)
    assert well.position * BOHR_ANGSTROM == pytest.approx(5.01, rel=0.01)


@pytest.mark.parametrize("alkali, gas, distance, source", SATELLITES)
def test_blue_satellites_of_caesium_D2(alkali, gas, distance, source):
    curves = curve_set(model(alkali, gas))
    splitting = fine_structure.splitting_of(curves)

    def negative(R: float) -> float:
        lines = fine_structure.line_differences(curves.X, curves.A, curves.B, R, splitting)
        return -float(lines.d2_half) * HARTREE_CM1

    best = minimize_scalar(negative, bounds=(6.0, 12.0), method="bounded")
    assert -best.fun == pytest.approx(distance, rel=SATELLITE_TOLERANCE), source
