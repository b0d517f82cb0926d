"""Absorption of the D lines by an unpolarised alkali vapour: Voigt profiles of all hyperfine components and isotopes.

Frequencies are detunings [GHz] from the centre of gravity of the sample's fine-structure line without collisions: its
own for one isotope, the mean of the isotopes weighted by abundance for the natural mixture. The impact profile holds to
some 100 GHz from the line; Dicke narrowing of the Doppler width is left out (collisions frequent enough to narrow it
broaden the line far more). Equations, limits and sources: notes/absorption-and-pumping.md.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy import constants as codata
from scipy.special import wofz

from pertcalc import constants
from pertcalc.angular import six_j
from pertcalc.errors import InputError, UnknownNameError
from pertcalc.species import COMPUTED, FROM_MEMORY, UPPER_LEVEL, Alkali, Isotope, Sourced
from pertcalc.vapour.hyperfine import f_values, isotope_energies
from pertcalc.vapour.level_rates import J_OF

Array = NDArray[np.float64]

NATURAL = "natural mixture"
GHZ_RAD_S = 1e3 * constants.MHZ_RAD_S
CM1_GHZ = codata.c * 1e-7
GAUSS_FWHM = 2 * math.sqrt(2 * math.log(2))  # full width of a Gaussian in standard deviations
# pi r_e c: area of the absorption cross section of one atom per unit oscillator strength [cm^2 GHz].
AREA_CM2_GHZ = math.pi * codata.physical_constants["classical electron radius"][0] * codata.c * 1e4 / 1e9
# A splitting this many times the width of one component is resolved, one that many times smaller unresolved.
CLEAR = 2.0
# Isotopes rarer than this do not decide whether a line is resolved.
_RARE = 0.01

# Line frequency of an isotope minus that of the first-named one of its element [MHz]: (D1, D2, error), all FROM MEMORY.
_REFERENCE_ISOTOPES = ("7Li", "23Na", "39K", "85Rb", "133Cs")
_ISOTOPE_SHIFTS = {
    "6Li": (-10534.0, -10534.0, 3.0, "Sansonetti et al., Phys. Rev. Lett. 107, 023001 (2011)"),
    "40K": (125.6, 126.0, 0.3, "Falke et al., Phys. Rev. A 74, 032503 (2006)"),
    "41K": (235.3, 236.2, 0.3, "Falke et al., Phys. Rev. A 74, 032503 (2006)"),
    "87Rb": (77.6, 78.1, 0.3, "Banerjee, Das & Natarajan, Europhys. Lett. 65, 172 (2004)"),
}


def isotope_shift(isotope: str, line: str) -> Sourced:
    """Frequency of "D1" or "D2" of an isotope minus that of 7Li, 39K or 85Rb [MHz]; UnknownNameError for others."""
    if line not in UPPER_LEVEL:
        raise UnknownNameError("line", str(line), tuple(UPPER_LEVEL))
    if isotope in _REFERENCE_ISOTOPES:
        return Sourced(0.0, "MHz", "by definition: shifts count from here", COMPUTED, 0.0)
    if isotope not in _ISOTOPE_SHIFTS:
        raise UnknownNameError("isotope", str(isotope), (*_REFERENCE_ISOTOPES, *_ISOTOPE_SHIFTS))
    d1, d2, error, source = _ISOTOPE_SHIFTS[isotope]
    return Sourced(d1 if line == "D1" else d2, "MHz", source, FROM_MEMORY, error)


@dataclass(frozen=True, slots=True)
class Component:
    """One hyperfine component of one isotope in the sample.

    ``F``, ``F_upper`` [hbar]; ``weight`` share of the whole area [1], all weights add to 1; ``offset_GHz`` from the
    centre of gravity of the sample [GHz]; ``doppler_GHz`` standard deviation of its Doppler profile [GHz].
    """

    isotope: str
    F: float
    F_upper: float
    weight: float
    offset_GHz: float
    doppler_GHz: float


@dataclass(frozen=True, slots=True)
class AbsorptionLine:
    """A D line of an unpolarised vapour at one temperature and gas density; made by :func:`absorption_line`.

    ``natural_fwhm_GHz`` [GHz]; ``fwhm_rad_s``, ``shift_rad_s`` collisional full width and shift (blue > 0) [rad/s] with
    absolute errors [rad/s], None = not estimated; ``area_cm2_GHz`` integral of the cross section [cm^2 GHz].
    """

    alkali: Alkali
    line: str
    sample: str
    temperature_K: float
    fwhm_rad_s: float
    shift_rad_s: float
    fwhm_error_rad_s: float | None
    shift_error_rad_s: float | None
    natural_fwhm_GHz: float
    area_cm2_GHz: float
    components: tuple[Component, ...]

    @property
    def lorentz_fwhm_GHz(self) -> float:
        """Natural plus collisional full width [GHz]."""
        return self.natural_fwhm_GHz + self.fwhm_rad_s / GHZ_RAD_S

    @property
    def shift_GHz(self) -> float:
        """Collisional shift [GHz], blue > 0."""
        return self.shift_rad_s / GHZ_RAD_S

    @property
    def doppler_fwhm_GHz(self) -> float:
        """Doppler full width [GHz] of the strongest component's isotope."""
        return GAUSS_FWHM * max(self.components, key=lambda one: one.weight).doppler_GHz

    @property
    def wavelength_cm(self) -> float:
        """Vacuum wavelength of the line [cm]."""
        return self.alkali.line_wavelength_nm(self.line) * 1e-7

    def profile(self, detuning_GHz: ArrayLike, gaussian_fwhm_GHz: float = 0.0) -> NDArray[np.complex128]:
        """Complex line profile of unit area: real part absorption, imaginary part dispersion.

        ``sum_i w_i w(z_i)/(s_i sqrt(2 pi)), z_i = (nu - nu_i - d + i gamma/2)/(s_i sqrt 2)``, w the Faddeeva function;
        far out ``1/pi (gamma/2)/nu^2`` and ``1/(pi nu)``.

        Parameters
        ----------
        detuning_GHz : array_like, shape (...)
            Frequency from the centre of gravity without collisions [GHz].
        gaussian_fwhm_GHz : float
            Full width of a Gaussian light spectrum to average over [GHz]; 0 for monochromatic light.

        Returns
        -------
        profile : array, shape (...)
            [1/GHz].

        Raises
        ------
        InputError
            A detuning is not finite, or the width is negative.
        """
        nu = np.asarray(detuning_GHz, dtype=float)[..., None]
        if not np.all(np.isfinite(nu)):
            raise InputError("detuning must be finite [GHz]; give another value.")
        if not (math.isfinite(gaussian_fwhm_GHz) and gaussian_fwhm_GHz >= 0):
            raise InputError(f"light spectrum width = {gaussian_fwhm_GHz!r} GHz must be finite and >= 0.")
        weight, centre, doppler = np.array([(c.weight, c.offset_GHz, c.doppler_GHz) for c in self.components]).T
        s = np.hypot(doppler, gaussian_fwhm_GHz / GAUSS_FWHM)
        z = (nu - centre - self.shift_GHz + 0.5j * self.lorentz_fwhm_GHz) / (math.sqrt(2) * s)
        summed: NDArray[np.complex128] = np.sum(weight / (s * math.sqrt(2 * math.pi)) * wofz(z), axis=-1)
        return summed

    def cross_section(self, detuning_GHz: ArrayLike, gaussian_fwhm_GHz: float = 0.0) -> Array:
        """Absorption cross section per atom [cm^2], ``pi r_e c f`` times the real profile; arguments as `profile`."""
        return np.asarray(self.area_cm2_GHz * self.profile(detuning_GHz, gaussian_fwhm_GHz).real)

    def dispersion(self, detuning_GHz: ArrayLike, gaussian_fwhm_GHz: float = 0.0) -> Array:
        """Dispersive partner of the cross section [cm^2], > 0 on the blue side; arguments as `profile`.

        Times half the photon flux it is the light shift; ``n lambda/(4 pi)`` times its negative is the refractive index
        minus 1.
        """
        return np.asarray(self.area_cm2_GHz * self.profile(detuning_GHz, gaussian_fwhm_GHz).imag)

    def component_fwhm_GHz(self, gaussian_fwhm_GHz: float = 0.0) -> float:
        """Full width of one hyperfine component [GHz], ``0.5346 L + sqrt(0.2166 L^2 + G^2)``, good to 0.02 %.

        Source: Olivero & Longbothum, JQSRT 17, 233 (1977), FROM MEMORY.
        """
        L, G = self.lorentz_fwhm_GHz, math.hypot(self.doppler_fwhm_GHz, gaussian_fwhm_GHz)
        return 0.5346 * L + math.sqrt(0.2166 * L**2 + G**2)

    def peak(self, gaussian_fwhm_GHz: float = 0.0) -> tuple[float, float]:
        """Detuning [GHz] and value [cm^2] of the largest cross section."""
        from scipy.optimize import minimize_scalar

        width = self.component_fwhm_GHz(gaussian_fwhm_GHz)
        near = width * np.linspace(-1.5, 1.5, 61)
        grid = (np.array([c.offset_GHz for c in self.components])[:, None] + near).ravel() + self.shift_GHz
        best = float(grid[np.argmax(self.cross_section(grid, gaussian_fwhm_GHz))])
        found = minimize_scalar(
            lambda nu: -float(self.cross_section(nu, gaussian_fwhm_GHz)),
            bounds=(best - 0.05 * width, best + 0.05 * width),
            method="bounded",
            options={"xatol": 1e-6 * width},
        )
        return float(found.x), float(self.cross_section(found.x, gaussian_fwhm_GHz))

    def fwhm_GHz(self, gaussian_fwhm_GHz: float = 0.0) -> float:
        """Full width at half maximum of the feature that holds the peak [GHz], merged components together."""
        from scipy.optimize import brentq

        centre, top = self.peak(gaussian_fwhm_GHz)
        step = 0.05 * self.component_fwhm_GHz(gaussian_fwhm_GHz)
        offsets = [c.offset_GHz for c in self.components]
        outward = np.arange(0.0, max(offsets) - min(offsets) + 80 * step, step)
        edges = []
        for side in (-1, 1):
            below = np.flatnonzero(self.cross_section(centre + side * outward, gaussian_fwhm_GHz) < top / 2)[0]
            ends = centre + side * outward[below - 1], centre + side * outward[below]
            edges.append(brentq(lambda nu: float(self.cross_section(nu, gaussian_fwhm_GHz)) - top / 2, *ends))
        return float(edges[1] - edges[0])

    def splitting_GHz(self, level: str) -> float:
        """Largest hyperfine span of "S1/2" or the upper level [GHz] among the isotopes above 1 % of the sample."""
        if level not in ("S1/2", UPPER_LEVEL[self.line]):
            raise UnknownNameError("level", str(level), ("S1/2", UPPER_LEVEL[self.line]))
        spans = []
        for isotope in self.alkali.isotopes:
            if sum(c.weight for c in self.components if c.isotope == isotope.label) > _RARE:
                spans.append(float(np.ptp(isotope_energies(isotope, level))) * 1e-3)
        return max(spans)

    def resolution(self, level: str, gaussian_fwhm_GHz: float = 0.0) -> str:
        """Say if a level is "resolved", "partly resolved" or "unresolved": its span against a component's width."""
        ratio = self.splitting_GHz(level) / self.component_fwhm_GHz(gaussian_fwhm_GHz)
        if ratio > CLEAR:
            return "resolved"
        return "unresolved" if ratio < 1 / CLEAR else "partly resolved"


