"""Channels of quantum close coupling: |(1 1/2) j, N; Jt> with parity, and how the pair axis couples them.

For every total angular momentum Jt and parity there are at most three channels:

    parity "e": (1/2, Jt-1/2), (3/2, Jt-1/2), (3/2, Jt+3/2)      parity "f": (1/2, Jt+1/2), (3/2, Jt+1/2), (3/2, Jt-3/2)

The interaction is V_Pi + (V_Sigma - V_Pi) t t^T with a unit vector t: the p orbital along the axis has |Omega| = 1/2,
so the difference of the curves is a projector of rank one in any basis. Channels that do not exist (small Jt) have
t = 0 and stay empty.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

LEVEL_OF_CHANNEL = (0, 1, 1)  # 0: P1/2, 1: P3/2


@dataclass(frozen=True, slots=True)
class Channels:
    """Channel quantum numbers of n blocks.

    `total` Jt, shape (n,); `partial` N, shape (3, n), -1 where the channel does not exist; `axis` t, shape (3, n) [1].
    """

    total: Array
    partial: Array
    axis: Array


def _half(N: Array, up: NDArray[np.bool_]) -> Array:
    """<N 0, 1/2 1/2 | J 1/2> for J = N + 1/2 (up) or N - 1/2."""
    return np.where(up, np.sqrt((N + 1) / (2 * N + 1)), -np.sqrt(N / (2 * N + 1)))


def _three_halves(N: Array, J: Array) -> Array:
    """<N 0, 3/2 1/2 | J 1/2> for J - N = 3/2, 1/2, -1/2, -3/2; 0 where it does not exist."""
    d = np.rint(2 * (J - N)).astype(int)
    with np.errstate(divide="ignore", invalid="ignore"):
        up3 = np.sqrt(3 * (N + 1) * (N + 2) * (N + 1) / ((2 * N + 1) * (2 * N + 2) * (2 * N + 3)))
        up1 = -N * np.sqrt((N + 1) / (2 * N * (2 * N + 1) * (2 * N + 3)))
        down1 = -(N + 1) * np.sqrt(N / ((2 * N - 1) * (2 * N + 1) * (2 * N + 2)))
        down3 = np.sqrt(3 * N * (N - 1) * N / (2 * N * (2 * N - 1) * (2 * N + 1)))
    value = np.select([d == 3, d == 1, d == -1, d == -3], [up3, up1, down1, down3], 0.0)
    return np.where(np.isfinite(value), value, 0.0)


def channels(total: Array, parity: str) -> Channels:
    """Channels of one parity for an array of total angular momenta.

    Parameters
    ----------
    total : ndarray, shape (n,)
        Jt = 1/2, 3/2, ... [hbar].
    parity : str
        "e" or "f", see the module.

    Returns
    -------
    Channels
    """
    near = total - 0.5 if parity == "e" else total + 0.5
    far = total + 1.5 if parity == "e" else total - 1.5
    exists = (np.ones_like(near, dtype=bool), total + near >= 1.5, far >= 0)
    # |3/2, N> with N = Jt +- 1/2 needs N + Jt >= 3/2 (triangle); far needs N >= 0.
    common = np.sqrt(2 * (2 * near + 1) / (2 * total + 1))
    low = common * _half(near, np.full(near.shape, parity == "e")) * -np.sqrt(1 / 3)
    high = common * _three_halves(near, total) * np.sqrt(2 / 3)
    distant = np.sqrt(2 * np.maximum(2 * far + 1, 0) / (2 * total + 1)) * np.sqrt(2 / 3)
    distant = distant * np.where(exists[2], _three_halves(np.maximum(far, 0), total), 0.0)
    # <N 0 j 1/2| = (-1)^{N+j-Jt} <j 1/2 N 0|: the channels couple j with N, in this order.
    sign = (1.0, -1.0, -1.0) if parity == "e" else (-1.0, 1.0, 1.0)
    axis = np.stack([sign[0] * low, np.where(exists[1], sign[1] * high, 0.0), sign[2] * distant])
    partial = np.stack([near, np.where(exists[1], near, -1), np.where(exists[2], far, -1)])
    return Channels(total, partial, axis)
