"""The one function that answers "what are the collision rates of this pair"."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import replace
from os import PathLike

import numpy as np
from numpy.typing import NDArray

from pertcalc import species
from pertcalc.closed import closed_form_result
from pertcalc.collisions import quantum, recipe
from pertcalc.collisions.pair import CollisionPair, pair_of
from pertcalc.collisions.recipe import Key, ThermalRates, averaged
from pertcalc.collisions.semiclassical import CrossSections
from pertcalc.constants import AU_RATE_CM3_S, KELVIN_HARTREE
from pertcalc.curves import files
from pertcalc.curves.curveset import CurveSet
from pertcalc.errors import InputError, NotConvergedError, OutOfRangeError, UnknownNameError
from pertcalc.model_error import model_errors
from pertcalc.names import METHODS
from pertcalc.results import LEVEL_UNIT, LINE_UNIT, Coefficient, CollisionRates
from pertcalc.thermal import HIGHEST

Array = NDArray[np.float64]
Progress = Callable[[int, int], None]

# Below this the classical paths mean nothing: the de Broglie wavelength is as long as the collision [K].
T_LOWEST, T_HIGHEST = 20.0, 2000.0
# Relative numerical error of a width beyond which nothing is answered (exit code 3).
WIDTH_WANTED = 0.1
# Differences of grids can vanish by chance; no rate is called better than this.
NUMERICAL_FLOOR = 0.002
# A shift may be small by cancellation: its error is at least this share of the full width.
SHIFT_FLOOR = 0.001
# (first, every, weight): the energy grids whose averages are compared with the full one. A third of the energies
# misses more than a half does: its change counts less.
THINNINGS = ((0, 2, 1.0), (1, 2, 1.0), (0, 3, 1 / 3), (1, 3, 1 / 3))
# What makes the tables of a method and what turns them into rates.
DYNAMICS: dict[str, tuple[Callable[..., dict[str, CrossSections]], ThermalRates]] = {
    "semiclassical": (recipe.family_tables, recipe.thermal_rates),
    "quantum": (quantum.level_tables, quantum.thermal_rates),
}
RANKS = {"P1/2": (1,), "P3/2": (1, 2, 3)}
LINES = {"D1": "P1/2", "D2": "P3/2"}


def temperatures_of(temperature: float | Iterable[float]) -> Array:
    """One or many temperatures as an array, shape (n,) [K].

    Raises
    ------
    InputError, OutOfRangeError
        Not a number, not positive, or outside what classical paths and the curves' walls support.
    """
    rule = f"temperature = {temperature!r:.60} must be a number or a list of numbers [K], such as 333.15"
    try:
        values = np.atleast_1d(np.asarray(temperature, dtype=float))
    except (TypeError, ValueError) as error:
        raise InputError(rule) from error
    if values.ndim != 1 or values.size == 0:
        raise InputError(rule)
    for T in values:
        if not np.isfinite(T) or T <= 0:
            raise InputError(f"temperature = {T:g} K must be a positive number; give kelvin, such as 333.15")
        if not T_LOWEST <= T <= T_HIGHEST:
            raise OutOfRangeError(
                "temperature", T, T_LOWEST, T_HIGHEST, "K", "Choose a temperature of a gas cell within this range."
            )
    return values


def load_curves(alkali: str, noble_gas: str, curves: CurveSet | str | PathLike[str] | None) -> CurveSet:
    """The curve set to use: the default of the pair, a user's file, or a set already loaded; checked for the pair."""
    if curves is None:
        return files.load_default(alkali, noble_gas)
    loaded = curves if isinstance(curves, CurveSet) else files.load(curves)
    return files.for_pair(loaded, alkali, noble_gas)


def check_walls(curves: CurveSet, temperatures: Array) -> None:
    """Refuse temperatures whose fast collisions climb above the walls the curves support (OutOfRangeError)."""
    for name in ("X", "A", "B"):
        top = curves.states[name].curve.wall_top / KELVIN_HARTREE
        highest = top / HIGHEST * 2
        if temperatures.max() > highest:
            raise OutOfRangeError(
                "temperature",
                float(temperatures.max()),
                T_LOWEST,
                highest,
                "K",
                f"The wall of curve {name} of {curves.id} ends at {top:.0f} K; extend the curve or cool the gas.",
            )


