"""Optical depth of a vapour and radiation trapping: how often light is reabsorbed before it leaves the cell.

The photon emitted at the middle of the cell with the (completely redistributed) absorption profile escapes over the
distance R to the wall with the probability ``g = Int phi(nu) exp(-n sigma(nu) R) dnu``, here with the actual profile of
all hyperfine components. For a Lorentz and a Doppler line in a long cylinder Holstein's exact decay rates are 1.115 and
1.60 times Gamma g at large depth; that spread is the error of the estimate. notes/absorption-and-pumping.md.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from scipy.integrate import trapezoid

from pertcalc.errors import InputError
from pertcalc.species import COMPUTED, UPPER_LEVEL, Sourced
from pertcalc.vapour.absorption import AbsorptionLine, Array
from pertcalc.vapour.quenching import ENOUGH

# Optical depth above which a photon is reabsorbed more often than not.
THICK = 1.0
# Holstein's cylinder over the single flight from the axis: 1.115 (Lorentz) to 1.60 (Doppler).
_GEOMETRY_ERROR = 0.6
# What reabsorption spoils, said once for all lines of a cell.
INVALIDATES = (
    "Radiation trapping: light is reabsorbed: polarisation of the light that leaves is not that of one scattering, "
    "coherences and alignment live longer (Hanle signals narrower than the free ones), the excited level decays more "
    "slowly, and unpolarised reabsorbed light depolarises the ground level. A quenching gas takes the excited "
    "atoms back without light (nitrogen: common practice, no source)."
)


@dataclass(frozen=True, slots=True)
class Trapping:
    """Optical depth and trapping of one line in one cell.

    ``optical_depth`` [1] at the peak over the whole path; ``depth_to_wall`` [1] over the shortest way out;
    ``escape`` probability of one flight g [1]; ``emissions`` mean number of photons emitted per excitation [1];
    ``decay_rate`` effective decay of the level's population, quenching included [s^-1]; ``reabsorbed`` photons absorbed
    again per excitation [1]; ``matters`` if depth_to_wall > 1 and reabsorbed > 1/ENOUGH: pumping on the line then needs
    a quenching gas; ``warnings`` one line on the line, then INVALIDATES where it matters.
    """

    optical_depth: Sourced
    depth_to_wall: float
    escape: Sourced
    emissions: float
    reabsorbed: float
    decay_rate: Sourced
    matters: bool
    warnings: tuple[str, ...]


def optical_depth(line: AbsorptionLine, density_cm3: float, length_cm: float) -> float:
    """Optical depth ``n sigma_peak L`` [1] of an unpolarised vapour.

    Parameters: ``density_cm3`` n of the alkali [cm^-3], >= 0; ``length_cm`` path L [cm], > 0. InputError lists what
    breaks its rule.
    """
    _check(density_cm3, {"path": length_cm})
    return density_cm3 * line.peak()[1] * length_cm


def escape_probability(line: AbsorptionLine, density_cm3: float, distance_cm: float) -> float:
    """Probability that a photon of the line's own profile travels a distance unabsorbed.

    ``g = Int phi exp(-n sigma R) dnu``; Lorentz: ``exp(-t/2) I0(t/2)``, t = n sigma_peak R.

    Parameters
    ----------
    line : AbsorptionLine
    density_cm3 : float
        Density of the alkali [cm^-3]; >= 0.
    distance_cm : float
        Distance R [cm]; > 0.

    Returns
    -------
    g : float
        [1]; the quadrature is good to 1e-4 of it.

    Raises
    ------
    InputError
        A number breaks its rule.

    Source
    ------
    Holstein, Phys. Rev. 72, 1212 (1947) and 83, 1159 (1951), FROM MEMORY: transmission of the emission profile.
    """
    _check(density_cm3, {"distance": distance_cm})
    depth = density_cm3 * distance_cm
    nu, reach = _frequencies(line, depth * line.area_cm2_GHz)
    sigma = line.cross_section(nu)
    inside = trapezoid(sigma * np.exp(-depth * sigma), nu) / line.area_cm2_GHz
    # Past the grid the vapour is thin: all of the Lorentz wings escapes.
    return float(min(1.0, inside + line.lorentz_fwhm_GHz / (math.pi * reach)))


def trapping(
    line: AbsorptionLine,
    density_cm3: float,
    length_cm: float,
    distance_cm: float | None = None,
    quench_rate_s: float = 0.0,
    density_error: float | None = None,
) -> Trapping:
    """Optical depth and reabsorption of one line, with and without quenching.

    Emissions per excitation ``Gamma/(Gamma g + Q)``, decay rate ``Gamma g + Q``, reabsorbed ``emissions (1 - g)``.

    Parameters
    ----------
    line : AbsorptionLine
    density_cm3 : float
        Density of the alkali [cm^-3]; >= 0.
    length_cm : float
        Path of the beam through the vapour [cm]; > 0.
    distance_cm : float or None
        From the middle of the cell to its nearest wall [cm]; > 0; None means length_cm / 2.
    quench_rate_s : float
        Quenching rate Q of the upper level [s^-1]; >= 0.
    density_error : float or None
        Relative error of the density [1].

    Returns
    -------
    Trapping

    Raises
    ------
    InputError
        Lists every number that breaks its rule.
    """
    way = length_cm / 2 if distance_cm is None else distance_cm
    _check(density_cm3, {"path": length_cm, "distance to the wall": way}, quench_rate_s)
    decay = line.alkali.decay_rate(UPPER_LEVEL[line.line])
    depth = optical_depth(line, density_cm3, length_cm)
    to_wall = depth * way / length_cm
    g = escape_probability(line, density_cm3, way)
    total = decay * g + quench_rate_s
    reabsorbed = decay * (1 - g) / total
    g_error = min(1.0, _GEOMETRY_ERROR + (density_error or 0.0)) * g * (1 - g)
    matters = to_wall > THICK and reabsorbed > 1 / ENOUGH
    return Trapping(
        Sourced(
            depth,
            "1",
            "n sigma_peak L of the unpolarised vapour; a polarised one is thinner",
            COMPUTED,
            None if density_error is None else depth * density_error,
        ),
        to_wall,
        Sourced(g, "1", "one flight from the middle to the nearest wall, complete redistribution", COMPUTED, g_error),
        decay / total,
        reabsorbed,
        Sourced(total, "s^-1", "radiative decay times escape, plus quenching", COMPUTED, decay * g_error),
        matters,
        _warnings(line, depth, to_wall, reabsorbed, matters),
    )


def _warnings(line: AbsorptionLine, depth: float, to_wall: float, reabsorbed: float, matters: bool) -> tuple[str, ...]:
    parts = []
    if depth > THICK:
        parts.append(f"optical depth {depth:.3g} along the beam (rates at the entrance do not hold at the far end)")
    if matters:
        parts.append(
            f"optical depth {to_wall:.3g} to the wall, {reabsorbed:.3g} photons reabsorbed per excitation: pumping on "
            f"{line.line} needs a quenching gas"
        )
    if not parts:
        return ()
    return (f"{line.line}: {', '.join(parts)}.", *((INVALIDATES,) if matters else ()))


def _frequencies(line: AbsorptionLine, depth_area_GHz: float) -> tuple[Array, float]:
    """Detunings fine at every component, and how far they reach: to where the vapour is thin [GHz]."""
    width = line.component_fwhm_GHz()
    # In a Lorentz wing n sigma R = depth_area gamma/(2 pi nu^2): it is 1e-6 at this distance.
    reach = max(60 * width, math.sqrt(depth_area_GHz * line.lorentz_fwhm_GHz * 1e6 / (2 * math.pi)))
    u = np.linspace(-1.0, 1.0, 1601) * math.asinh(reach / (0.3 * width))
    centres = np.array([c.offset_GHz for c in line.components]) + line.shift_GHz
    return np.unique((centres[:, None] + 0.3 * width * np.sinh(u)).ravel()), reach


def _check(density: float, lengths: dict[str, float], quench: float = 0.0) -> None:
    broken = [
        f"{name} = {value!r} cm must be finite and > 0; give another length."
        for name, value in lengths.items()
        if not (math.isfinite(value) and value > 0)
    ]
    if not (math.isfinite(density) and density >= 0):
        broken.append(f"alkali density = {density!r} cm^-3 must be finite and >= 0; give another density.")
    if not (math.isfinite(quench) and quench >= 0):
        broken.append(f"quenching rate = {quench!r} s^-1 must be finite and >= 0; give another rate.")
    if broken:
        raise InputError(broken)
