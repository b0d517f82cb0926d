"""Matrix exponentials of batches of real symmetric 3x3 matrices, applied to batches of 3x3 matrices.

Arrays run components first, collisions last: the inner loops stream over the batch. Two such exponentials at Gauss
points make a step of fourth order (commutator-free Magnus: Blanes and Moan, Appl. Numer. Math. 56, 1519 (2006)), each
exact for a constant Hamiltonian however far it turns.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
Symmetric = tuple[Array, Array, Array, Array, Array, Array]  # 11, 22, 33, 12, 13, 23

GAUSS_OFFSET = float(np.sqrt(3) / 6)
# The first exponential of a step takes MAGNUS_NEAR of the earlier node and MAGNUS_FAR of the later one.
MAGNUS_NEAR = 0.25 + GAUSS_OFFSET
MAGNUS_FAR = 0.25 - GAUSS_OFFSET
# Keeps the null matrix of a finished path from dividing by zero; far below any phase.
_TINY = 1e-60


def _spectrum(H: Symmetric) -> tuple[Array, Array, Array]:
    """Middle eigenvalue and the half gaps below and above it, each shape (n,): the trigonometric solution."""
    h11, h22, h33, h12, h13, h23 = H
    mean = (h11 + h22 + h33) / 3
    p1, p2, p3 = h11 - mean, h22 - mean, h33 - mean
    q12, q13, q23 = h12 * h12, h13 * h13, h23 * h23
    radius = np.sqrt((p1 * p1 + p2 * p2 + p3 * p3 + 2 * (q12 + q13 + q23)) / 6 + _TINY)
    half_determinant = 0.5 * (p1 * (p2 * p3 - q23) - p3 * q12 - p2 * q13) + h12 * h13 * h23
    angle = np.arccos(np.clip(half_determinant / radius**3, -1, 1)) / 3
    high = 2 * radius * np.cos(angle)
    low = 2 * radius * np.cos(angle + 2 * np.pi / 3)
    middle = -(high + low)
    return middle + mean, 0.5 * (middle - low), 0.5 * (high - middle)


def _sinc(x: Array, sine: Array) -> Array:
    """sin(x)/x from x >= 0 and its sine, without cancellation, shape of x."""
    return np.where(x > 1e-8, sine / np.maximum(x, 1e-8), 1.0)


def _divided_differences(d1: Array, d2: Array) -> tuple[Array, Array, Array, Array]:
    """f1 and f2 (real and imaginary parts) of exp(-i H) = 1 + f1 Y + f2 Y^2 with spectrum -2 d1, 0, 2 d2 of Y.

    f[0, low] = -i e^{i d1} sinc d1 and f[0, high] = -i e^{-i d2} sinc d2 are stable for any degeneracy; where all
    three eigenvalues meet, f2 loses digits but its Y^2 vanishes as fast.
    """
    sin1, sin2 = np.sin(d1), np.sin(d2)
    ratio1, ratio2 = _sinc(d1, sin1), _sinc(d2, sin2)
    low_re, low_im = ratio1 * sin1, -ratio1 * np.cos(d1)
    high_re, high_im = -ratio2 * sin2, -ratio2 * np.cos(d2)
    spread = 1 / (2 * (d1 + d2) + _TINY)
    f2_re, f2_im = (high_re - low_re) * spread, (high_im - low_im) * spread
    return low_re + 2 * d1 * f2_re, low_im + 2 * d1 * f2_im, f2_re, f2_im


def apply_exponential(W: Array, H: Symmetric, phase: Array) -> tuple[Array, Array]:
    """W <- exp(-i H) W, without the factor exp(-i middle eigenvalue), which is summed apart.

    Parameters
    ----------
    W : ndarray, shape (3, 2, 3, n)
        Matrices to be multiplied [1]: row, (real, imaginary), column, collision.
    H : tuple of 6 ndarrays, shape (n,)
        Elements 11, 22, 33, 12, 13, 23 of the real symmetric matrices [radian].
    phase : ndarray, shape (n,)
        Sum of the middle eigenvalues left out so far [radian].

    Returns
    -------
    W : ndarray, shape (3, 2, 3, n)
        The products [1].
    phase : ndarray, shape (n,)
        The sum with this one added [radian].
    """
    h11, h22, h33, h12, h13, h23 = H
    middle, d1, d2 = _spectrum(H)
    f1_re, f1_im, f2_re, f2_im = _divided_differences(d1, d2)
    y1, y2, y3 = h11 - middle, h22 - middle, h33 - middle
    elements = (
        (0, 0, y1, y1 * y1 + h12 * h12 + h13 * h13),
        (1, 1, y2, y2 * y2 + h12 * h12 + h23 * h23),
        (2, 2, y3, y3 * y3 + h13 * h13 + h23 * h23),
        (0, 1, h12, h12 * (y1 + y2) + h13 * h23),
        (0, 2, h13, h13 * (y1 + y3) + h12 * h23),
        (1, 2, h23, h23 * (y2 + y3) + h12 * h13),
    )
    # i W as (real, imaginary) is (-Im, Re); the exponential acts as Re(E) W + Im(E) (i W).
    rotated = np.empty_like(W)
    np.negative(W[:, 1], out=rotated[:, 0])
    rotated[:, 1] = W[:, 0]
    result = W.copy()
    scratch = np.empty_like(W[0])
    for i, j, linear, quadratic in elements:
        re = f1_re * linear + f2_re * quadratic
        im = f1_im * linear + f2_im * quadratic
        for row, column in ((i, j), (j, i))[: 1 + (i != j)]:
            np.multiply(W[column], re, out=scratch)
            result[row] += scratch
            np.multiply(rotated[column], im, out=scratch)
            result[row] += scratch
    return result, phase + middle
