"""The border: a user's words become plain numbers in fixed units, rate coefficients what a laboratory quotes.

Words are matched against a small grammar (one number, one product of unit powers) before the unit library sees them, so
no expression is ever evaluated. Border units: K, Torr, gauss, cm^-3, cm, W, GHz. notes/units.md.
"""

from __future__ import annotations

import math
import re
from dataclasses import dataclass
from functools import lru_cache
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from pertcalc import constants
from pertcalc.errors import InputError

if TYPE_CHECKING:
    import pint

MAX_LENGTH = 64

_NUMBER = r"[+-]?(?:[0-9]{1,30}(?:\.[0-9]{0,30})?|\.[0-9]{1,30})(?:[eE][+-]?[0-9]{1,4})?"
_FACTOR = r"[A-Za-zµÅ°Ω]{1,24}(?:(?:\^|\*\*)?[+-]?[0-9]{1,2})?"
_UNIT = rf"(?:(?:1\s?)?/\s?)?{_FACTOR}(?:\s?[*/ ]\s?{_FACTOR}){{0,3}}"
_WORDS = re.compile(rf"({_NUMBER})\s?({_UNIT})?")
_ONE_FACTOR = re.compile(r"([A-Za-zµÅ°Ω]+)(?:\^|\*\*)?([+-]?[0-9]+)?")

# What users write -> what the unit library calls it. The library's gauss is the Gaussian-system unit of B, which it
# does not convert to tesla; `lab_gauss` is defined below as 1e-4 tesla.
_FULL_NAMES = {
    name: name
    for name in (
        "kelvin celsius fahrenheit rankine torr pascal bar millibar atmosphere tesla meter metre centimeter millimeter "
        "micrometer inch watt milliwatt microwatt amagat kilopascal hectopascal millitorr microtesla millitesla "
        "nanotesla"
    ).split()
} | {"mmhg": "mmHg", "inhg": "inHg"}
_GAUSS = re.compile(r"(k|kilo|m|milli|u|µ|micro|n|nano)?(?:G|[Gg]auss|GAUSS)")
_TORR = re.compile(r"(k|m|u|µ|n)?torr", re.IGNORECASE)
_TEMPERATURES = {"°C": "degC", "°F": "degF", "C": "degC", "F": "degF", "deg C": "degC", "deg F": "degF", "°K": "K"}
# Look-alikes: Greek mu, minus signs, dots, one-character degree Celsius, the angstrom sign.
_LOOK_ALIKES = {"\u03bc": "µ", "\u2212": "-", "\u2013": "-", "\u00b7": "*", "\u22c5": "*", "\u00d7": "*"}
_CHARACTERS = str.maketrans(_LOOK_ALIKES | {"\u2103": "°C", "\u212b": "\u00c5"})
_SUPERSCRIPTS = str.maketrans("⁺⁻⁰¹²³⁴⁵⁶⁷⁸⁹", "+-0123456789")


@dataclass(frozen=True, slots=True)
class Quantity:
    """What one kind of input must be: its border unit, an example, and whether zero is allowed."""

    name: str
    unit: str
    example: str
    zero_allowed: bool
    dimension: str
    signed: bool = False


QUANTITIES: dict[str, Quantity] = {
    q.name: q
    for q in (
        Quantity("temperature", "K", "'333 K' or '60 degC'", False, "a temperature"),
        Quantity("pressure", "Torr", "'20 Torr', '3 kPa' or '5 mbar'", False, "a pressure"),
        Quantity("density", "cm^-3", "'1e19 cm^-3' or '0.5 amagat'", False, "a number density"),
        Quantity("field", "gauss", "'0.5 G' or '50 uT'", True, "a magnetic field"),
        Quantity("length", "cm", "'25 mm' or '1 inch'", False, "a length"),
        Quantity("power", "W", "'10 mW'", True, "a power"),
        Quantity("frequency", "GHz", "'500 MHz' or '-2 GHz'", True, "a frequency", True),
    )
}
_PINT_UNITS = {
    "temperature": "kelvin",
    "pressure": "torr",
    "density": "1 / centimeter ** 3",
    "field": "lab_gauss",
    "length": "centimeter",
    "power": "watt",
    "frequency": "gigahertz",
}


