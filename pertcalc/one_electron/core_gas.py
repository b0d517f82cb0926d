"""Interaction of the alkali ion with a noble-gas atom; inside: atomic units.

Born-Mayer wall, damped dispersion of the core and -alpha_d/(2R^4) with the cut-off of the electron's polarisation
term. The wells are ``pertcalc/data/one_electron/ion_gas.csv``; notes/core-gas.md has the equations.
"""

from __future__ import annotations

import csv
import math
from dataclasses import dataclass
from functools import cache
from importlib.resources import files

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.optimize import brentq
from scipy.special import gammainc

from pertcalc import constants
from pertcalc.errors import DataFileError, InputError, OutOfRangeError
from pertcalc.one_electron.gas_electron import GasElectron, gas_electron
from pertcalc.species import COMPUTED, Sourced, alkali, alkali_symbol, noble_gas, noble_gas_symbol

Array = NDArray[np.float64]

WALL_TOP = 1.0  # [hartree]; nothing is claimed of the wall above it
ISOELECTRONIC = {"Li": "He", "Na": "Ne", "K": "Ar", "Rb": "Kr", "Cs": "Xe"}
C6_ERROR = 0.15  # judged: Slater-Kirkwood against literature values of closed shells


@dataclass(frozen=True, slots=True)
class IonWell:
    """Well of alkali ion and gas: ``De`` [eV], ``Re`` [angstrom], each with source and error; ``grade`` of the memory."""

    De: Sourced
    Re: Sourced
    grade: str


@dataclass(frozen=True, slots=True)
class CoreGas:
    """``V(R) = A exp(-b R) - alpha_d damping(R)/(2R^4) - f_6(bR) C6/R^6``, called with R [bohr], answers V [hartree].

    ``A`` [hartree], ``b`` [bohr^-1], ``C6`` [hartree bohr^6]; ``electron`` gives alpha_d and the damping, so that core,
    electron and cross term share one cut-off. ``well`` what A and b were made from, None when they were given.
    ``r_min`` [bohr] closest distance allowed: V reaches 1 hartree there. ``provenance`` in words.
    """

    alkali: str
    gas: str
    A: float
    b: float
    C6: Sourced
    electron: GasElectron
    well: IonWell | None
    r_min: float
    provenance: str

    def __call__(self, R: ArrayLike) -> Array:
        """V [hartree], shape of R [bohr]; OutOfRangeError for R below ``r_min`` or not finite."""
        R = np.asarray(R, dtype=np.float64)
        outside = ~(R >= self.r_min) | ~np.isfinite(R)
        if np.any(outside):
            raise OutOfRangeError(
                f"R of {self.alkali}+ {self.gas}", float(np.ravel(R)[np.ravel(outside)][0]), self.r_min, math.inf, "bohr",
                "The gas would sit inside the alkali core, where this form says nothing; use larger R.",
            )  # fmt: skip
        return _value(R, self.A, self.b, self.C6.value, self.electron)

    @property
    def relative_errors(self) -> dict[str, float]:
        """Judged relative errors [1] of the well, {"De", "Re", "C6"}; De and Re missing when the user gave A and b."""
        found = {"C6": (self.C6.error or 0.0) / self.C6.value} if self.C6.value else {}
        if self.well is not None:
            found |= {key: (x.error or 0.0) / x.value for key, x in (("De", self.well.De), ("Re", self.well.Re))}
        return found


def core_gas(alkali_name: str, gas_name: str, electron: GasElectron | None = None) -> CoreGas:
    """Return the ion-gas interaction of a pair.

    ``electron``: electron-gas potential whose alpha_d and damping it shares; None = the default model.
    Raises UnknownNameError for a name, DataFileError for a spoilt data file.
    """
    a, g = alkali_symbol(alkali_name), noble_gas_symbol(gas_name).removeprefix("3")
    return core_gas_from_well(a, g, _wells()[a, g], core_dispersion(a, g), electron or gas_electron(g))


def core_gas_from_well(a: str, g: str, well: IonWell, C6: Sourced, electron: GasElectron) -> CoreGas:
    """The ion-gas interaction whose minimum is ``well``; for an ion or gas of your own.

    Parameters
    ----------
    a, g : str
        Labels of alkali and gas.
    well : IonWell
        De [eV] and Re [angstrom].
    C6 : Sourced
        Dispersion coefficient of the core [au].
    electron : GasElectron
        Gives alpha_d and damping.

    Returns
    -------
    CoreGas
        Its minimum is (De, Re) to rounding.

    Raises
    ------
    InputError
        De, Re or C6 not finite or not > 0; or no Born-Mayer wall has this minimum.
    """
    given = {"De": (well.De.value, "eV"), "Re": (well.Re.value, "angstrom"), "C6": (C6.value, "au")}
    problems = [
        f"{key} = {x:g} {unit} of {a}+ {g} must be finite and > 0. Give a depth and distance of a well."
        for key, (x, unit) in given.items()
        if not (math.isfinite(x) and x > 0)
    ]
    if problems:
        raise InputError(problems)
    De, Re = well.De.value / constants.HARTREE_EV, well.Re.value / constants.BOHR_ANGSTROM
    A, b = _born_mayer(De, Re, C6.value, electron, f"{a}+ {g}")
    r_min = _closest(Re, A, b, C6.value, electron)
    words = (
        f"Born-Mayer wall through the {a}+ {g} well De = {well.De.value:g} eV, Re = {well.Re.value:g} angstrom "
        f"({well.De.mark}, grade {well.grade}: {well.De.source}); C4 = alpha_d/2; C6 = {C6.value:.4g} au ({C6.mark})"
    )
    return CoreGas(a, g, A, b, C6, electron, well, r_min, words)


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


