"""Published measurements set beside the computed rates: widths, shifts, fine-structure transfer, depolarisation.

The tables are ``pertcalc/data/measured/*.csv`` (made by notes/scripts/make_measured.py, explained in
notes/measured.md). They are compared against and reported; a row FROM MEMORY may be wrong in a digit.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cache

from pertcalc import constants
from pertcalc.errors import InputError, UnknownNameError
from pertcalc.shipped import shipped_rows
from pertcalc.species import Sourced, alkali_symbol, noble_gas_symbol

QUANTITIES = ("fwhm", "shift", "transfer", "multipole_loss")
UNITS = {"fwhm": "1e-9 rad s^-1 cm^3", "shift": "1e-9 rad s^-1 cm^3", "transfer": "A^2", "multipole_loss": "A^2"}
GRADES = ("high", "medium", "low")
KINDS = ("value", "bound")
TABLES = ("lines.csv", "fine_structure.csv", "depolarisation.csv")

_ANGSTROM2_CM2 = 1e-16


@dataclass(frozen=True, slots=True)
class Measurement:
    """One published number about one pair.

    ``quantity`` "fwhm" (full width) or "shift" (signed, blue > 0) [1e-9 rad s^-1 cm^3] of ``line_or_level`` "D1", "D2";
    "transfer" (population outflow from the level "P1/2" or "P3/2" to the other) or "multipole_loss" (of ``rank``
    1..3) as cross section [A^2] = rate / mean relative speed. ``error`` [same unit], None where none is stated.
    ``temperature_K`` [K] of the measurement. ``published`` the number and unit as printed. ``kind`` "value", or "bound"
    when |quantity| < value is all that is known. ``mark`` "READ" | "FROM MEMORY". ``grade`` "high" | "medium" | "low"
    (order of magnitude, doubtful or unsure digits). ``note`` what else the reader must know.
    """

    alkali: str
    noble_gas: str
    quantity: str
    line_or_level: str
    rank: int | None
    value: float
    unit: str
    error: float | None
    temperature_K: float
    definition: str
    source: str
    mark: str
    grade: str
    note: str
    kind: str
    published: str


def measurements(
    alkali: str | None = None, noble_gas: str | None = None, quantity: str | None = None
) -> tuple[Measurement, ...]:
    """Return the measurements of an alkali, a gas and a quantity; None means all. Best grade first within a pair.

    Raises UnknownNameError for an alkali, gas or quantity that is not known ("He" and "3He" are two gases). An empty
    tuple means that nothing usable is in the tables (notes/measured.md lists what was left out).
    """
    wanted_alkali = None if alkali is None else alkali_symbol(alkali)
    wanted_gas = None if noble_gas is None else noble_gas_symbol(noble_gas)
    if quantity is not None and quantity not in QUANTITIES:
        raise UnknownNameError("quantity", str(quantity), QUANTITIES)
    return tuple(
        row
        for row in _all()
        if wanted_alkali in (None, row.alkali)
        and wanted_gas in (None, row.noble_gas)
        and quantity in (None, row.quantity)
    )


def as_rate(measurement: Measurement, reduced_mass_au: float) -> Sourced:
    """Return a measurement as a rate coefficient at its own temperature.

    ``k = sigma vbar, vbar = sqrt(8 k T / (pi mu))`` [cm^3/s] for cross sections; widths and shifts are rate
    coefficients already [rad s^-1 cm^3] and do not depend on the mass. The mark is that of the measurement, because
    that is where the number comes from; a bound says so in ``source``.

    ``reduced_mass_au``: reduced mass of the pair [electron masses], > 0; InputError otherwise.
    """
    if not (math.isfinite(reduced_mass_au) and reduced_mass_au > 0):
        raise InputError(f"reduced_mass_au = {reduced_mass_au!r} must be finite and > 0 [electron masses].")
    factor, unit, source = 1e-9, "rad s^-1 cm^3", measurement.source
    if measurement.unit == "A^2":
        kT = measurement.temperature_K * constants.KELVIN_HARTREE
        speed = math.sqrt(8 * kT / (math.pi * reduced_mass_au)) * constants.AU_VELOCITY_CM_S
        factor, unit = speed * _ANGSTROM2_CM2, "cm^3/s"
        source += f"; cross section times mean relative speed at {measurement.temperature_K:g} K"
    if measurement.kind == "bound":
        source += "; a bound: the magnitude is below the value"
    error = None if measurement.error is None else measurement.error * factor
    return Sourced(measurement.value * factor, unit, source, measurement.mark, error)


@cache
def _all() -> tuple[Measurement, ...]:
    """Return the rows of all tables, in the tables' order."""
    return tuple(row for name in TABLES for row in shipped_rows("measured", name, _row))


def _row(cells: dict[str, str]) -> Measurement:
    """Return one table row as a record."""
    numbers = {
        "value": float(cells["value"]),
        "temperature_K": float(cells["temperature_K"]),
        "error": float(cells["error"]) if cells["error"] else None,
        "rank": int(cells["rank"]) if cells["rank"] else None,
    }
    return Measurement(**(cells | numbers))  # type: ignore[arg-type]
