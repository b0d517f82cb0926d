"""How far the rates can be trusted beyond the arithmetic: the curves' stated errors and the method's own.

Curve part: every stated relative error (De, Re, C6 of X, A, B) is applied in turn, the rates are computed again on
coarse grids, and the changes are added in quadrature. For the default sets that was done once, at three temperatures,
by notes/scripts/make_model_errors.py; for a user's curves it is done on the spot. Method part: the deviation of the
semiclassical from the quantum method on the same curves, by notes/scripts/compare_methods.py. notes/model-error.md.
"""

from __future__ import annotations

import json
from collections.abc import Callable, Mapping
from dataclasses import replace
from functools import cache
from importlib import resources
from typing import Any

import numpy as np
from numpy.typing import NDArray

from pertcalc.collisions.pair import CollisionPair, pair_of
from pertcalc.collisions.recipe import FAMILIES, Key, averaged, family_tables, thermal_rates
from pertcalc.curves.curveset import CurveSet
from pertcalc.curves.deform import PARAMETERS, Deformed

Array = NDArray[np.float64]
Progress = Callable[[int, int], None]

_CURVES = "model_errors.json"
_METHODS = "method_differences.json"
# A pair that was compared may agree by chance at one temperature: never better than this quantile of its rate.
CHANCE = 0.5
# A pair that was not compared may be one of the worse ones.
UNKNOWN = 0.9


def method_errors(curves: CurveSet, temperatures: Array) -> dict[Key, Array]:
    """Relative error of the semiclassical method for every rate [1], shape (n,), from the comparison with quantum.

    Parameters
    ----------
    curves : CurveSet
        A default set was compared itself (and counts at least with the median of all pairs); any other gets the 90 %
        quantile of all pairs.
    temperatures : ndarray, shape (n,)
        [K]; interpolated, constant outside 300 ... 500 K.

    Returns
    -------
    dict
    """
    compared = _shipped(_METHODS)
    own = compared.get(curves.sha256)
    found = {}
    for name in next(iter(compared.values()))["relative"]:
        all_pairs = np.concatenate([entry["relative"][name] for entry in compared.values()])
        typical = float(np.quantile(all_pairs, UNKNOWN if own is None else CHANCE))
        error = np.full(temperatures.shape, typical)
        if own is not None:
            error = np.maximum(error, np.interp(temperatures, own["temperatures_K"], own["relative"][name]))
        found[tuple(name.split(" "))] = error
    return found


def deformed_pair(curves: CurveSet, state: str, parameter: str, change: float) -> CollisionPair:
    """The colliding pair with one parameter of one curve moved.

    Parameters
    ----------
    curves : CurveSet
    state, parameter : str
        "X", "A" or "B"; one of `deform.MOVABLE`.
    change : float
        Relative change [1].

    Returns
    -------
    CollisionPair
    """
    return moved_pair(curves, {state: {parameter: change}})


def moved_pair(curves: CurveSet, changes: Mapping[str, Mapping[str, float]]) -> CollisionPair:
    """The colliding pair with any parameters of its curves moved together.

    Parameters
    ----------
    curves : CurveSet
    changes : mapping
        State "X", "A" or "B" to parameter (of `deform.MOVABLE`) to relative change [1].

    Returns
    -------
    CollisionPair
    """
    pair = pair_of(curves)
    moved = {state: Deformed(curves.states[state].curve, **change) for state, change in changes.items()}
    isotropic, anisotropy = np.array(pair.isotropic), pair.anisotropy
    for state, curve in moved.items():
        base = curve.base
        extra = np.subtract(curve.dispersion, (base.C6, base.C8, base.C10))
        isotropic += {"X": -1.0, "A": 2 / 3, "B": 1 / 3}[state] * extra
        anisotropy += {"X": 0.0, "A": -1.0, "B": 1.0}[state] * float(extra[0])
    first, second, third = (float(value) for value in isotropic)
    curve_of: dict[str, Any] = dict(moved)
    return replace(pair, **curve_of, isotropic=(first, second, third), anisotropy=anisotropy)


def curve_errors(curves: CurveSet, temperatures: Array, progress: Progress | None = None) -> dict[Key, Array]:
    """Relative errors of every rate from the stated errors of the curves.

    Parameters
    ----------
    curves : CurveSet
    temperatures : ndarray, shape (n,)
        [K].
    progress : callable or None
        Called with (done, total) after every moved parameter.

    Returns
    -------
    dict
        Rate key to relative error [1], shape (n,).
    """
    moves = [
        (state, parameter, curves.states[state].uncertainty[parameter])
        for state in ("X", "A", "B")
        for parameter in PARAMETERS
        if curves.states[state].uncertainty.get(parameter)
    ]
    pair = pair_of(curves)
    tables = family_tables(pair, temperatures, quick=True)
    base = _rates(pair, temperatures, tables)
    squares = {key: np.zeros(temperatures.shape) for key in base}
    for i, (state, parameter, change) in enumerate(moves):
        moved = deformed_pair(curves, state, parameter, change)
        # The ground curve drives no path and enters the lines alone; what else changes is noise of the grids.
        families = ("lower", "pi") if state == "X" else FAMILIES
        found = _rates(moved, temperatures, {**tables, **family_tables(moved, temperatures, None, families, True)})
        for key in found if state != "X" else [key for key in found if key[0] in ("fwhm", "shift")]:
            rate = found[key]
            squares[key] += ((rate - base[key]) / np.where(base[key] == 0, np.inf, base[key])) ** 2
        if progress is not None:
            progress(i + 1, len(moves))
    return {key: np.sqrt(square) for key, square in squares.items()}


def _rates(pair: CollisionPair, temperatures: Array, tables: Mapping) -> dict[Key, Array]:
    return {
        key: np.array([average.rate for average in row])
        for key, row in averaged(thermal_rates, pair, temperatures, tables).items()
    }


@cache
def _shipped(name: str) -> dict:
    return json.loads((resources.files("pertcalc") / "data" / name).read_text(encoding="utf-8"))


def shipped_errors(curves: CurveSet, temperatures: Array) -> dict[Key, Array] | None:
    """Curve errors of a default set, interpolated in temperature [K], or None if this file was not tabulated."""
    entry = _shipped(_CURVES).get(curves.sha256)
    if entry is None:
        return None
    return {
        tuple(name.split(" ")): np.interp(temperatures, entry["temperatures_K"], values)
        for name, values in entry["relative"].items()
    }


def model_errors(
    curves: CurveSet, temperatures: Array, method: str = "semiclassical", progress: Progress | None = None
) -> dict[Key, Array]:
    """Relative model error of every rate: that of the curves and, for the semiclassical method, its own in quadrature.

    Parameters
    ----------
    curves : CurveSet
    temperatures : ndarray, shape (n,)
        [K].
    method : str
        "semiclassical" or "quantum", which adds nothing: it is exact on its curves.
    progress : callable or None
        Called with (done, total) when the errors of the curves must be computed.

    Returns
    -------
    dict
        Rate key to relative error [1], shape (n,).
    """
    found = shipped_errors(curves, temperatures)
    if found is None:
        found = curve_errors(curves, temperatures, progress)
    if method != "semiclassical":
        return found
    own = method_errors(curves, temperatures)
    return {key: np.hypot(error, own[key]) for key, error in found.items()}
