"""What a verdict is asked for: atom, gas, conditions, cell and light, checked once at the door."""

from __future__ import annotations

import math
from dataclasses import dataclass
from os import PathLike

from scipy.constants import c

from pertcalc.curves.curveset import CurveSet
from pertcalc.errors import InputError, UnknownNameError
from pertcalc.names import METHODS
from pertcalc.rates import load_curves
from pertcalc.species import ALKALIS, UPPER_LEVEL, alkali_symbol, noble_gas_symbol
from pertcalc.species import alkali as alkali_record
from pertcalc.vapour.absorption import absorption_line
from pertcalc.vapour.cell import Cell, parse_cell
from pertcalc.vapour.fill import Fill, fill_or_defaults, larmor_rad_s
from pertcalc.vapour.ground import Surroundings
from pertcalc.vapour.pumping import Beam, pumping

NO_GAS = "none"
DEFAULT_LINE = "D1"
# A usual cell: common practice, no source.
DEFAULT_CELL = "sphere 25 mm"
# The Zeeman energy there is 47 cm^-1: the fine structure of no alkali keeps P1/2 and P3/2 unmixed.
LARGEST_FIELD_G = 1e6


@dataclass(frozen=True, slots=True)
class Light:
    """Pumping light: a ``beam`` tuned to ``line`` "D1" or "D2"."""

    line: str
    beam: Beam


@dataclass(frozen=True, slots=True)
class Question:
    """A checked order for a verdict; ``gas`` None means no buffer gas, ``light`` None no pumping.

    ``beam_diameter_cm`` [cm] of the region looked at, None when it fills the cell; ``defaults`` names of the conditions
    nobody gave.
    """

    alkali: str
    gas: str | None
    fill: Fill
    cell: Cell
    wall: str
    light: Light | None
    beam_diameter_cm: float | None
    method: str
    curves: CurveSet | None
    defaults: tuple[str, ...]

    @property
    def gas_density_cm3(self) -> float:
        """Density of the buffer gas [cm^-3], 0 without one."""
        return 0.0 if self.gas is None else self.fill.density_cm3


def ask(
    alkali: str,
    gas: str,
    *,
    temperature_K: float | None = None,
    pressure_torr: float | None = None,
    fill_temperature_K: float | None = None,
    field_G: float | None = None,
    cell: str | Cell | None = None,
    wall: str = "bare",
    power_W: float | None = None,
    beam_diameter_cm: float | None = None,
    line: str | None = None,
    detuning_GHz: float | None = None,
    linewidth_GHz: float | None = None,
    method: str = METHODS[0],
    curves: str | PathLike[str] | None = None,
) -> Question:
    """Fill in the defaults and check every value.

    Parameters
    ----------
    alkali, gas : str
        Symbols; gas "none" for a cell without buffer gas; the label of ``curves`` for a perturber of the user's own.
    temperature_K, pressure_torr, fill_temperature_K, field_G : float or None
        Conditions [K, Torr, K, G]; None takes the default of pertcalc.vapour.fill.
    cell : str, Cell or None
        As "cylinder 25 mm x 50 mm"; None takes DEFAULT_CELL.
    wall : str
        "bare" or "coated".
    power_W, beam_diameter_cm : float or None
        Of the light [W, cm]; a beam without power still bounds the region looked at.
    line : str or None
        "D1" (default) or "D2".
    detuning_GHz, linewidth_GHz : float or None
        Of the light [GHz]; default the peak of the absorption, and narrow.
    method : str
        "semiclassical" or "quantum".
    curves : path or None
        A curve file in place of the default set.

    Returns
    -------
    Question

    Raises
    ------
    InputError, UnknownNameError
        Names every field that breaks its rule.
    DataFileError
        The curve file cannot be used.
    """
    symbol = alkali_symbol(alkali)
    without = gas.strip().lower() == NO_GAS
    if without:
        _refuse({"--pressure": pressure_torr, "--fill-temperature": fill_temperature_K, "--curves": curves})
    curve_set = None if without or curves is None else load_curves(symbol, gas, curves)
    name = None if without else (curve_set.noble_gas if curve_set is not None else noble_gas_symbol(gas))
    if method not in METHODS:
        raise UnknownNameError("method", method, METHODS)
    if method == "closed-form":
        raise InputError(
            "method = 'closed-form' does not know fine-structure transfer and the orientation of P1/2, which a verdict "
            "needs. Take semiclassical or quantum."
        )
    fill, defaults = fill_or_defaults(symbol, temperature_K, pressure_torr, fill_temperature_K, field_G)
    _check_field(fill.field_G)
    light = _light(power_W, beam_diameter_cm, line, detuning_GHz, linewidth_GHz)
    if light is not None and light.beam.detuning_GHz is not None:
        # Refuses a detuning nearer to the other line before the long computation; the gas does not matter for that.
        pumping(absorption_line(alkali_record(symbol), light.line, fill.temperature_K), light.beam)
    place = cell if isinstance(cell, Cell) else parse_cell(DEFAULT_CELL if cell is None else cell)
    # Refuses an unknown wall and a beam larger than the cell before the long computation.
    Surroundings(fill.temperature_K, place, wall, beam_diameter_cm=beam_diameter_cm)
    kept = tuple(one for one in defaults if not (without and one in ("pressure", "fill temperature")))
    kept += ("cell",) if cell is None else ()
    return Question(symbol, name, fill, place, wall, light, beam_diameter_cm, method, curve_set, kept)


def _check_field(field_G: float) -> None:
    """InputError for a field at which nothing of the treatment is left."""
    if field_G > LARGEST_FIELD_G:
        splitting = max(alkali_record(one).fine_structure_cm1.value for one in ALKALIS)
        share = larmor_rad_s(1.0, LARGEST_FIELD_G) / (2 * math.pi * c * 100 * splitting)
        raise InputError(
            f"--field = {field_G:g} G is above {LARGEST_FIELD_G:g} G: the Zeeman energy there is comparable with the "
            f"fine structure of every alkali (from {100 * share:.0f} % of it, in Cs, to far above it, in Li), and no "
            "laboratory has such a field; give a smaller one."
        )


def _refuse(given: dict[str, object]) -> None:
    """InputError for what has no meaning without a gas."""
    unwanted = [name for name, value in given.items() if value is not None]
    if unwanted:
        raise InputError(f"gas = none has no {', '.join(unwanted)}: leave it out, or name a gas.")


def _light(
    power: float | None, diameter: float | None, line: str | None, detuning: float | None, width: float | None
) -> Light | None:
    """The light asked for, None without any; InputError for half a description."""
    if line is not None and line not in UPPER_LEVEL:
        raise UnknownNameError("line", line, tuple(UPPER_LEVEL))
    if power is None:
        idle = {"--line": line, "--detuning": detuning, "--linewidth": width}
        unwanted = [name for name, value in idle.items() if value is not None]
        if unwanted:
            raise InputError(f"{', '.join(unwanted)} given without --power: add --power, such as --power '10 mW'.")
        if diameter is not None and not (math.isfinite(diameter) and diameter > 0):
            raise InputError(f"--beam-diameter = {diameter:g} cm must be finite and > 0; give another value.")
        return None
    if diameter is None:
        raise InputError(
            f"--power = {power:g} W needs the size of the beam: add --beam-diameter, such as --beam-diameter '5 mm'."
        )
    return Light(line or DEFAULT_LINE, Beam(power, diameter, detuning, width or 0.0))
