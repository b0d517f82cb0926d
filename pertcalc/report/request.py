"""What a report is asked for: alkali, gases, conditions of the cell, method, curves; checked once, at the door."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from os import PathLike

from pertcalc.curves.curveset import CurveSet
from pertcalc.curves.files import for_pair, load
from pertcalc.errors import InputError
from pertcalc.species import GASES, alkali_symbol, noble_gas_symbol
from pertcalc.vapour.fill import Fill, fill_or_defaults

DEFAULT_METHOD = "semiclassical"


@dataclass(frozen=True, slots=True)
class Request:
    """A checked order for a report.

    ``alkali`` and ``gases`` symbols; ``fill`` the conditions; ``method`` of the rates; ``curves`` a set that replaces
    the default one (then there is exactly one gas), else None; ``defaults`` names of the conditions nobody gave.
    """

    alkali: str
    gases: tuple[str, ...]
    fill: Fill
    method: str
    curves: CurveSet | None
    defaults: tuple[str, ...]


def make_request(
    alkali: str,
    gases: Sequence[str] = (),
    *,
    temperature_K: float | None = None,
    pressure_torr: float | None = None,
    fill_temperature_K: float | None = None,
    field_G: float | None = None,
    method: str = DEFAULT_METHOD,
    curves: str | PathLike[str] | None = None,
) -> Request:
    """Fill in the defaults and check every value.

    Parameters
    ----------
    alkali : str
        Symbol of the alkali.
    gases : sequence of str
        Symbols of the gases; empty for He, Ne, Ar, Kr and Xe, or for the gas of ``curves``.
    temperature_K, pressure_torr, fill_temperature_K, field_G : float or None
        Conditions [K, Torr, K, G]; None takes the default of pertcalc.vapour.fill.
    method : str
        Name of the method of the rates.
    curves : str, path or None
        A curve file in place of the default set.

    Returns
    -------
    Request

    Raises
    ------
    UnknownNameError, InputError
        A name or a value breaks its rule.
    DataFileError
        The curve file cannot be used.
    """
    symbol = alkali_symbol(alkali)
    fill, defaults = fill_or_defaults(symbol, temperature_K, pressure_torr, fill_temperature_K, field_G)
    curve_set = None if curves is None else load(curves)
    chosen = _gases(gases, curve_set)
    if curve_set is not None:
        check_pair(curve_set, symbol, chosen[0])
    return Request(symbol, chosen, fill, method, curve_set, defaults)


def _gases(names: Sequence[str], curves: CurveSet | None) -> tuple[str, ...]:
    """Symbols in the order given, each once; a curve file brings its own gas."""
    if curves is None:
        return tuple(dict.fromkeys(noble_gas_symbol(name) for name in names)) or GASES
    chosen = tuple(dict.fromkeys(names)) or (curves.noble_gas,)
    if len(chosen) > 1:
        raise InputError(
            f"--gas = {', '.join(chosen)}: a curve file holds one pair, so give exactly one gas with --curves."
        )
    return chosen if chosen[0] == curves.noble_gas else (noble_gas_symbol(chosen[0]),)


def check_pair(curves: CurveSet, alkali: str, gas: str | None) -> None:
    """InputError unless a curve set belongs to the alkali and, where it is given, the gas (any label of its own)."""
    for_pair(curves, alkali, gas or curves.noble_gas)
