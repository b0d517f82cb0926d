"""Statistics of an ensemble: quantiles its size supports, correlations, and which input the spread comes from."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from pertcalc.errors import InputError

Array = NDArray[np.float64]

# A quantile needs so many samples beyond it; with 5 its own level is known to 45 %.
BEYOND = 5
# A fit of n inputs needs n + 1 + SPARE samples.
SPARE = 8
INTERVAL = (0.16, 0.84)


def samples_needed(level: float) -> int:
    """Number of samples that leaves BEYOND of them beyond a quantile, ceil(5/min(q, 1 - q)).

    Parameters
    ----------
    level : float
        Quantile q, 0 < q < 1 [1].

    Raises
    ------
    InputError
        The level is outside.
    """
    if not 0 < level < 1:
        raise InputError(f"quantile level = {level!r} must lie between 0 and 1, such as 0.16")
    return int(np.ceil(BEYOND / min(level, 1 - level) - 1e-9))


def quantiles(samples: Array, levels: ArrayLike) -> Array:
    """Quantiles of samples, refused where there are too few of them.

    Parameters
    ----------
    samples : ndarray, shape (m, ...)
        [any unit].
    levels : array, shape (k,)
        Between 0 and 1 [1].

    Returns
    -------
    ndarray, shape (k, ...)
        [unit of samples].

    Raises
    ------
    InputError
        Says how many samples the outermost level needs.
    """
    wanted = np.atleast_1d(np.asarray(levels, dtype=float))
    check_size(samples.shape[0], wanted)
    return np.quantile(samples, wanted, axis=0)


def check_size(samples: int, levels: ArrayLike) -> None:
    """InputError, with the number needed, where `samples` are too few for quantiles at these levels [1]."""
    level = max((float(q) for q in np.atleast_1d(np.asarray(levels, dtype=float))), key=samples_needed)
    need = samples_needed(level)
    if samples < need:
        raise InputError(
            f"samples = {samples}: too few for the {100 * level:g} % quantile, which needs at least {need} "
            f"({BEYOND} beyond it); ask for more samples or for a quantile nearer to the median"
        )


def response(samples: Array, nominal: Array) -> Array:
    """What is fitted and correlated: ln(sample/nominal) where all have the nominal's sign, else its relative deviation.

    Parameters
    ----------
    samples, nominal : ndarray, shape (m, n) and (n,)
        Of one rate [any unit].

    Returns
    -------
    ndarray, shape (m, n)
        [1].
    """
    ratio = samples / np.where(nominal == 0, np.inf, nominal)
    positive = np.all(ratio > 0, axis=0)
    return np.where(positive, np.log(np.where(ratio > 0, ratio, 1.0)), ratio - 1)


@dataclass(frozen=True, slots=True)
class LinearFit:
    """First-order dependence of one rate on n inputs, and how much of the variance each of them explains.

    Parameters
    ----------
    slope, slope_error : ndarray, shape (n,)
        Change of the response per standard deviation of the input, and its standard error [1].
    share, share_error : ndarray, shape (n,)
        slope times covariance of input and response, over the variance of the response [1]; for independent inputs
        the first-order index. They add up to `explained`.
    explained : float
        Share of the variance in first order [1]; the rest is curvature, interaction and the noise of the grids.
    """

    slope: Array
    slope_error: Array
    share: Array
    share_error: Array
    explained: float


def linear_fit(inputs: Array, values: Array) -> LinearFit:
    """Least squares of a response on inputs, with intercept.

    Parameters
    ----------
    inputs : ndarray, shape (m, n)
        Samples of the inputs [1].
    values : ndarray, shape (m,)
        The response [1].

    Returns
    -------
    LinearFit

    Raises
    ------
    InputError
        Fewer than n + 1 + SPARE samples.
    """
    m, n = inputs.shape
    if m < n + 1 + SPARE:
        raise InputError(f"samples = {m}: sensitivities to {n} inputs need at least {n + 1 + SPARE}; ask for more")
    x, y = inputs - inputs.mean(axis=0), values - values.mean()
    slope, *_ = np.linalg.lstsq(x, y, rcond=None)
    left = y - x @ slope
    total = float(y @ y)
    # The pseudo-inverse leaves an input that never varies (a set never drawn) without slope and without error.
    inverse = np.diag(np.linalg.pinv(x.T @ x))
    error = np.sqrt(np.maximum(inverse, 0) * float(left @ left) / (m - n - 1))
    if total == 0:
        return LinearFit(slope, error, np.zeros(n), np.zeros(n), 0.0)
    share = slope * (x.T @ y) / total
    share_error = 2 * error * np.abs(x.T @ y) / total + error**2 * np.sum(x**2, axis=0) / total
    return LinearFit(slope, error, share, share_error, 1 - float(left @ left) / total)


def correlations(columns: Sequence[Array]) -> Array:
    """Correlation matrix (k, k) [1] of k responses, each of shape (m,); nan where one does not vary."""
    with np.errstate(invalid="ignore", divide="ignore"):
        return np.corrcoef(np.array(columns))