def hyperfine_strengths(spin: float, j_upper: float) -> dict[tuple[float, float], float]:
    """Relative strengths of the hyperfine components of S1/2 -> J' with a thermal (equal) ground population.

    ``(2F+1)(2F'+1)/(2I+1) {1/2 J' 1; F' F I}^2``: over F' they add to the population (2F+1)/(4I+2).

    Parameters
    ----------
    spin : float
        Nuclear spin I [hbar]; 0 leaves one component.
    j_upper : float
        J' of the upper level [hbar].

    Returns
    -------
    strengths : dict
        (F, F') -> share of the area [1].
    """
    found = {}
    for F in f_values(0.5, spin):
        for upper in f_values(j_upper, spin):
            share = (2 * F + 1) * (2 * upper + 1) / (2 * spin + 1) * six_j(0.5, j_upper, 1, upper, F, spin) ** 2
            if share:
                found[float(F), float(upper)] = float(share)
    return found


def doppler_sigma_GHz(frequency_GHz: float, temperature_K: float, mass_u: float) -> float:
    """Standard deviation of the Doppler profile, ``nu sqrt(kT/(m c^2))`` [GHz], of an atom of ``mass_u`` [u]."""
    return frequency_GHz * math.sqrt(codata.k * temperature_K / (mass_u * codata.atomic_mass)) / codata.c


