"""The rates of one pair as an ensemble: every stated error sampled together, and where the spread comes from.

Members are computed on coarse grids shared by all of them (`collisions.coarse`) and used only relative to the
undistorted curves on the same grids; the full answer sets the level. notes/ensemble.md.
"""

from __future__ import annotations

import operator
from collections.abc import Callable, Mapping, Sequence
from concurrent.futures import Executor
from os import PathLike
from typing import Any

import numpy as np
from numpy.typing import NDArray

from pertcalc import rates
from pertcalc.collisions.coarse import FamilyGrid, coarse_grids, coarse_rates
from pertcalc.collisions.pair import pair_of
from pertcalc.collisions.recipe import Key
from pertcalc.curves.curveset import CurveSet
from pertcalc.ensemble_result import Ensemble, method_name, value_of
from pertcalc.errors import InputError, UnknownNameError
from pertcalc.model_error import method_errors, moved_pair
from pertcalc.parallel import run_all
from pertcalc.results import CollisionRates
from pertcalc.sampling import changes, curve_inputs, draw, log_sd, method_inputs

Array = NDArray[np.float64]
Progress = Callable[[int, int], None]
Curves = CurveSet | str | PathLike[str]

# The closed form holds C6 alone, on straight paths: nothing to sample.
SAMPLED_METHODS = ("semiclassical", "quantum")
MOST_SAMPLES = 1 << 16
# Quantities that may change sign: their members are differences, not ratios, and their method error is added.
SIGNED = ("shift", "gain")
# Share of the progress bar that the undistorted answer takes [1].
_FIRST = 0.1


def ensemble(
    alkali: str,
    gas: str,
    temperature: float | Sequence[float],
    samples: int = 64,
    seed: int = 0,
    curves: Curves | None = None,
    method: str = "semiclassical",
    progress: Progress | None = None,
    executor: Executor | None = None,
    alternatives: Sequence[tuple[Curves, float]] = (),
) -> Ensemble:
    """Rates of a pair with every stated error of its curves, the method difference and the choice of curves sampled.

    Parameters
    ----------
    alkali, gas : str
        Symbols, such as "Rb", "Ar".
    temperature : float or sequence of float
        Gas temperatures [K].
    samples : int
        Members; 64 give every error to 9 %.
    seed : int
        The same seed gives the same members.
    curves : CurveSet, path or None
        Instead of the default of the pair.
    method : str
        "semiclassical" or "quantum": that of the undistorted answer. Members deviate from it as the semiclassical
        method says.
    progress : callable or None
        Called with (done, total).
    executor : Executor or None
        A pool that shares the members.
    alternatives : sequence of (curves, weight)
        Other curve sets of the pair that may be the right one, weights [1] relative to 1 of the first.

    Returns
    -------
    Ensemble
        An interrupt (KeyboardInterrupt) keeps the finished members.

    Raises
    ------
    UnknownNameError, InputError, DataFileError, OutOfRangeError, NotConvergedError
        As `collision_rates`; also for a bad number of samples, seed, weight, or a method that is not sampled.
    """
    count = _whole("samples", samples, 2, MOST_SAMPLES)
    start = _whole("seed", seed, 0, 2**32 - 1)
    if method not in SAMPLED_METHODS:
        raise UnknownNameError("method of an ensemble", str(method), SAMPLED_METHODS)
    T = rates.temperatures_of(temperature)
    weights = [1.0, *(_weight(weight) for _, weight in alternatives)]
    report = progress or (lambda done, total: None)
    first = _stage(report, 0.0, _FIRST / len(weights))
    nominals = [rates.collision_rates(alkali, gas, list(T), method, curves, first)]
    sets = [rates.load_curves(nominals[0].alkali, gas, one) for one in (curves, *(one for one, _ in alternatives))]
    for k, other in enumerate(sets[1:], start=1):
        stage = _stage(report, _FIRST * k / len(sets), _FIRST / len(sets))
        nominals.append(rates.collision_rates(alkali, gas, list(T), method, other, stage))
    inputs = curve_inputs(sets) + (method_inputs() if method == "semiclassical" else ())
    z, chosen = draw(count, inputs, sets, weights, start)
    grids = [coarse_grids(pair_of(one), T) for one in sets]
    bases = [coarse_rates(pair_of(one), T, grid) for one, grid in zip(sets, grids, strict=True)]
    tasks = {str(i): (sets[k], changes(inputs, z[i], sets[k]), T, grids[k]) for i, k in enumerate(map(int, chosen))}
    outcome = run_all(_member, tasks, executor, _stage(report, _FIRST, 1 - _FIRST))
    if outcome.failed and not outcome.done and not outcome.interrupted:
        raise next(iter(outcome.failed.values()))
    done = sorted(map(int, outcome.done))
    own = [nominals[k] for k in chosen[done]]
    coarse = [(bases[chosen[i]][0], outcome.done[str(i)][0]) for i in done]
    found = {key: _samples(key, coarse, own).reshape(len(done), T.size) for key in bases[0][0]}
    if method == "semiclassical":
        errors = [method_errors(one, T) for one in sets]
        for key, values in found.items():
            column = z[done, [one.name for one in inputs].index(method_name(key))]
            sizes = np.array([errors[k][key] for k in chosen[done]]).reshape(values.shape)
            found[key] = _with_method(key, values, own, sizes, column[:, None])
    return Ensemble(
        nominal=nominals[0],
        inputs=inputs,
        z=z[done],
        chosen=chosen[done],
        sets=tuple(one.id for one in sets),
        samples=found,
        asked=count,
        seed=start,
        work=_work([*(work for _, work in bases), *(work for _, work in outcome.done.values())]),
        interrupted=outcome.interrupted,
        failed={number: str(error) for number, error in outcome.failed.items()},
    )


