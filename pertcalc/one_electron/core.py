"""The alkali core as seen by the valence electron: an l-dependent potential with core polarisation.

``V_l(r) = -1/r - a_c/(2 r^4) [1 - exp(-(r/r_c)^6)] + A_l exp(-b_l r^2)``, A_l = 0 for l above the fitted ones. The
lowest state of each l is the lowest valence state: closed shells are replaced by the repulsion. The shipped potentials
(data/one_electron/core_potentials.toml, made by notes/scripts/make_core_potentials.py) come from core_fit.py.
"""

from __future__ import annotations

import tomllib
from dataclasses import dataclass
from functools import cache
from importlib.resources import files

import numpy as np
from numpy.typing import NDArray

from pertcalc.errors import DataFileError
from pertcalc.species import alkali_symbol

Array = NDArray[np.float64]

LETTERS = "spdfghiklmno"


@dataclass(frozen=True, slots=True)
class CorePotential:
    """Potential of an alkali core for one valence electron.

    ``symbol``; ``core_polarizability`` a_c [bohr^3]; ``cutoff`` r_c [bohr]; ``strengths`` A_l [hartree] and
    ``exponents`` b_l [bohr^-2] for l = 0, 1, ..., no short-range term beyond; ``lowest_n`` principal quantum number
    of the lowest valence state of each l, l + 1 beyond; ``core_quadrupole`` quadrupole polarisability of the core
    [bohr^5], None if unknown (only the dispersion coefficients use it); ``source`` and ``mark`` of the numbers.
    """

    symbol: str
    core_polarizability: float
    cutoff: float
    strengths: tuple[float, ...]
    exponents: tuple[float, ...]
    lowest_n: tuple[int, ...]
    core_quadrupole: float | None = None
    source: str = ""
    mark: str = ""

    def polarization(self, r: Array) -> Array:
        """Attraction ``-a_c/(2 r^4) [1 - exp(-(r/r_c)^6)]`` by the induced dipole of the core.

        Parameters
        ----------
        r : ndarray, shape (...)
            Distance of the electron from the core [bohr]; > 0.

        Returns
        -------
        potential : ndarray, shape (...)
            The attraction [hartree].
        """
        return -self.core_polarizability / (2 * r**4) * self.damping(r)

    def damping(self, r: Array) -> Array:
        """Cut-off ``1 - exp(-(r/r_c)^6)`` of the core polarisation, the same in the potential and in the dipole.

        Parameters
        ----------
        r : ndarray, shape (...)
            Distance of the electron from the core [bohr].

        Returns
        -------
        factor : ndarray, shape (...)
            0 at the core, 1 far away [1].
        """
        return -np.expm1(-((r / self.cutoff) ** 6))

    def __call__(self, l: int, r: Array) -> Array:
        """Potential V_l at distances r [bohr], shape (...); returns [hartree], same shape."""
        potential = -1 / r + self.polarization(r)
        if l < len(self.strengths):
            potential = potential + self.strengths[l] * np.exp(-self.exponents[l] * r**2)
        return potential

    def principal(self, l: int) -> int:
        """Principal quantum number of the lowest valence state of l."""
        return self.lowest_n[l] if l < len(self.lowest_n) else l + 1


HYDROGEN = CorePotential("H", 0.0, 1.0, (), (), (), 0.0, "bare Coulomb potential", "exact")


def core_potential(symbol: str) -> CorePotential:
    """Return the shipped potential of an alkali core; UnknownNameError for another symbol."""
    return _shipped()[alkali_symbol(symbol)]


@cache
def _shipped() -> dict[str, CorePotential]:
    path = files("pertcalc") / "data" / "one_electron" / "core_potentials.toml"
    try:
        data = tomllib.loads(path.read_text(encoding="utf-8"))
        return {
            symbol: CorePotential(
                symbol,
                float(entry["core_polarizability_au"]),
                float(entry["cutoff_bohr"]),
                tuple(map(float, entry["strength_hartree"])),
                tuple(map(float, entry["exponent_per_bohr2"])),
                tuple(map(int, entry["lowest_n"])),
                float(entry["core_quadrupole_au"]),
                entry["source"],
                entry["mark"],
            )
            for symbol, entry in data.items()
            if isinstance(entry, dict)
        }
    except (OSError, KeyError, TypeError, ValueError) as problem:
        raise DataFileError(path, f"{problem!r}; reinstall pertcalc") from problem