def absorption_line(
    alkali: Alkali,
    line: str,
    temperature_K: float,
    fwhm_rad_s: float = 0.0,
    shift_rad_s: float = 0.0,
    isotope: str | None = None,
    fwhm_error_rad_s: float | None = None,
    shift_error_rad_s: float | None = None,
) -> AbsorptionLine:
    """Absorption line of a vapour: strengths, positions and widths of all hyperfine components.

    ``sigma(nu) = pi r_e c f sum_i w_i Voigt(nu - nu_i - d; gamma, s_i)``, gamma = Gamma/(2 pi) + collisional width.

    Parameters
    ----------
    alkali : Alkali
        Gives wavelength, lifetime, oscillator strength, isotopes.
    line : str
        "D1" or "D2".
    temperature_K : float
        Temperature of the vapour [K]; > 0.
    fwhm_rad_s, shift_rad_s : float
        Collisional full width (>= 0) and shift (blue > 0) at the gas density [rad/s].
    isotope : str or None
        "87Rb" for an isotopically pure vapour, None for the natural mixture.
    fwhm_error_rad_s, shift_error_rad_s : float or None
        Absolute errors of the two [rad/s], >= 0; None = not estimated.

    Returns
    -------
    AbsorptionLine

    Raises
    ------
    InputError
        Lists every value that is not finite or breaks its rule; UnknownNameError for a line or isotope.
    """
    if line not in UPPER_LEVEL:
        raise UnknownNameError("line", str(line), tuple(UPPER_LEVEL))
    isotopes = [one for one in alkali.isotopes if isotope in (None, one.label)]
    if not isotopes:
        raise UnknownNameError("isotope", str(isotope), [one.label for one in alkali.isotopes])
    _check(temperature_K, fwhm_rad_s, shift_rad_s, fwhm_error_rad_s, shift_error_rad_s)
    return AbsorptionLine(
        alkali,
        line,
        isotope or NATURAL,
        temperature_K,
        fwhm_rad_s,
        shift_rad_s,
        fwhm_error_rad_s,
        shift_error_rad_s,
        alkali.decay_rate(UPPER_LEVEL[line]) / GHZ_RAD_S,
        AREA_CM2_GHZ * alkali.oscillator_strength[line].value,
        _components(alkali, isotopes, line, temperature_K),
    )