@lru_cache(maxsize=1)
def _registry() -> pint.UnitRegistry[Any]:
    import pint

    registry: pint.UnitRegistry[Any] = pint.UnitRegistry()
    registry.define("lab_gauss = 1e-4 * tesla")
    registry.define(f"amagat = {constants.AMAGAT_CM3!r} / centimeter ** 3 = amg")
    return registry


def _problem(label: str, words: object, rule: str, quantity: Quantity) -> InputError:
    shown = repr(words)
    if len(shown) > 80:
        shown = shown[:60] + f"...' ({len(str(words))} characters)"
    return InputError(f"{label} = {shown}: {rule}; write {label} as {quantity.example}.")


def _split(words: object, label: str, quantity: Quantity) -> tuple[float, str]:
    """The number and the unit text ('' if none) of the user's words; InputError for anything else."""
    if isinstance(words, bool | int | float):
        raise _problem(label, words, "a unit is missing", quantity)
    if not isinstance(words, str):
        raise _problem(label, words, f"must be text with a number and a unit, not {type(words).__name__}", quantity)
    if len(words) > MAX_LENGTH:
        raise _problem(label, words, f"longer than {MAX_LENGTH} characters", quantity)
    text = " ".join(words.translate(_CHARACTERS).translate(_SUPERSCRIPTS).split())
    if not text:
        raise _problem(label, words, "is empty", quantity)
    match = _WORDS.fullmatch(text)
    if match is None:
        if re.match(r"[+-]?(nan|inf)", text, re.IGNORECASE):
            raise _problem(label, words, "the number must be finite", quantity)
        rule = "must be one number and one unit" if re.match(r"[+-]?\.?[0-9]", text) else "must begin with a number"
        raise _problem(label, words, rule, quantity)
    value = float(match[1])
    if not math.isfinite(value):
        raise _problem(label, words, "the number must be finite", quantity)
    return value, (match[2] or "").strip()


def _unit_name(name: str) -> str:
    """The unit library's name of one factor."""
    gauss = _GAUSS.fullmatch(name)
    if gauss:
        return (gauss[1] or "") + "lab_gauss"
    torr = _TORR.fullmatch(name)
    if torr:
        return (torr[1] or "") + "torr"
    return _FULL_NAMES.get(name.lower(), name)


def _unit_expression(text: str, kind: str) -> str:
    """The unit text as an expression of the library: names translated, every power written with **."""
    if kind == "temperature" and text in _TEMPERATURES:
        return _TEMPERATURES[text]
    text = re.sub(r"^1\s?(?=/)", "", text)

    def factor(match: re.Match[str]) -> str:
        return _unit_name(match[1]) + (f"**{int(match[2])}" if match[2] else "")

    spaced = re.sub(r"\s*/\s*", "/", re.sub(r"\s*\*\s*(?!\*)", "*", _ONE_FACTOR.sub(factor, text)))
    product = re.sub(r"\s+", "*", spaced)
    return "1" + product if product.startswith("/") else product


