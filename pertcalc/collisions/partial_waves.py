"""From scattering matrices to cross sections: sums over total angular momenta with 6j algebra (design: close coupling).

    line      (pi/k^2) sum (2Jt+1)/(2j+1) [1 - S^Jt_{jN,jN} S_g(N)*]
    multipole (pi/k^2) sum (2Jt+1)(2Jt'+1)(-1)^{j'-j+N'-N} {j' Jt N'; Jt' j' K}{j Jt N; Jt' j K}
              S^Jt_{j'N',jN} S^Jt'_{j'N',jN}*

The loss of rank K is the same sum with S = 1 minus that with S, both over the same waves. Source: Baranger 1958; Omont,
Prog. Quantum Electron. 5, 69 (1977).
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.special import gammaln

from pertcalc.collisions.close_coupling import Matrices

Array = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]
Momenta = Array | float

J_OF_LEVEL = {"P1/2": 0.5, "P3/2": 1.5}
LEVELS = ("P1/2", "P3/2")
# 2 (N - Jt) of the channels of either parity, and their levels.
_OFFSETS = {"e": (-1, -1, 3), "f": (1, 1, -3)}
_LEVEL_OF_CHANNEL = ("P1/2", "P3/2", "P3/2")
# Terms of the Racah sum that can occur with two momenta up to 3/2 and K up to 3.
_TERMS = 8


def large_six_j(a: Momenta, b: Momenta, c: Momenta, d: Momenta, e: Momenta, f: Momenta) -> Array:
    """6j symbols {a b c; d e f} of arrays of any size by Racah's sum in logarithms of factorials, broadcast [1].

    For symbols with at most `_TERMS` terms (some of the momenta small); 1e-11 for momenta of some thousands. Zero where
    a triangle is broken.

    Parameters
    ----------
    a, b, c, d, e, f : ndarray or float
        Angular momenta [hbar].
    """
    a, b, c, d, e, f = np.broadcast_arrays(*(np.asarray(x, dtype=float) for x in (a, b, c, d, e, f)))
    triads = ((a, b, c), (a, e, f), (d, b, f), (d, e, c))
    allowed = np.logical_and.reduce([_triangle(*triad) for triad in triads])
    first = np.maximum.reduce([x + y + z for x, y, z in triads])
    tops = (a + b + d + e, b + c + e + f, a + c + d + f)
    last = np.minimum.reduce(tops)
    logarithm = sum(_log_delta(*triad) for triad in triads)
    value = np.zeros(a.shape)
    for i in range(_TERMS):
        t = first + i
        inside = allowed & (t <= last + 0.1)
        t = np.where(inside, t, first)
        below = sum(_log_factorial(t - x - y - z) for x, y, z in triads) + sum(_log_factorial(top - t) for top in tops)
        term = np.exp(np.where(inside, logarithm + _log_factorial(t + 1) - below, 0.0))
        value += np.where(inside, np.where(np.rint(t) % 2 == 0, term, -term), 0.0)
    return value


def _log_factorial(x: Array) -> Array:
    return gammaln(np.maximum(x, 0.0) + 1)


def _triangle(x: Array, y: Array, z: Array) -> NDArray[np.bool_]:
    return (z < x + y + 0.1) & (z > np.abs(x - y) - 0.1)


def _log_delta(x: Array, y: Array, z: Array) -> Array:
    ways = _log_factorial(x + y - z) + _log_factorial(x - y + z) + _log_factorial(y + z - x)
    return 0.5 * (ways - _log_factorial(x + y + z + 1))


def _elements(matrices: Matrices, level: str, final: str) -> dict[tuple[int, int], ComplexArray]:
    """S^Jt from (level, N) to (final, N') by (2(N'-Jt), 2(N-Jt)), each over Jt, shape (n,)."""
    found = {}
    for parity, offsets in _OFFSETS.items():
        for row, to in enumerate(_LEVEL_OF_CHANNEL):
            for column, start in enumerate(_LEVEL_OF_CHANNEL):
                if (start, to) == (level, final):
                    found[offsets[row], offsets[column]] = matrices.S[parity][:, row, column]
    return found


def line_cross_section(matrices: Matrices, level: str, ground: ComplexArray) -> complex:
    """Half width (real part) and shift (imaginary part, blue > 0) [bohr^2] of the line to `level`.

    Parameters
    ----------
    matrices : Matrices
    level : str
        "P1/2" or "P3/2".
    ground : ndarray, shape (>= largest N + 1,)
        S_g(N) at the kinetic energy of the level [1], with whatever phase the distances beyond the matching add.
    """
    j = J_OF_LEVEL[level]
    total = matrices.total
    value = 0j
    for (to, start), S in _elements(matrices, level, level).items():
        if to != start:
            continue
        N = np.rint(total + start / 2).astype(int)
        exists = (N >= 0) & (N >= abs(total - j) - 0.1)
        weights = (2 * total + 1) / (2 * j + 1)
        value += complex(np.sum(np.where(exists, weights * (1 - S * ground[np.maximum(N, 0)].conj()), 0)))
    return np.pi / matrices.momentum2[LEVELS.index(level)] * value


def multipole_cross_sections(matrices: Matrices, level: str, final: str, K: int) -> tuple[float, float]:
    """Gain of rank K in `final` from `level` and, for final = level, its loss [bohr^2]; (gain, loss).

    Parameters
    ----------
    matrices : Matrices
    level, final : str
        "P1/2" or "P3/2".
    K : int
        Rank.
    """
    j, jf = J_OF_LEVEL[level], J_OF_LEVEL[final]
    elements = _elements(matrices, level, final)
    total = matrices.total
    gain = loss = 0.0
    for (to, start), S in elements.items():
        for shift in range(-K, K + 1):
            other = elements.get((to - 2 * shift, start - 2 * shift))
            if other is None:
                continue
            index = np.arange(max(0, -shift), min(total.size, total.size - shift))
            Jt, Jt2 = total[index], total[index + shift]
            N, Nf = Jt + start / 2, Jt + to / 2
            weights = (2 * Jt + 1) * (2 * Jt2 + 1)
            weights = weights * large_six_j(jf, Jt, Nf, Jt2, jf, K) * large_six_j(j, Jt, N, Jt2, j, K)
            if (round(jf - j) + (to - start) // 2) % 2:
                weights = -weights
            weights = np.where((N > -0.1) & (Nf > -0.1), weights, 0.0)
            survived = (S[index] * other[index + shift].conj()).real
            gain += float(weights @ survived)
            if level == final:
                loss += float(weights @ ((1.0 if to == start else 0.0) - survived))
    scale = np.pi / matrices.momentum2[LEVELS.index(level)]
    return scale * gain, scale * loss
