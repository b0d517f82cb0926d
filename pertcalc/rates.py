"""The one function that answers "what are the collision rates of this pair"."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import replace
from os import PathLike

import numpy as np
from numpy.typing import NDArray

from pertcalc import species
from pertcalc.collisions.pair import CollisionPair
from pertcalc.collisions.recipe import FAMILIES, thermal_rates
from pertcalc.collisions.semiclassical import CrossSections, cross_sections
from pertcalc.constants import AMU_AU, AU_RATE_CM3_S, HARTREE_CM1, KELVIN_HARTREE
from pertcalc.curves import files
from pertcalc.curves.curveset import CurveSet
from pertcalc.errors import InputError, OutOfRangeError, UnknownNameError
from pertcalc.results import LEVEL_UNIT, LINE_UNIT, Coefficient, CollisionRates
from pertcalc.thermal import HIGHEST, Average, effort, energy_grid

Array = NDArray[np.float64]
Progress = Callable[[int, int], None]
Key = tuple[str, ...]

METHODS = ("semiclassical", "closed-form")
# Below this the classical paths mean nothing: the de Broglie wavelength is as long as the collision [K].
T_LOWEST, T_HIGHEST = 20.0, 2000.0
STEP_SHARE = {"lower": 1.0, "pi": 0.6, "upper": 0.6}
RANKS = {"P1/2": (1,), "P3/2": (1, 2, 3)}
LINES = {"D1": "P1/2", "D2": "P3/2"}


def temperatures_of(temperature: float | Iterable[float]) -> Array:
    """One or many temperatures as an array, shape (n,) [K].

    Raises
    ------
    InputError, OutOfRangeError
        Not a number, not positive, or outside what classical paths and the curves' walls support.
    """
    values = np.atleast_1d(np.asarray(temperature, dtype=float))
    if values.ndim != 1 or values.size == 0:
        raise InputError("temperature must be a number or a list of numbers [K], such as 333.15")
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
    files.require_pair(loaded, alkali, noble_gas)
    return loaded


def pair_of(curves: CurveSet) -> CollisionPair:
    """What the dynamics needs of a curve set: reduced mass, splitting, curves, dispersion differences."""
    atom = species.alkali(curves.alkali)
    mass = curves.mass_alkali_u or atom.mass_u.value
    perturber = curves.mass_perturber_u or species.noble_gas(curves.noble_gas).mass_u.value
    splitting = atom.fine_structure_cm1.value if curves.splitting_cm1 is None else curves.splitting_cm1
    X, A, B = curves.X, curves.A, curves.B
    isotropic = tuple((getattr(B, C) + 2 * getattr(A, C)) / 3 - getattr(X, C) for C in ("C6", "C8", "C10"))
    return CollisionPair(
        reduced_mass=mass * perturber / (mass + perturber) * AMU_AU,
        splitting=splitting / HARTREE_CM1,
        X=X,
        A=A,
        B=B,
        isotropic=isotropic,  # type: ignore[arg-type]
        anisotropy=B.C6 - A.C6,
    )


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
        "semiclassical" (default) or "closed-form".
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
    """
    T = temperatures_of(temperature)
    if method not in METHODS:
        raise UnknownNameError("method", method, METHODS)
    loaded = load_curves(species.alkali_symbol(alkali), noble_gas, curves)
    check_walls(loaded, T)
    pair = pair_of(loaded)
    if method == "closed-form":
        from pertcalc.closed import closed_form_result

        return closed_form_result(loaded, pair, T)
    tables = semiclassical_tables(pair, T, progress)
    return semiclassical_result(loaded, pair, T, tables)


def semiclassical_tables(
    pair: CollisionPair, temperatures: Array, progress: Progress | None = None
) -> dict[str, CrossSections]:
    """Cross sections of the three path families for these temperatures [K]."""
    energy = energy_grid(temperatures)
    density = effort(energy, temperatures, 0.35, 0.3)
    fast = KELVIN_HARTREE * temperatures.min()
    tables = {}
    for i, family in enumerate(FAMILIES):

        def report(done: int, total: int, i: int = i) -> None:
            if progress is not None:
                progress(i * total + done, len(FAMILIES) * total)

        # Only the transfer, taken from the lower curve and from fast collisions, needs every step.
        steps = np.where(energy > fast, 1.0, effort(energy, temperatures, 0.2, 0.5)) * STEP_SHARE[family]
        tables[family] = cross_sections(pair, family, energy, density, steps, progress=report)
    return tables


def _variants(tables: Mapping[str, CrossSections]) -> list[Mapping[str, CrossSections]]:
    """The same tables with every second impact parameter, every second energy, and the step error added."""
    return [
        {name: replace(t, sigma=t.half_grid) for name, t in tables.items()},
        {name: t.thinned() for name, t in tables.items()},
        {name: replace(t, sigma=t.sigma + t.step_change) for name, t in tables.items()},
    ]


def averaged(pair: CollisionPair, temperatures: Array, tables: Mapping[str, CrossSections]) -> dict[Key, list[Average]]:
    """Every thermal rate [au] at every temperature [K]."""
    rows = [thermal_rates(tables, pair.splitting, float(T), pair.reduced_mass) for T in temperatures]
    return {key: [row[key] for row in rows] for key in rows[0]}


def semiclassical_result(
    curves: CurveSet, pair: CollisionPair, temperatures: Array, tables: Mapping[str, CrossSections]
) -> CollisionRates:
    """Thermal rates with their numerical errors, from tables that were already computed."""
    best = averaged(pair, temperatures, tables)
    others = [averaged(pair, temperatures, variant) for variant in _variants(tables)]

    def coefficient(key: Key, unit: str) -> Coefficient:
        rate = np.array([a.rate for a in best[key]])
        changes = [np.abs(np.array([a.rate for a in other[key]]) - rate) for other in others]
        error = np.sum(changes, axis=0) / np.maximum(np.abs(rate), 1e-300)
        exponent = np.array([a.exponent for a in best[key]])
        return Coefficient(unit, rate * AU_RATE_CM3_S, error, None, exponent)

    work = {"paths": 0, "exponentials": 0, "energies": int(tables["lower"].energy.size)}
    for table in tables.values():
        for name, count in table.work.items():
            work[name] += count
    return CollisionRates(
        alkali=curves.alkali,
        noble_gas=curves.noble_gas,
        method="semiclassical",
        curves_id=curves.id,
        curves_sha256=curves.sha256,
        temperatures=temperatures,
        reduced_mass=pair.reduced_mass,
        fwhm={line: coefficient(("fwhm", line), LINE_UNIT) for line in LINES},
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