def parse_quantity(kind: str, words: object, name: str | None = None, bare_unit: str | None = None) -> float:
    """A user's words, such as '60 degC', as a plain number in the border unit of that kind of quantity.

    Parameters
    ----------
    kind : str
        One of QUANTITIES: temperature [K], pressure [Torr], density [cm^-3], field [gauss], length [cm], power [W],
        frequency [GHz].
    words : str
        One number and one unit; the unit may be a product of powers ('1/cm^3').
    name : str or None
        How the message calls the field; None means ``kind``.
    bare_unit : str or None
        Unit taken for a number without one; None refuses it.

    Returns
    -------
    value : float
        In the border unit [K, Torr, cm^-3, gauss, cm, W or GHz]; finite, > 0 (field and power: >= 0, frequency: any).

    Raises
    ------
    InputError
        No number, no or unknown unit, wrong dimension, not finite, negative, or zero where zero makes no sense. The
        message names the field, the words, the rule and an example.
    """
    if kind not in QUANTITIES:
        raise InputError(f"kind = {kind!r} must be one of {', '.join(QUANTITIES)}")
    quantity, label = QUANTITIES[kind], name or kind
    if bare_unit is not None and isinstance(words, int | float) and not isinstance(words, bool):
        words = repr(float(words))
    number, unit = _split(words, label, quantity)
    unit = unit or bare_unit or ""
    if not unit:
        raise _problem(label, words, "a unit is missing", quantity)
    if kind == "frequency" and not unit.lower().endswith("hz"):
        # A rate per second may mean radians: the unit library would take 1 rad/s for 1 Hz.
        raise _problem(label, words, f"{unit!r} is not in hertz", quantity)
    value = _convert(number, unit, words, label, quantity)
    if not math.isfinite(value):
        raise _problem(label, words, "the number must be finite", quantity)
    if (value < 0 and not quantity.signed) or (value == 0 and not quantity.zero_allowed):
        rule = "must not be negative" if quantity.zero_allowed else "must be above zero"
        if kind == "temperature":
            rule = f"is {value:g} K, and an absolute temperature must be above 0 K"
        raise _problem(label, words, rule, quantity)
    return value


def _convert(number: float, unit: str, words: object, label: str, quantity: Quantity) -> float:
    """The number in the border unit; InputError for unknown units and other dimensions."""
    import pint

    registry = _registry()
    try:
        parsed = registry.parse_units(_unit_expression(unit, quantity.name))
        return float(registry.Quantity(number, parsed).to(_PINT_UNITS[quantity.name]).magnitude)
    except pint.UndefinedUnitError as error:
        raise _problem(label, words, f"unit {unit!r} is not known", quantity) from error
    except pint.DimensionalityError as error:
        found = _dimension_name(registry, unit)
        rule = f"{unit!r} is {found}, but {label} must be {quantity.dimension}"
        if quantity.name == "pressure" and found == QUANTITIES["density"].dimension:
            rule += " (a density fixes the pressure only with a temperature: give it as the density)"
        raise _problem(label, words, rule, quantity) from error
    except OverflowError as error:
        raise _problem(label, words, "the number must be finite", quantity) from error
    except Exception as error:  # the library raises many types for units it dislikes; none may reach a user
        raise _problem(label, words, f"unit {unit!r} cannot be used", quantity) from error


def _dimension_name(registry: pint.UnitRegistry[Any], unit: str) -> str:
    """What the unit measures, in words where it is one of ours."""
    dimensions = registry.parse_units(_unit_expression(unit, "")).dimensionality
    for kind, standard in _PINT_UNITS.items():
        if registry.parse_units(standard).dimensionality == dimensions:
            return QUANTITIES[kind].dimension
    return f"of dimension {dimensions}" if dimensions else "dimensionless"


def parse_temperature(words: object, name: str = "temperature", bare_unit: str | None = None) -> float:
    """Temperature [K] from words such as '60 degC', '333 K', '140 degF'; see `parse_quantity` for the errors."""
    return parse_quantity("temperature", words, name, bare_unit)


def parse_pressure(words: object, name: str = "pressure", bare_unit: str | None = None) -> float:
    """Pressure [Torr] from words such as '20 Torr', '3 kPa', '5 mbar'; a density ('1 amagat') is refused."""
    return parse_quantity("pressure", words, name, bare_unit)


