"""Quenching of the P levels by molecules: cross sections, rates, and the nitrogen that keeps a vapour from glowing.

A quenched atom returns to the ground level without light, so nothing is reabsorbed. Noble gases do not quench (only
bounds are known: the answer is None). Data: ``pertcalc/data/vapour/quenching.csv``; notes/absorption-and-pumping.md.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cache

from pertcalc import constants
from pertcalc.errors import InputError, UnknownNameError
from pertcalc.shipped import shipped_rows
from pertcalc.species import COMPUTED, Alkali, Sourced, alkali_symbol, noble_gas
from pertcalc.thermal import mean_speed
from pertcalc.vapour.level_rates import P_LEVELS

NOBLE = ("He", "Ne", "Ar", "Kr", "Xe")
# Relative molecular masses [u], standard atomic weights FROM MEMORY.
MOLECULES_U = {
    "N2": 28.0134,
    "H2": 2.01588,
    "CO": 28.0101,
    "CO2": 44.0095,
    "O2": 31.9988,
    "H2O": 18.0153,
    "CH4": 16.0425,
}
QUENCHERS = (*MOLECULES_U, *NOBLE)
# Quenching this many times faster than radiative decay is called enough (common practice, no source).
ENOUGH = 10.0
# Usual temperature of an alkali vapour cell [K] (common practice, no source).
_CELL_K = 400.0

_ANGSTROM2_CM2 = 1e-16


@dataclass(frozen=True, slots=True)
class Quenching:
    """One published quenching cross section ``rate / (density x mean relative speed)``.

    ``value`` and ``error`` [A^2], the error None for a "bound" (cross section below ``value``); ``low_K``, ``high_K``
    temperatures of the measurement [K]; ``kind`` "value" | "bound"; ``mark`` READ | FROM MEMORY; ``grade`` "high" |
    "medium" | "low".
    """

    alkali: str
    level: str
    gas: str
    kind: str
    value: float
    error: float | None
    low_K: float
    high_K: float
    published: str
    source: str
    mark: str
    grade: str
    note: str


def quenching_rows(alkali: str, level: str, gas: str) -> tuple[Quenching, ...]:
    """Every published row for one alkali, P level and gas, bounds included; UnknownNameError for unknown names."""
    symbol = alkali_symbol(alkali)
    if level not in P_LEVELS:
        raise UnknownNameError("level", str(level), P_LEVELS)
    if gas not in QUENCHERS:
        raise UnknownNameError("gas", str(gas), QUENCHERS)
    return tuple(row for row in _all() if (row.alkali, row.level, row.gas) == (symbol, level, gas))


def quenching(alkali: str, level: str, gas: str, temperature_K: float = _CELL_K) -> Sourced | None:
    """Quenching cross section of "P1/2" or "P3/2" by a gas, measured nearest to a temperature.

    Parameters
    ----------
    alkali, level, gas : str
        "Rb", "P1/2", "N2" (H2, CO, CO2, O2, H2O, CH4, noble gases).
    temperature_K : float
        Temperature it is wanted for [K]; > 0. The value is not scaled to it.

    Returns
    -------
    Sourced or None
        [cm^2]; None if no value is known or only a bound.

    Raises
    ------
    InputError
        The temperature is not > 0; UnknownNameError for a name.
    """
    _check_temperature(temperature_K)
    rows = [row for row in quenching_rows(alkali, level, gas) if row.kind == "value" and row.error is not None]
    if not rows:
        return None

    def distance(row: Quenching) -> float:
        return max(0.0, math.log(row.low_K / temperature_K), math.log(temperature_K / row.high_K))

    row = min(rows, key=distance)
    assert row.error is not None
    span = f"{row.low_K:g}" if row.low_K == row.high_K else f"{row.low_K:g} to {row.high_K:g}"
    return Sourced(
        row.value * _ANGSTROM2_CM2,
        "cm^2",
        f"{row.source}; measured at {span} K",
        row.mark,
        row.error * _ANGSTROM2_CM2,
    )


def quench_rate(alkali: Alkali, level: str, gas: str, density_cm3: float, temperature_K: float) -> Sourced | None:
    """Quenching rate of a P level, ``n sigma vbar, vbar = sqrt(8 k T/(pi mu))``.

    Parameters
    ----------
    alkali : Alkali
    level, gas : str
        "P1/2" or "P3/2"; a molecule or noble gas.
    density_cm3 : float
        Density n of the gas [cm^-3]; >= 0.
    temperature_K : float
        Temperature of the cell [K]; > 0.

    Returns
    -------
    Sourced or None
        [s^-1] with the error of the cross section; None if that is unknown.

    Raises
    ------
    InputError
        A number breaks its rule; UnknownNameError for a name.
    """
    if not (math.isfinite(density_cm3) and density_cm3 >= 0):
        raise InputError(f"density = {density_cm3!r} cm^-3 must be finite and >= 0; give another density of {gas}.")
    sigma = quenching(alkali.symbol, level, gas, temperature_K)
    if sigma is None or sigma.error is None:
        return None
    factor = density_cm3 * _speed_cm_s(alkali, gas, temperature_K)
    return Sourced(factor * sigma.value, "s^-1", f"n sigma vbar; {sigma.source}", sigma.mark, factor * sigma.error)


def quench_pressure_torr(alkali: Alkali, temperature_K: float, level: str = "P1/2", gas: str = "N2") -> Sourced | None:
    """Pressure at which quenching is 10 times faster than radiative decay, ``p = 10 Gamma k T/(sigma vbar)``.

    Parameters
    ----------
    alkali : Alkali
    temperature_K : float
        Temperature of the cell [K]; > 0; the pressure is that in the hot cell.
    level, gas : str
        "P1/2" or "P3/2"; a molecule.

    Returns
    -------
    Sourced or None
        [Torr] with the error of the cross section; None if that is unknown.

    Raises
    ------
    InputError
        The temperature is not > 0; UnknownNameError for a name.
    """
    unit = quench_rate(alkali, level, gas, 1.0, temperature_K)
    if unit is None or unit.error is None:
        return None
    density = ENOUGH * alkali.decay_rate(level) / unit.value
    pressure = density * 1e6 * constants.BOLTZMANN_J_K * temperature_K / constants.TORR_PA
    source = f"{ENOUGH:g} times the radiative decay; {unit.source} ({unit.mark})"
    return Sourced(pressure, "Torr", source, COMPUTED, pressure * unit.error / unit.value)


def _check_temperature(temperature: float) -> None:
    if not (math.isfinite(temperature) and temperature > 0):
        raise InputError(f"temperature = {temperature!r} K must be finite and > 0; give another value.")


def _speed_cm_s(alkali: Alkali, gas: str, temperature: float) -> float:
    """Mean relative speed of an alkali atom and a gas particle [cm/s]."""
    other = MOLECULES_U.get(gas) or noble_gas(gas).mass_u.value
    mass = alkali.mass_u.value * other / (alkali.mass_u.value + other) * constants.AMU_AU
    return float(mean_speed(temperature, mass)) * constants.AU_VELOCITY_CM_S


@cache
def _all() -> tuple[Quenching, ...]:
    """Return every row of the table."""
    return shipped_rows("vapour", "quenching.csv", _row)


def _row(cells: dict[str, str]) -> Quenching:
    """Return one table row as a record."""
    if cells.pop("unit") != "A^2":
        raise ValueError(f"{cells}: the unit must be A^2")
    numbers = {name: float(cells[name]) for name in ("value", "low_K", "high_K")}
    error = float(cells["error"]) if cells["error"] else None
    return Quenching(**(cells | numbers | {"error": error}))  # type: ignore[arg-type]
