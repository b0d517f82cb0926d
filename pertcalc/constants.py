"""Physical constants and the conversions at the border of the atomic-unit core (CODATA as shipped by scipy).

Every name says ``FROM_TO``: multiply a number in FROM by it to get a number in TO.
"""

from __future__ import annotations

import math

from scipy import constants as _codata

_value = _codata.physical_constants

BOHR_ANGSTROM = _value["Bohr radius"][0] * 1e10
BOHR_CM = _value["Bohr radius"][0] * 1e2
HARTREE_CM1 = _value["hartree-inverse meter relationship"][0] / 100
HARTREE_EV = _value["Hartree energy in eV"][0]
AMU_AU = _value["atomic mass constant"][0] / _value["electron mass"][0]
KELVIN_HARTREE = _value["kelvin-hartree relationship"][0]
AU_TIME_S = _value["atomic unit of time"][0]
AU_VELOCITY_CM_S = _value["atomic unit of velocity"][0] * 1e2
BOHR2_ANGSTROM2 = BOHR_ANGSTROM**2
# A rate coefficient in bohr^3 per atomic unit of time, as cm^3/s.
AU_RATE_CM3_S = BOHR_CM**3 / AU_TIME_S
AMAGAT_CM3 = _value["Loschmidt constant (273.15 K, 101.325 kPa)"][0] * 1e-6
TORR_PA = _codata.torr
BOLTZMANN_J_K = _codata.k
HBAR_J_S = _codata.hbar
BOHR_MAGNETON_J_T = _value["Bohr magneton"][0]
MHZ_RAD_S = 2 * math.pi * 1e6
