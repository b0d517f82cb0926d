"""Interaction of the alkali ion with a noble-gas atom; inside: atomic units.

Born-Mayer wall, damped dispersion of the core, and the gas polarised by the core's charge, damped as the polarisation
by the electron is. Wells: ``pertcalc/data/one_electron/ion_gas.csv``; notes/core-gas.md has the equations.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from functools import cache

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.optimize import brentq
from scipy.special import gammainc

from pertcalc import constants
from pertcalc.errors import InputError, OutOfRangeError
from pertcalc.one_electron.gas_electron import GasElectron, gas_electron
from pertcalc.shipped import shipped_rows
from pertcalc.species import COMPUTED, Sourced, alkali, alkali_symbol, noble_gas, noble_gas_symbol

Array = NDArray[np.float64]

WALL_TOP = 1.0  # [hartree]; nothing is claimed of the wall above it
ISOELECTRONIC = {"Li": "He", "Na": "Ne", "K": "Ar", "Rb": "Kr", "Cs": "Xe"}
WALL_FACTOR = 0.93
# Second ionisation energies [eV]: those of the ions. Common tables of atomic data, FROM MEMORY.
SECOND_IONISATION_EV = {"Li": 75.640, "Na": 47.286, "K": 31.625, "Rb": 27.290, "Cs": 23.157}
C6_ERROR = 0.15  # judged: Slater-Kirkwood against literature values of closed shells


@dataclass(frozen=True, slots=True)
class IonWell:
    """Well of alkali ion and gas: ``De`` [eV] and ``Re`` [angstrom] with source and error; ``grade`` of the memory."""

    De: Sourced
    Re: Sourced
    grade: str


@dataclass(frozen=True, slots=True)
class CoreGas:
    """V(R) [hartree] of alkali ion and gas, called with R [bohr].

    ``V = A exp(-b R) - alpha_d D(R)/(2R^4) - alpha_q D(R)^2/(2R^6) - f_6(bR) C6/R^6 - f_8(bR) C8/R^8``

    ``A`` [hartree], ``b`` [bohr^-1], ``C6`` [hartree bohr^6] dispersion of the core, ``C8`` [hartree bohr^8] what the
    well needs beyond the rest; ``electron`` gives alpha_d, alpha_q and D, so that core, electron and cross term share
    one cut-off. ``well`` what A and C8 were made from. ``r_min`` [bohr] closest distance allowed: V reaches 1 hartree
    there. ``provenance`` in words.
    """

    alkali: str
    gas: str
    A: float
    b: float
    C6: Sourced
    C8: float
    electron: GasElectron
    well: IonWell
    r_min: float
    provenance: str

    def __call__(self, R: ArrayLike) -> Array:
        """V [hartree], shape of R [bohr]; OutOfRangeError for R below ``r_min`` or not finite."""
        R = np.asarray(R, dtype=np.float64)
        outside = ~(R >= self.r_min) | ~np.isfinite(R)
        if np.any(outside):
            first = float(np.ravel(R)[np.ravel(outside)][0])
            step = "Closer in the gas atom is inside the alkali core, where this form says nothing; use larger R."
            raise OutOfRangeError(f"R of {self.alkali}+ {self.gas}", first, self.r_min, math.inf, "bohr", step)
        wall, fixed, eight = _terms(R, self.b, self.C6.value, self.electron)
        return np.asarray(self.A * wall + fixed + self.C8 * eight)

    @property
    def relative_errors(self) -> dict[str, float]:
        """Judged relative errors [1], {"De", "Re", "C6"}; only those that are known."""
        known = {"De": self.well.De, "Re": self.well.Re, "C6": self.C6}
        return {key: x.error / x.value for key, x in known.items() if x.error is not None}


def core_gas(alkali_name: str, gas_name: str, electron: GasElectron | None = None) -> CoreGas:
    """Return the ion-gas interaction of a pair.

    ``electron``: electron-gas potential whose alpha_d and damping it shares; None = the default model.
    Raises UnknownNameError for a name, DataFileError for a spoilt data file.
    """
    a, g = alkali_symbol(alkali_name), noble_gas_symbol(gas_name).removeprefix("3")
    return core_gas_from_well(
        a, g, _wells()[a, g], core_dispersion(a, g), wall_exponent(a, g), electron or gas_electron(g)
    )


def core_gas_from_well(a: str, g: str, well: IonWell, C6: Sourced, b: float, electron: GasElectron) -> CoreGas:
    """The ion-gas interaction whose minimum is ``well``; for an ion or gas of your own.

    Parameters
    ----------
    a, g : str
        Labels of alkali and gas.
    well : IonWell
        De [eV] and Re [angstrom].
    C6 : Sourced
        Dispersion coefficient of the core [au].
    b : float
        Exponent of the Born-Mayer wall [bohr^-1]; ``wall_exponent`` estimates it.
    electron : GasElectron
        Gives alpha_d, alpha_q and damping.

    Returns
    -------
    CoreGas
        Its minimum is (De, Re) to rounding.

    Raises
    ------
    InputError
        De, Re, C6 or b not finite or not > 0; or the well is far from what the polarisability allows.
    """
    given = {
        "De": (well.De.value, "eV"),
        "Re": (well.Re.value, "angstrom"),
        "C6": (C6.value, "au"),
        "b": (b, "bohr^-1"),
    }
    problems = [
        f"{key} = {x:g} {unit} of {a}+ {g} must be finite and > 0. Give a depth and distance of a well."
        for key, (x, unit) in given.items()
        if not (math.isfinite(x) and x > 0)
    ]
    if problems:
        raise InputError(problems)
    De, Re = well.De.value / constants.HARTREE_EV, well.Re.value / constants.BOHR_ANGSTROM
    A, C8 = _solve_well(De, Re, b, C6.value, electron, f"{a}+ {g}")

    def energy(R: Array) -> Array:
        wall, fixed, eight = _terms(R, b, C6.value, electron)
        return np.asarray(A * wall + fixed + C8 * eight)

    words = (
        f"{a}+ {g}: well De = {well.De.value:g} eV at Re = {well.Re.value:g} angstrom ({well.De.mark}, grade "
        f"{well.grade}: {well.De.source}); wall exponent {b:.3g} per bohr from ionisation energies; C6 = "
        f"{C6.value:.4g} au ({C6.mark})"
    )
    return CoreGas(a, g, A, b, C6, C8, electron, well, _closest(Re, energy), words)


def core_dispersion(alkali_name: str, gas_name: str) -> Sourced:
    """C6 [au] of alkali ion and gas by the Slater-Kirkwood formula.

    ``C6 = 3/2 alpha_c alpha_g / (sqrt(alpha_c/N_c) + sqrt(alpha_g/N_g))``; N of a gas from its homonuclear C6, N of the
    ion that of the gas with as many electrons. Raises UnknownNameError. Source: J. C. Slater and J. G. Kirkwood,
    Phys. Rev. 37, 682 (1931) (FROM MEMORY).
    """
    a, g = alkali_symbol(alkali_name), noble_gas_symbol(gas_name)
    core, gas = alkali(a).core_polarizability_au.value, noble_gas(g).polarizability_au.value
    slow = math.sqrt(core / _effective_electrons(ISOELECTRONIC[a])) + math.sqrt(gas / _effective_electrons(g))
    value = 1.5 * core * gas / slow
    return Sourced(
        value, "au", "Slater-Kirkwood, effective electron numbers from homonuclear C6", COMPUTED, C6_ERROR * value
    )


def _effective_electrons(gas: str) -> float:
    record = noble_gas(gas)
    return (4.0 * record.C6_homonuclear_au.value / (3.0 * record.polarizability_au.value**1.5)) ** 2


def wall_exponent(alkali_name: str, gas_name: str) -> float:
    """Born-Mayer exponent b [bohr^-1] of alkali ion and gas from their ionisation energies.

    ``1/b = (1/b_ion + 1/b_gas)/2, b_i = 0.93 * 2 sqrt(2 I_i)``: the overlap of two outer shells, each density
    falling as exp(-2 sqrt(2I) r); 0.93 is the mean for the homonuclear gas pairs (notes/core-gas.md).
    Raises UnknownNameError.
    """
    ion, gas = SECOND_IONISATION_EV[alkali_symbol(alkali_name)], noble_gas(gas_name).ionisation_eV.value
    b = [WALL_FACTOR * 2.0 * math.sqrt(2.0 * I / constants.HARTREE_EV) for I in (ion, gas)]
    return 2.0 * b[0] * b[1] / (b[0] + b[1])


def _terms(R: ArrayLike, b: float, C6: float, electron: GasElectron) -> tuple[Array, Array, Array]:
    """exp(-bR), the polarisation and C6 energy, -f_8(bR)/R^8, shape of R each; f_n(x) = P(n + 1, x)."""
    R = np.asarray(R, dtype=np.float64)
    fixed = electron.polarisation(R, electron.alpha_q) - gammainc(7, b * R) * C6 / R**6
    return np.exp(-b * R), fixed, np.asarray(-gammainc(9, b * R) / R**8)


def _slopes(R: float, b: float, C6: float, electron: GasElectron) -> tuple[float, float, float]:
    """d/dR of ``_terms``; d f_n(bR)/dR = b exp(-bR) (bR)^n/n!."""
    x, wall, D = b * R, math.exp(-b * R), float(electron.damping(R))
    dD = 6.0 / R * (R / electron.cutoff) ** 6 * (1.0 - D)
    charge = electron.alpha_d / R**4 * (2.0 * D / R - 0.5 * dD) + electron.alpha_q * D / R**6 * (3.0 * D / R - dD)
    f6, f8 = float(gammainc(7, x)), float(gammainc(9, x))
    six = (6.0 * f6 / R - b * wall * x**6 / math.factorial(6)) / R**6
    eight = (8.0 * f8 / R - b * wall * x**8 / math.factorial(8)) / R**8
    return -b * wall, charge + C6 * six, eight


def _solve_well(De: float, Re: float, b: float, C6: float, electron: GasElectron, pair: str) -> tuple[float, float]:
    """A and C8 with V(Re) = -De and V'(Re) = 0: two linear equations."""
    wall, fixed, eight = (float(x) for x in _terms(Re, b, C6, electron))
    d_wall, d_fixed, d_eight = _slopes(Re, b, C6, electron)
    A, C8 = np.linalg.solve([[wall, eight], [d_wall, d_eight]], [-De - fixed, -d_fixed])
    share = float(-C8 * eight / De)
    if A <= 0 or abs(share) > 1.0:
        raise InputError(
            f"{pair}: a well De = {De * constants.HARTREE_EV:.4g} eV at Re = {Re * constants.BOHR_ANGSTROM:.4g} "
            f"angstrom does not fit alpha_d = {electron.alpha_d:g} bohr^3, C6 = {C6:.4g} au and a wall "
            f"exp(-{b:.3g} R): the rest left to C8 would be {share:.2g} De. Check De, Re and their units."
        )
    return float(A), float(C8)


def _closest(Re: float, energy: Callable[[Array], Array]) -> float:
    """Distance [bohr] inside the well where V reaches WALL_TOP; where V peaks, if it turns over before."""
    R = np.linspace(Re, 0.2 * Re, 2000)
    V = energy(R)
    peak = int(np.argmax(V))
    above = np.nonzero(V[: peak + 1] >= WALL_TOP)[0]
    if len(above) == 0:
        return float(R[peak])
    i = int(above[0])
    return float(brentq(lambda r: float(energy(np.asarray(r))) - WALL_TOP, R[i], R[i - 1]))


@cache
def _wells() -> dict[tuple[str, str], IonWell]:
    return dict(shipped_rows("one_electron", "ion_gas.csv", lambda row: ((row["alkali"], row["gas"]), _ion_well(row))))


def _ion_well(row: dict[str, str]) -> IonWell:
    De, Re = float(row["De_eV"]), float(row["Re_angstrom"])
    return IonWell(
        Sourced(De, "eV", row["source"], row["mark"], De * float(row["De_error"])),
        Sourced(Re, "angstrom", row["source"], row["mark"], Re * float(row["Re_error"])),
        row["grade"],
    )