def collision_rates(
    alkali: str,
    noble_gas: str,
    temperature: float | Sequence[float],
    method: str = "semiclassical",
    curves: CurveSet | str | PathLike[str] | None = None,
    progress: Progress | None = None,
) -> CollisionRates:
    """Collision rates of an alkali atom with a noble gas, per unit perturber density.

    Parameters
    ----------
    alkali, noble_gas : str
        Symbols, such as "Rb", "Ar", "3He".
    temperature : float or sequence of float
        Gas temperatures [K]; all are answered from one table of cross sections.
    method : str
        "semiclassical" (default), "quantum" or "closed-form".
    curves : CurveSet, path or None
        A curve file or set instead of the default of the pair.
    progress : callable or None
        Called with (done, total) as the work goes on.

    Returns
    -------
    CollisionRates
        Widths and shifts [rad s^-1 cm^3], losses and transfers [cm^3 s^-1], with errors and origin.

    Raises
    ------
    UnknownNameError, InputError, DataFileError, OutOfRangeError
    NotConvergedError
        The numerical error of a width exceeds 10 %.
    """
    T = temperatures_of(temperature)
    if method not in METHODS:
        raise UnknownNameError("method", method, METHODS)
    loaded = load_curves(species.alkali_symbol(alkali), noble_gas, curves)
    check_walls(loaded, T)
    pair = pair_of(loaded)
    if method == "closed-form":
        return closed_form_result(loaded, pair, T)
    make, average = DYNAMICS[method]
    tables = make(pair, T, progress)
    return assemble(loaded, pair, T, method, average, tables, model_errors(loaded, T, method, progress))


def _variants(tables: Mapping[str, CrossSections]) -> list[Mapping[str, CrossSections]]:
    """The same tables with every second impact parameter, the step error added, and on four thinner energy grids."""
    return [
        {name: replace(t, sigma=t.half_grid) for name, t in tables.items()},
        {name: replace(t, sigma=t.sigma + t.step_change) for name, t in tables.items()},
        *({name: t.thinned(first, every) for name, t in tables.items()} for first, every, _ in THINNINGS),
    ]


def numerical_error(rate: Array, variants: list[Array], least: Array | float = 0.0) -> Array:
    """Relative numerical error [1] of rates from the same rates on the tables of `_variants`, shape of rate.

    The change with every second impact parameter, the step error and the largest change on a thinner energy grid (an
    undulation of sigma(E) may hide from one of them; weights as in THINNINGS), added; never below NUMERICAL_FLOOR nor
    the absolute `least`.
    """
    half, step, *thinned = (np.abs(variant - rate) for variant in variants)
    energies = np.max([weight * change for (*_, weight), change in zip(THINNINGS, thinned, strict=True)], axis=0)
    total = np.maximum(half + step + energies, least)
    return np.maximum(total / np.maximum(np.abs(rate), 1e-300), NUMERICAL_FLOOR)


def require_converged(what: str, coefficient: Coefficient) -> None:
    """NotConvergedError, with the best value and its error, where the numerical error of a width exceeds WIDTH_WANTED.

    A width is the sturdiest of all rates: when it fails, the curves are not what the grids were made for. Small rates
    (shifts near zero, tiny transfers) may have large relative errors; they are shown, not refused.
    """
    errors = coefficient.numerical_error
    if errors is None or coefficient.values is None:
        return
    worst = int(np.argmax(errors))
    if not errors[worst] <= WIDTH_WANTED:
        raise NotConvergedError(what, float(coefficient.values[worst]), float(errors[worst]), WIDTH_WANTED)


def assemble(
    curves: CurveSet,
    pair: CollisionPair,
    temperatures: Array,
    method: str,
    average: ThermalRates,
    tables: Mapping[str, CrossSections],
    model: Mapping[Key, Array],
) -> CollisionRates:
    """Thermal rates with their numerical errors from tables already computed, and the model errors by rate key."""
    best, *others = (averaged(average, pair, temperatures, variant) for variant in (tables, *_variants(tables)))

    def coefficient(key: Key, unit: str) -> Coefficient:
        rate = np.array([a.rate for a in best[key]])
        width = [a.rate for a in best["fwhm", key[1]]] if key[0] == "shift" else [0.0]
        variants = [np.array([a.rate for a in other[key]]) for other in others]
        error = numerical_error(rate, variants, SHIFT_FLOOR * np.array(width))
        exponent = np.array([a.exponent for a in best[key]])
        return Coefficient(unit, rate * AU_RATE_CM3_S, error, model[key], exponent)

    widths = {line: coefficient(("fwhm", line), LINE_UNIT) for line in LINES}
    for line, width in widths.items():
        require_converged(f"full width of {line}", width)
    work = {name: sum(table.work[name] for table in tables.values()) for name in next(iter(tables.values())).work}
    return CollisionRates(
        alkali=curves.alkali,
        noble_gas=curves.noble_gas,
        method=method,
        curves_id=curves.id,
        curves_sha256=curves.sha256,
        temperatures=temperatures,
        reduced_mass=pair.reduced_mass,
        fwhm=widths,
        shift={line: coefficient(("shift", line), LINE_UNIT) for line in LINES},
        multipole_loss={
            level: {K: coefficient(("loss", level, str(K)), LEVEL_UNIT) for K in ranks}
            for level, ranks in RANKS.items()
        },
        transfer={level: coefficient(("transfer", level), LEVEL_UNIT) for level in RANKS},
        multipole_transfer={level: {1: coefficient(("gain", level, "1"), LEVEL_UNIT)} for level in RANKS},
        work=work,
        origin={state: f"{curve.mark}: {curve.source.cite}" for state, curve in curves.states.items()},
    )
