"""The light of a verdict: absorption lines in the gas of the cell, and the pumping beam at any density of that gas."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

from pertcalc.results import CollisionRates
from pertcalc.species import UPPER_LEVEL, Alkali, Isotope
from pertcalc.vapour.absorption import AbsorptionLine, absorption_line
from pertcalc.vapour.excited import coefficient, coefficient_error
from pertcalc.vapour.ground_spin import slowing_down
from pertcalc.vapour.level_rates import level_rates
from pertcalc.vapour.pumping import Pumping, pumping
from pertcalc.vapour.question import Question


@dataclass(frozen=True, slots=True)
class PumpLight:
    """The pumping light at one gas density.

    ``beam`` what it does; ``resolves`` whether line and light resolve the hyperfine structure of the ground level.
    """

    beam: Pumping
    resolves: bool

    @property
    def damping(self) -> float:
        """Rate at which absorption damps the electron spin, the nucleus left out [s^-1]."""
        return self.beam.spin.damping


def line_in_gas(atom: Alkali, line: str, question: Question, rates: CollisionRates | None) -> AbsorptionLine:
    """The absorption line "D1" or "D2" at the temperature and gas density of the cell; ``rates`` None without gas."""
    T, n = question.fill.temperature_K, question.gas_density_cm3
    if rates is None:
        return absorption_line(atom, line, T)
    width, moved = (n * coefficient(rates, what, line) for what in ("fwhm", "shift"))
    relative = [coefficient_error(rates, what, line) for what in ("fwhm", "shift")]
    errors = [None if one is None else one * abs(value) for one, value in zip(relative, (width, moved), strict=True)]
    return absorption_line(atom, line, T, width, moved, fwhm_error_rad_s=errors[0], shift_error_rad_s=errors[1])


def pump_light(
    question: Question,
    isotope: Isotope,
    lines: Mapping[str, AbsorptionLine],
    rates: CollisionRates | None,
    factor: float = 1.0,
) -> PumpLight | None:
    """The light of a question with the gas density of the cell times ``factor``, all else unchanged.

    Width, shift and mixing of the excited level are proportional to the density; a beam at the peak stays at the peak.

    Parameters
    ----------
    question : Question
    isotope : Isotope
        Its nuclear spin slows the orientation.
    lines : mapping
        Line -> AbsorptionLine at the density of the cell.
    rates : CollisionRates or None
        None without gas.
    factor : float
        [1]; > 0.

    Returns
    -------
    PumpLight or None
        None in the dark.

    Raises
    ------
    InputError
        As `pertcalc.vapour.pumping.pumping`.
    """
    light = question.light
    if light is None:
        return None
    line, level = _thinned(lines[light.line], factor), UPPER_LEVEL[light.line]
    gas = None if rates is None else level_rates(line.alkali, rates, factor * question.gas_density_cm3)
    error = None if rates is None else coefficient_error(rates, "multipole_loss", level, 1)
    q = float(slowing_down(isotope.nuclear_spin, 1.0))
    beam = pumping(line, light.beam, gas, slowing_down=q, loss_error=error)
    return PumpLight(beam, line.resolution("S1/2", light.beam.linewidth_GHz) == "resolved")


def _thinned(line: AbsorptionLine, factor: float) -> AbsorptionLine:
    """The line at another gas density; relative errors stay."""
    if factor == 1.0:
        return line
    errors = (line.fwhm_error_rad_s, line.shift_error_rad_s)
    width, shift = (None if one is None else factor * one for one in errors)
    return replace(
        line,
        fwhm_rad_s=factor * line.fwhm_rad_s,
        shift_rad_s=factor * line.shift_rad_s,
        fwhm_error_rad_s=width,
        shift_error_rad_s=shift,
    )
