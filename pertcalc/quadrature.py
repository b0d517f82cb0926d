"""Integration rules: composite Gauss-Legendre panels and averages over the thermal distribution of pair energies.

A thermal rate coefficient is k = vbar <sigma> with <f> = Int_0^inf x e^-x f(x) dx, x = E/kT (design section 6.5).
"""

from __future__ import annotations

from functools import lru_cache

import numpy as np
from numpy.typing import ArrayLike, NDArray

from pertcalc.errors import InputError

# x e^-x below LOW holds 5e-17 of the weight (2e-15 of <x^-1/5>), above HIGH 2e-18: both under rounding.
_LOW, _HIGH = 1e-8, 45.0


def _count(name: str, value: int, low: int, high: int) -> int:
    if isinstance(value, bool) or value != value or int(value) != value or not low <= value <= high:
        raise InputError(f"{name} = {value!r} must be a whole number from {low} to {high}")
    return int(value)


@lru_cache(maxsize=64)
def _gauss_legendre(order: int) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    nodes, weights = np.polynomial.legendre.leggauss(order)
    return nodes, weights


def gauss_legendre_panels(edges: ArrayLike, order: int = 16) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Composite Gauss-Legendre rule: Int f dx over [edges[0], edges[-1]] ~ sum weights * f(nodes).

    Parameters
    ----------
    edges : array, shape (..., panels+1)
        Panel edges [any unit], rising along the last axis; leading axes are independent rules.
    order : int
        Points per panel, 1 ... 128; polynomials of degree 2*order-1 are exact in each panel.

    Returns
    -------
    nodes, weights : array, shape (..., panels*order)
        Both [unit of edges]; nodes rise.

    Raises
    ------
    InputError
        Fewer than two edges, edges not finite or not rising, bad order.
    """
    points = _count("order", order, 1, 128)
    bounds = np.asarray(edges, dtype=float)
    if bounds.ndim < 1 or bounds.shape[-1] < 2:
        raise InputError(f"edges has shape {bounds.shape}: at least two panel edges are needed")
    widths = np.diff(bounds, axis=-1)
    if not np.all(np.isfinite(bounds)) or not np.all(widths > 0):
        raise InputError("edges must be finite and strictly rising")
    t, w = _gauss_legendre(points)
    half = 0.5 * widths[..., None]
    middle = bounds[..., :-1, None] + half
    shape = (*bounds.shape[:-1], -1)
    return (middle + half * t).reshape(shape), (half * w).reshape(shape)


def log_panels(
    low: float, high: float, panels: int, order: int = 16
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Gauss-Legendre panels in ln x for Int_low^high f dx of an f that varies over decades; the Jacobian is included.

    Parameters
    ----------
    low, high : float
        Ends of the range [any unit]; 0 < low < high.
    panels : int
        Number of panels, equal in ln x.
    order : int
        Points per panel, 1 ... 128.

    Returns
    -------
    nodes, weights : array, shape (panels*order,)
        Both [unit of low].

    Raises
    ------
    InputError
        Bad range or counts.
    """
    if not 0 < low < high < np.inf:
        raise InputError(f"low = {low:g}, high = {high:g}: need 0 < low < high, both finite")
    edges = np.linspace(np.log(low), np.log(high), _count("panels", panels, 1, 100_000) + 1)
    logs, weights = gauss_legendre_panels(edges, order)
    nodes = np.exp(logs)
    return nodes, weights * nodes


def maxwell_laguerre(order: int = 16) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Gauss-Laguerre rule for the thermal average <f> = Int_0^inf x e^-x f(x) dx ~ sum weights * f(nodes).

    Best for f that is nearly a polynomial in x = E/kT; for powers x^s with s not whole, and for f that varies over
    decades, use `maxwell_panels`.

    Parameters
    ----------
    order : int
        Number of points, 1 ... 128; polynomials of degree 2*order-1 are exact.

    Returns
    -------
    nodes : array, shape (order,)
        Reduced energies x = E/kT [1].
    weights : array, shape (order,)
        Weights [1]; they contain x e^-x and sum to 1.

    Raises
    ------
    InputError
        Bad order.

    Source
    ------
    Generalised Gauss-Laguerre rule with exponent 1 (scipy.special.roots_genlaguerre).
    """
    from scipy.special import roots_genlaguerre

    nodes, weights = roots_genlaguerre(_count("order", order, 1, 128), 1.0)
    return nodes, weights


def maxwell_panels(panels: int = 24, order: int = 12) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Panel rule in ln x for <f> = Int_0^inf x e^-x f(x) dx: any power law or oscillation the panels can resolve.

    Parameters
    ----------
    panels : int
        Panels, equal in ln x, between x = 1e-8 and 45.
    order : int
        Points per panel, 1 ... 128.

    Returns
    -------
    nodes : array, shape (panels*order,)
        Reduced energies x = E/kT [1].
    weights : array, shape (panels*order,)
        Weights [1]; they contain x e^-x and sum to 1 within 1e-15.

    Raises
    ------
    InputError
        Bad counts.
    """
    nodes, weights = log_panels(_LOW, _HIGH, panels, order)
    return nodes, weights * nodes * np.exp(-nodes)


def maxwell_average(values: ArrayLike, weights: ArrayLike) -> NDArray[np.float64]:
    """Thermal average sum_i weights_i values_i over the last axis.

    Parameters
    ----------
    values : array, shape (..., n)
        f at the nodes of a Maxwell rule [any unit].
    weights : array, shape (n,)
        Weights of that rule [1].

    Returns
    -------
    average : array, shape (...)
        <f> [unit of values].

    Raises
    ------
    InputError
        The last axes differ in length.
    """
    f, w = np.asarray(values), np.asarray(weights, dtype=float)
    if w.ndim != 1 or f.shape[-1:] != w.shape:
        raise InputError(f"values has shape {f.shape}, weights {w.shape}: the last axes must have equal length")
    return f @ w
