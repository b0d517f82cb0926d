"""The 3x3 half-path propagator: a batch of collisions stepped together in the rotating frame.

Quantised along the normal of the collision plane and turned with the internuclear axis, block A (states
|+1 up>, |-1 up>, |0 down>) obeys a real symmetric Hamiltonian (a = splitting/1.5, w = dphi/dt, D = V_Sigma - V_Pi):

        | D/2 + a/2 - 3w/2      -D/2                0          |
    H = | -D/2                  D/2 - a/2 + w/2     a/sqrt2    |     (V_Pi itself is a phase, kept apart)
        | 0                     a/sqrt2             w/2        |

and block B is the same with w -> -w. One step is exp(-i H dt) with H frozen, exact in splitting and potential
difference together, so that no step can resonate with the splitting as long as it resolves it; two such exponentials
at Gauss points make a step of fourth order (commutator-free Magnus: Blanes and Moan, Appl. Numer. Math. 56, 1519
(2006)). Arrays run components first, collisions last: the inner loops stream over the batch.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

GAUSS_OFFSET = np.sqrt(3) / 6
# Commutator-free fourth-order weights: first exponential takes MAGNUS_NEAR of the earlier node.
MAGNUS_NEAR = 0.25 + GAUSS_OFFSET
MAGNUS_FAR = 0.25 - GAUSS_OFFSET
_TINY = 1e-300


def _spectrum(h11: Array, h22: Array, h33: Array, h12: Array, h23: Array) -> tuple[Array, Array, Array]:
    """Middle eigenvalue and the half gaps below and above it of the tridiagonal symmetric matrices, shape (n,)."""
    mean = (h11 + h22 + h33) / 3
    p1, p2, p3 = h11 - mean, h22 - mean, h33 - mean
    q12, q23 = h12 * h12, h23 * h23
    radius = np.sqrt((p1 * p1 + p2 * p2 + p3 * p3 + 2 * (q12 + q23)) / 6 + _TINY)
    half_determinant = (p3 * (p1 * p2 - q12) - p1 * q23) / 2
    angle = np.arccos(np.clip(half_determinant / radius**3, -1, 1)) / 3
    high = 2 * radius * np.cos(angle)
    low = 2 * radius * np.cos(angle + 2 * np.pi / 3)
    middle = -(high + low)
    return middle + mean, 0.5 * (middle - low), 0.5 * (high - middle)


def _sinc(x: Array, sine: Array) -> Array:
    """sin(x)/x from x >= 0 and its sine, without cancellation, shape of x."""
    return np.where(x > 1e-8, sine / np.maximum(x, 1e-8), 1.0)


def apply_exponential(
    W: Array, h11: Array, h22: Array, h33: Array, h12: Array, h23: Array, phase: Array
) -> tuple[Array, Array]:
    """W <- exp(-i H) W for tridiagonal real symmetric H (dimensionless), without the factor exp(-i middle eigenvalue).

    The exponential is the Newton interpolation of exp on the spectrum about the middle eigenvalue,
    1 + f1 Y + f2 Y^2 with Y = H - middle: divided differences of sinc form, stable for any degeneracy.

    Parameters
    ----------
    W : ndarray, shape (3, 2, 3, n)
        Matrices to be multiplied: row, (real, imaginary), column, collision [1].
    h11, h22, h33, h12, h23 : ndarray, shape (n,)
        Elements of H [radian].
    phase : ndarray, shape (n,)
        Sum of the middle eigenvalues left out so far [radian].

    Returns
    -------
    W, phase : ndarray
        The products and the updated phase.
    """
    middle, d1, d2 = _spectrum(h11, h22, h33, h12, h23)
    sin1, sin2 = np.sin(d1), np.sin(d2)
    ratio1, ratio2 = _sinc(d1, sin1), _sinc(d2, sin2)
    # f[mid, low] = -i e^{+i d1} sinc d1 = ratio1 (sin d1 - i cos d1); f[mid, high] = ratio2 (-sin d2 - i cos d2).
    low_re, low_im = ratio1 * sin1, -ratio1 * np.cos(d1)
    high_re, high_im = -ratio2 * sin2, -ratio2 * np.cos(d2)
    spread = 1 / (2 * (d1 + d2) + _TINY)
    f2_re, f2_im = (high_re - low_re) * spread, (high_im - low_im) * spread
    f1_re, f1_im = low_re + 2 * d1 * f2_re, low_im + 2 * d1 * f2_im
    y1, y2, y3 = h11 - middle, h22 - middle, h33 - middle
    square = (
        (0, 0, y1, y1 * y1 + h12 * h12),
        (1, 1, y2, y2 * y2 + h12 * h12 + h23 * h23),
        (2, 2, y3, y3 * y3 + h23 * h23),
        (0, 1, h12, h12 * (y1 + y2)),
        (1, 2, h23, h23 * (y2 + y3)),
        (0, 2, None, h12 * h23),
    )
    # i W as (real, imaginary) is (-Im, Re); the exponential acts as Re(E) W + Im(E) (i W).
    rotated = np.empty_like(W)
    np.negative(W[:, 1], out=rotated[:, 0])
    rotated[:, 1] = W[:, 0]
    result = W.copy()
    scratch = np.empty_like(W[0])
    for i, j, linear, quadratic in square:
        re = f2_re * quadratic if linear is None else f1_re * linear + f2_re * quadratic
        im = f2_im * quadratic if linear is None else f1_im * linear + f2_im * quadratic
        for row, column in {(i, j), (j, i)}:
            np.multiply(W[column], re, out=scratch)
            result[row] += scratch
            np.multiply(rotated[column], im, out=scratch)
            result[row] += scratch
    return result, phase + middle