def _check(temperature: float, fwhm: float, shift: float, *errors: float | None) -> None:
    rules = [
        ("temperature", temperature, "K", temperature > 0, "> 0"),
        ("collisional width", fwhm, "rad/s", fwhm >= 0, ">= 0"),
        ("collisional shift", shift, "rad/s", True, "a number"),
    ]
    rules += [
        (f"error of the {what}", error, "rad/s", error >= 0, ">= 0, or None when it is not known")
        for what, error in zip(("width", "shift"), errors, strict=True)
        if error is not None
    ]
    broken = [
        f"{name} = {value:g} {unit} must be finite and {rule}; give another value."
        for name, value, unit, obeyed, rule in rules
        if not (math.isfinite(value) and obeyed)
    ]
    if broken:
        raise InputError(broken)


def _components(alkali: Alkali, isotopes: list[Isotope], line: str, temperature: float) -> tuple[Component, ...]:
    """Every component of the sample; offsets count from its centre of gravity."""
    total = sum(one.abundance.value for one in isotopes)
    share = {one.label: one.abundance.value / total for one in isotopes}
    shift = {one.label: isotope_shift(one.label, line).value * 1e-3 for one in isotopes}
    centre = sum(share[label] * shift[label] for label in share)
    frequency = codata.c / alkali.line_wavelength_nm(line)  # m/s over nm is GHz
    found = []
    for one in isotopes:
        lower, upper = (_energies_GHz(one, level) for level in ("S1/2", UPPER_LEVEL[line]))
        sigma = doppler_sigma_GHz(frequency, temperature, one.mass_u.value)
        for (F, F_upper), strength in hyperfine_strengths(one.nuclear_spin, J_OF[UPPER_LEVEL[line]]).items():
            offset = shift[one.label] - centre + upper[F_upper] - lower[F]
            found.append(Component(one.label, F, F_upper, share[one.label] * strength, offset, sigma))
    return tuple(found)


def _energies_GHz(isotope: Isotope, level: str) -> dict[float, float]:
    """F -> hyperfine energy of a level [GHz]."""
    F = f_values(J_OF[level], isotope.nuclear_spin)
    return {float(one): float(energy) * 1e-3 for one, energy in zip(F, isotope_energies(isotope, level), strict=True)}