def parse_density(words: object, name: str = "density", bare_unit: str | None = None) -> float:
    """Number density [cm^-3] from words such as '1e19 cm^-3', '1e25 /m^3', '0.5 amagat'."""
    return parse_quantity("density", words, name, bare_unit)


def parse_field(words: object, name: str = "field", bare_unit: str | None = None) -> float:
    """Magnitude of a magnetic field [gauss] from words such as '0.5 G', '50 uT'; zero is allowed."""
    return parse_quantity("field", words, name, bare_unit)


def parse_length(words: object, name: str = "length", bare_unit: str | None = None) -> float:
    """Length [cm] from words such as '25 mm'."""
    return parse_quantity("length", words, name, bare_unit)


def parse_power(words: object, name: str = "power", bare_unit: str | None = None) -> float:
    """Power [W] from words such as '10 mW'; zero is allowed."""
    return parse_quantity("power", words, name, bare_unit)


def density_cm3(pressure_torr: ArrayLike, temperature_K: ArrayLike) -> NDArray[np.float64]:
    """Number density of an ideal gas, n = p/(k T) = 9.656500e18 p[Torr]/T[K] cm^-3.

    Parameters
    ----------
    pressure_torr : array, shape (...)
        Pressure [Torr]; >= 0.
    temperature_K : array, shape (...)
        Temperature at which that pressure was read [K]; > 0. A sealed cell keeps the density of its fill temperature.

    Returns
    -------
    n : array
        [cm^-3].

    Raises
    ------
    InputError
        Negative pressure, temperature not positive, not finite.

    Source
    ------
    Ideal gas law, CODATA k. At 1 atm the second virial term is below 0.1 % for He, Ne, Ar (common practice, no source).
    """
    p, T = np.asarray(pressure_torr, dtype=float), np.asarray(temperature_K, dtype=float)
    problems = []
    if not np.all((p >= 0) & (p < np.inf)):
        problems.append("pressure_torr must be finite and not negative [Torr]")
    if not np.all((T > 0) & (T < np.inf)):
        problems.append("temperature_K must be finite and above 0 [K]")
    if problems:
        raise InputError(problems)
    return p * constants.TORR_PA / (constants.BOLTZMANN_J_K * T) * 1e-6


def mhz_per_torr(rate: ArrayLike, temperature_K: ArrayLike) -> NDArray[np.float64]:
    """A width or shift coefficient per Torr at a temperature, k n(1 Torr, T)/2 pi = k * 1.536880e12 / T.

    Parameters
    ----------
    rate : array, shape (...)
        Width or shift per perturber density [rad/s cm^3].
    temperature_K : array, shape (...)
        Temperature at which the pressure is quoted [K]; > 0.

    Returns
    -------
    slope : array
        [MHz/Torr].

    Raises
    ------
    InputError
        As `density_cm3`.
    """
    return np.asarray(rate, dtype=float) * density_cm3(1.0, temperature_K) / constants.MHZ_RAD_S


def ghz_per_amagat(rate: ArrayLike) -> NDArray[np.float64]:
    """A width or shift coefficient per amagat (2.6868e19 cm^-3): k n/2 pi.

    Parameters
    ----------
    rate : array, shape (...)
        Width or shift per perturber density [rad/s cm^3].

    Returns
    -------
    slope : array, shape (...)
        [GHz/amagat].
    """
    return np.asarray(rate, dtype=float) * constants.AMAGAT_CM3 / constants.MHZ_RAD_S / 1e3


def mhz(rate: ArrayLike, density: ArrayLike) -> NDArray[np.float64]:
    """A width or shift at a density, k n/2 pi.

    Parameters
    ----------
    rate : array, shape (...)
        Width or shift per perturber density [rad/s cm^3].
    density : array, shape (...)
        Perturber density [cm^-3].

    Returns
    -------
    frequency : array
        [MHz].
    """
    return np.asarray(rate, dtype=float) * np.asarray(density, dtype=float) / constants.MHZ_RAD_S
