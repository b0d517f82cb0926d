"""Inputs of an ensemble: which parameters of the curves are uncertain, and how samples of them are drawn.

Every input is a standard normal z; the factor of a parameter with relative error u is exp(s z), s = sqrt(ln(1 + u^2)):
the stated value is the median, small errors are normal ones, large ones keep a depth positive. notes/ensemble.md.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from pertcalc.curves.correlation import correlation_matrix
from pertcalc.curves.curveset import STATES, CurveSet
from pertcalc.curves.deform import MOVABLE

Array = NDArray[np.float64]

# Rates whose method errors go together: one z for each group.
METHOD_GROUPS = {"fwhm": "widths", "shift": "shifts", "loss": "losses", "transfer": "transfer", "gain": "transfer"}
# Quasi-random coordinates are kept this far from 0 and 1 (6 sd).
_EDGE = 1e-9


@dataclass(frozen=True, slots=True)
class Input:
    """One uncertain input: ``kind`` "curve" (of a ``state`` and ``parameter``) or "method" (of a group of rates).

    ``relative`` is the stated relative error [1]; 0 for a method, whose error differs from rate to rate.
    """

    name: str
    kind: str
    state: str = ""
    parameter: str = ""
    relative: float = 0.0


def log_sd(relative: ArrayLike) -> Array:
    """Standard deviation of ln(factor) [1] of a log-normal factor with relative error ``relative`` [1], its shape."""
    return np.sqrt(np.log1p(np.square(relative)))


def curve_inputs(sets: Sequence[CurveSet]) -> tuple[Input, ...]:
    """Every parameter that at least one set states an error of; ``relative`` is that of the first set (0 if none)."""
    found = []
    for state in STATES:
        for parameter in MOVABLE:
            errors = [one.states[state].uncertainty.get(parameter, 0.0) for one in sets]
            if any(errors):
                found.append(Input(f"{state}.{parameter}", "curve", state, parameter, errors[0]))
    return tuple(found)


def method_inputs() -> tuple[Input, ...]:
    """One input for every group of METHOD_GROUPS."""
    return tuple(Input(f"method.{group}", "method") for group in dict.fromkeys(METHOD_GROUPS.values()))


def mixing(inputs: Sequence[Input], curves: CurveSet) -> Array:
    """Matrix L (n, n) [1] that gives independent z the correlations a set states: z = L times them (Cholesky)."""
    matrix = np.eye(len(inputs))
    for state in STATES:
        place = [i for i, one in enumerate(inputs) if one.state == state]
        if place and curves.states[state].correlation:
            names = [inputs[i].parameter for i in place]
            block = correlation_matrix(names, curves.states[state].correlation)
            matrix[np.ix_(place, place)] = np.linalg.cholesky(block)
    return matrix


def draw(
    samples: int, inputs: Sequence[Input], sets: Sequence[CurveSet], weights: Sequence[float], seed: int
) -> tuple[Array, NDArray[np.intp]]:
    """Samples of every input and of the choice between curve sets.

    Scrambled Sobol points (Owen), mapped to normal coordinates; the last coordinate picks the set.

    Parameters
    ----------
    samples : int
        m.
    inputs : sequence of n Input
    sets : sequence of CurveSet
    weights : sequence of float
        Relative weights of the sets [1].
    seed : int
        The same seed gives the same samples.

    Returns
    -------
    z : ndarray, shape (m, n)
        Standard normal inputs, correlated as the chosen set states [1].
    chosen : ndarray of int, shape (m,)
        Index of the set [1].

    Source
    ------
    scipy.stats.qmc.Sobol.
    """
    from scipy.special import ndtri
    from scipy.stats import qmc

    power = max(1, int(np.ceil(np.log2(samples))))
    points = qmc.Sobol(len(inputs) + 1, scramble=True, seed=seed).random_base2(power)[:samples]
    edges = np.cumsum(weights)[:-1] / np.sum(weights)
    chosen = np.searchsorted(edges, points[:, -1], side="right")
    z = ndtri(np.clip(points[:, :-1], _EDGE, 1 - _EDGE))
    for k, curves in enumerate(sets):
        z[chosen == k] = z[chosen == k] @ mixing(inputs, curves).T
    return z, chosen


def changes(inputs: Sequence[Input], z: Array, curves: CurveSet) -> dict[str, dict[str, float]]:
    """What `moved_pair` takes: relative changes [1] by state and parameter, from one sample z (n,) [1] of the inputs.

    Parameters with no error in this set stay as they are.
    """
    found: dict[str, dict[str, float]] = {state: {} for state in STATES}
    for one, value in zip(inputs, z, strict=True):
        error = curves.states[one.state].uncertainty.get(one.parameter, 0.0) if one.kind == "curve" else 0.0
        if error:
            found[one.state][one.parameter] = float(np.expm1(log_sd(error) * value))
    return {state: moved for state, moved in found.items() if moved}