def _attraction(R: ArrayLike, b: float, C6: float, electron: GasElectron) -> Array:
    R = np.asarray(R, dtype=np.float64)
    return np.asarray(0.5 * electron.alpha_d * electron.damping(R) / R**4 + gammainc(7, b * R) * C6 / R**6)


def _value(R: Array, A: float, b: float, C6: float, electron: GasElectron) -> Array:
    return np.asarray(A * np.exp(-b * R) - _attraction(R, b, C6, electron))


def _slope_of_attraction(R: float, b: float, C6: float, electron: GasElectron) -> float:
    """d(attraction)/dR, the damping functions differentiated in closed form."""
    x6 = (R / electron.cutoff) ** 6
    charge = 0.5 * electron.alpha_d / R**5 * (6.0 * x6 * math.exp(-x6) - 4.0 * float(electron.damping(R)))
    f6 = float(gammainc(7, b * R))
    return charge + C6 / R**7 * (math.exp(-b * R) * (b * R) ** 7 / 720.0 - 6.0 * f6)


def _born_mayer(De: float, Re: float, C6: float, electron: GasElectron, pair: str) -> tuple[float, float]:
    """The softest wall with V(Re) = -De, V'(Re) = 0: ``A exp(-b Re) = attraction - De`` and b from the slope."""

    def condition(b: float) -> float:
        excess = float(_attraction(Re, b, C6, electron)) - De
        return -b * excess - _slope_of_attraction(Re, b, C6, electron)

    grid = np.linspace(1.0, 40.0, 800) / Re
    values = [condition(b) for b in grid]
    for low, high, first, second in zip(grid[:-1], grid[1:], values[:-1], values[1:], strict=True):
        if first > 0 >= second:
            b = float(brentq(condition, low, high, xtol=1e-15, rtol=1e-14))
            excess = float(_attraction(Re, b, C6, electron)) - De
            if excess > 0:
                return excess * math.exp(b * Re), b
    raise InputError(
        f"{pair}: no Born-Mayer wall has a well De = {De * constants.HARTREE_EV:.4g} eV at Re = "
        f"{Re * constants.BOHR_ANGSTROM:.4g} angstrom with alpha_d = {electron.alpha_d:g} and C6 = {C6:.4g} au: their "
        f"attraction there is {float(_attraction(Re, 3.0, C6, electron)) * constants.HARTREE_EV:.4g} eV. Check the units."
    )


def _closest(Re: float, A: float, b: float, C6: float, electron: GasElectron) -> float:
    """Distance [bohr] inside the well where V reaches WALL_TOP; where V peaks, if it turns over before."""
    R = np.linspace(Re, 0.2 * Re, 2000)
    V = _value(R, A, b, C6, electron)
    peak = int(np.argmax(V))
    above = np.nonzero(V[: peak + 1] >= WALL_TOP)[0]
    if len(above) == 0:
        return float(R[peak])
    i = int(above[0])
    return float(brentq(lambda r: float(_value(np.asarray(r), A, b, C6, electron)) - WALL_TOP, R[i], R[i - 1]))


@cache
def _wells() -> dict[tuple[str, str], IonWell]:
    path = files("pertcalc") / "data" / "one_electron" / "ion_gas.csv"
    try:
        lines = path.read_text(encoding="utf-8").splitlines()
        rows = csv.DictReader(line for line in lines if not line.startswith("#"))
        return {(row["alkali"], row["gas"]): _ion_well(row) for row in rows}
    except (OSError, KeyError, TypeError, ValueError) as problem:
        raise DataFileError(path, f"{problem!r}; reinstall pertcalc") from problem


def _ion_well(row: dict[str, str]) -> IonWell:
    De, Re = float(row["De_eV"]), float(row["Re_angstrom"])
    return IonWell(
        Sourced(De, "eV", row["source"], row["mark"], De * float(row["De_error"])),
        Sourced(Re, "angstrom", row["source"], row["mark"], Re * float(row["Re_error"])),
        row["grade"],
    )
