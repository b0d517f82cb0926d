"""Log-derivative propagation of batches of at most three coupled channels, with closed-form 3x3 algebra.

psi'' = -Q psi with Q = diag(k_i^2 - N_i(N_i+1)/R^2 - 2 mu V_Pi) - 2 mu D t t^T (t a unit vector, `channels.py`). The
method of Johnson (J. Comput. Phys. 13, 445 (1973)): kicks of Simpson weights between free flights, two inversions per
odd and one per even point, fourth order in the step, stable through classically forbidden regions. Arrays run
components first, blocks last; a symmetric matrix is the tuple 11, 22, 33, 12, 13, 23.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
Symmetric = tuple[Array, Array, Array, Array, Array, Array]

# Points per radian of the shortest local wave: the step is at most 1/POINTS_PER_RADIAN of its reduced wavelength.
POINTS_PER_RADIAN = 5.0
# Length of the pieces with one step size [bohr].
_SEGMENT = 1.0
# Where the elements of a symmetric matrix stand.
PLACES = ((0, 0), (1, 1), (2, 2), (0, 1), (0, 2), (1, 2))
# A determinant this much smaller than its first term has lost too many digits.
CANCELLED = 1e-4


@dataclass(frozen=True, slots=True)
class Blocks:
    """n blocks of three channels: `momentum2` k_i^2 [1/bohr^2], `centrifugal` N(N+1), `axis` t, shape (3, n)."""

    momentum2: Array
    centrifugal: Array
    axis: Array


def inverse(A: Symmetric) -> Symmetric:
    """Inverses of symmetric 3x3 matrices by cofactors, shapes as given.

    Next to a node of the wave function A is nearly singular and its successor nearly of rank one and huge: cofactors
    then lose all digits. Such matrices (one in some thousands) are done again by LU decomposition.
    """
    a11, a22, a33, a12, a13, a23 = A
    c11 = a22 * a33 - a23 * a23
    c12 = a13 * a23 - a12 * a33
    c13 = a12 * a23 - a13 * a22
    first = a11 * c11
    determinant = first + a12 * c12 + a13 * c13
    scale = 1 / determinant
    B = (
        c11 * scale,
        (a11 * a33 - a13 * a13) * scale,
        (a11 * a22 - a12 * a12) * scale,
        c12 * scale,
        c13 * scale,
        (a12 * a13 - a11 * a23) * scale,
    )
    spoilt = np.flatnonzero(np.abs(determinant) < CANCELLED * np.abs(first))
    if spoilt.size:
        exact = np.linalg.inv(full(tuple(element[spoilt] for element in A)))  # type: ignore[arg-type]
        for element, (i, j) in zip(B, PLACES, strict=True):
            element[spoilt] = exact[:, i, j]
    return B


def full(y: Symmetric) -> Array:
    """Symmetric components as matrices, shape (n, 3, 3)."""
    matrix = np.empty((y[0].size, 3, 3))
    for (i, j), value in zip(PLACES, y, strict=True):
        matrix[:, i, j] = matrix[:, j, i] = value
    return matrix


def segments(
    local_momentum: Callable[[Array], Array], start: float, end: float, points: float = POINTS_PER_RADIAN
) -> list[tuple[float, float, int]]:
    """(first R, step, even number of steps) of pieces of constant step between start and end [bohr].

    Parameters
    ----------
    local_momentum : callable
        Largest local momentum [1/bohr] of an array R [bohr].
    start, end : float
        [bohr].
    points : float
        Points per radian of the shortest local wave [1].
    """
    pieces = []
    R = start
    while R < end - 1e-9:
        length = min(_SEGMENT, end - R)
        largest = float(local_momentum(np.linspace(R, R + length, 9)).max())
        steps = 2 * int(np.ceil(0.5 * length * largest * points))
        pieces.append((R, length / steps, steps))
        R += length
    return pieces


def propagate(
    blocks: Blocks,
    potential: Callable[[Array], tuple[Array, Array]],
    pieces: list[tuple[float, float, int]],
    initial: float,
) -> tuple[Symmetric, int]:
    """Log-derivative matrices psi'/psi at the end of the last piece.

    Parameters
    ----------
    blocks : Blocks
    potential : callable
        2 mu V_Pi and 2 mu (V_Sigma - V_Pi) [1/bohr^2] of an array R [bohr].
    pieces : list
        From `segments`.
    initial : float
        Diagonal log-derivative at the start, deep in the forbidden region [1/bohr].

    Returns
    -------
    y : tuple of 6 ndarrays, shape (n,)
        [1/bohr].
    inversions : int
        3x3 inversions done.
    """
    n = blocks.momentum2.shape[1]
    t = blocks.axis
    outer = (t[0] * t[0], t[1] * t[1], t[2] * t[2], t[0] * t[1], t[0] * t[2], t[1] * t[2])
    y: Symmetric = tuple(np.full(n, initial if i < 3 else 0.0) for i in range(6))  # type: ignore[assignment]
    inversions = 0
    for start, h, steps in pieces:
        R: Array = start + h * np.arange(steps + 1, dtype=float)
        pi, difference = potential(R)
        square = 1 / R**2
        third = h * h / 3
        Q = blocks.momentum2 - blocks.centrifugal * square[0] - pi[0]
        A = _kicked(tuple((1.0 if i < 3 else 0.0) + h * y[i] for i in range(6)), Q, difference[0], outer, third)
        for i in range(1, steps + 1):
            B = inverse(A)
            Q = blocks.momentum2 - blocks.centrifugal * square[i] - pi[i]
            flown = (2 - B[0], 2 - B[1], 2 - B[2], -B[3], -B[4], -B[5])
            if i % 2:
                A = _kicked_odd(flown, Q, difference[i], t, h)
            else:
                A = _kicked(flown, Q, difference[i], outer, third if i == steps else 2 * third)
        y = ((A[0] - 1) / h, (A[1] - 1) / h, (A[2] - 1) / h, A[3] / h, A[4] / h, A[5] / h)
        inversions += (steps + steps // 2) * n
    return y, inversions


def _kicked(
    A: Symmetric | tuple[Array, ...], Q: Array, difference: float, outer: Symmetric, weight: float
) -> Symmetric:
    """A - weight (diag Q - difference t t^T), the kick of an even point."""
    pull = weight * difference
    return (
        A[0] - weight * Q[0] + pull * outer[0],
        A[1] - weight * Q[1] + pull * outer[1],
        A[2] - weight * Q[2] + pull * outer[2],
        A[3] + pull * outer[3],
        A[4] + pull * outer[4],
        A[5] + pull * outer[5],
    )


def _kicked_odd(A: Symmetric | tuple[Array, ...], Q: Array, difference: float, t: Array, h: float) -> Symmetric:
    """A - (4 h^2/3) (1 + h^2 Q/6)^-1 Q = A - 8 (1 - (1 + h^2 Q/6)^-1): the kick of an odd point.

    The inverse of diagonal minus rank one is the diagonal inverse G plus alpha G t t^T G (Sherman and Morrison).
    """
    sixth = h * h / 6
    G = 1 / (1 + sixth * Q)
    g = G * t
    alpha = 8 * sixth * difference / (1 - sixth * difference * np.sum(g * t, axis=0))
    return (
        A[0] - 8 + 8 * G[0] + alpha * g[0] * g[0],
        A[1] - 8 + 8 * G[1] + alpha * g[1] * g[1],
        A[2] - 8 + 8 * G[2] + alpha * g[2] * g[2],
        A[3] + alpha * g[0] * g[1],
        A[4] + alpha * g[0] * g[2],
        A[5] + alpha * g[1] * g[2],
    )