def _member(
    curves: CurveSet,
    moved: dict[str, dict[str, float]],
    temperatures: Array,
    grids: Mapping[str, FamilyGrid],
    progress: Progress | None = None,
) -> tuple[dict[Key, Array], dict[str, int]]:
    """Coarse rates [au] of one member and their work."""
    found = coarse_rates(moved_pair(curves, moved), temperatures, grids)
    if progress is not None:
        progress(1, 1)
    return found


def _samples(
    key: Key, coarse: list[tuple[Mapping[Key, Array], Mapping[Key, Array]]], nominals: list[CollisionRates]
) -> Array:
    """Samples (m, n) of one rate from (undistorted, distorted) coarse rates and the full answer of every member.

    Ratios for what is positive, differences for shifts (in units of the width: both are one amplitude). The gain is
    the transfer times the orientation each transfer carries, and that share is what changes by a difference.
    """
    rows = []
    for (base, moved), nominal in zip(coarse, nominals, strict=True):
        full = value_of(nominal, key)
        if key[0] == "shift":
            width = ("fwhm", key[1])
            rows.append(full + (moved[key] - base[key]) * value_of(nominal, width) / base[width])
        elif key[0] == "gain":
            flow = ("transfer", key[1])
            through = value_of(nominal, flow)
            carried = full / through + moved[key] / moved[flow] - base[key] / base[flow]
            rows.append(carried * through * moved[flow] / base[flow])
        else:
            rows.append(full * moved[key] / base[key])
    return np.array(rows)


def _with_method(key: Key, values: Array, nominals: list[CollisionRates], errors: Array, z: Array) -> Array:
    """Samples (m, n) with the method error (m, n) [1] of this rate added (signed rates) or multiplied on."""
    if key[0] not in SIGNED:
        return values * np.exp(log_sd(errors) * z)
    size = np.array([np.abs(value_of(nominal, key)) for nominal in nominals]).reshape(values.shape)
    return values + errors * size * z


def _whole(name: str, value: Any, low: int, high: int) -> int:
    rule = f"{name} = {value!r:.40} must be a whole number from {low} to {high}"
    try:
        number = operator.index(value)
    except TypeError as error:
        raise InputError(rule) from error
    if isinstance(value, bool) or not low <= number <= high:
        raise InputError(rule)
    return number


def _weight(value: Any) -> float:
    try:
        weight = float(value)
    except (TypeError, ValueError):
        weight = float("nan")
    if not 0 < weight < np.inf:
        raise InputError(f"weight = {value!r:.40} of an alternative curve set must be a positive number, such as 1")
    return weight


def _stage(report: Progress, before: float, share: float) -> Progress:
    """Progress of one stage as its part of 1000."""
    return lambda done, total: report(int(1000 * (before + share * done / max(total, 1))), 1000)


def _work(counts: Sequence[Mapping[str, int]]) -> dict[str, int]:
    return {name: sum(one[name] for one in counts) for name in counts[0]}
