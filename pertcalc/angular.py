"""Angular momentum algebra: coupling coefficients in exact arithmetic and irreducible tensor operators.

Every symbol is sign * sqrt(rational): the rational is computed with integers (`fractions.Fraction`), so a float is
rounded only once however large the arguments are. Matrices run over m = J, J-1, ..., -J (descending), as the usual
spin matrices do. Source of the formulas: Edmonds, Angular Momentum in Quantum Mechanics; notes/angular.md.
"""

from __future__ import annotations

import math
from fractions import Fraction
from functools import lru_cache

import numpy as np
from numpy.typing import ArrayLike, NDArray

from pertcalc.errors import InputError

# Largest 2j: exact sums stay in milliseconds.
_MAX_TWICE = 20_000
_CACHE = 1 << 17


def _twice(name: str, value: float, problems: list[str]) -> int:
    """Twice an integer or half-integer as int; appends to ``problems`` instead of raising."""
    try:
        doubled = 2 * value
        whole = round(doubled)
    except (TypeError, ValueError, OverflowError):
        problems.append(f"{name} = {value!r} must be an integer or half-integer, such as 1 or 1.5")
        return 0
    if abs(whole) > _MAX_TWICE:
        problems.append(f"{name} = {value:g} is beyond the largest supported angular momentum {_MAX_TWICE // 2}")
        return 0
    if doubled != whole:
        problems.append(f"{name} = {value!r} must be an integer or half-integer, such as 1 or 1.5")
    return whole


def _momenta(**values: float) -> list[int]:
    """Twice each angular momentum; InputError that lists every bad one."""
    problems: list[str] = []
    doubled = []
    for name, value in values.items():
        doubled.append(_twice(name, value, problems))
        if doubled[-1] < 0:
            problems.append(f"{name} = {value:g} must not be negative: it is the length of an angular momentum")
    if problems:
        raise InputError(problems)
    return doubled


def _projections_of(momenta: dict[str, int], **values: float) -> list[int]:
    """Twice each projection; each must differ from its angular momentum (same order) by an integer."""
    problems: list[str] = []
    doubled = []
    for (j_name, j), (name, value) in zip(momenta.items(), values.items(), strict=True):
        doubled.append(_twice(name, value, problems))
        if not problems and (doubled[-1] - j) % 2:
            problems.append(f"{name} = {value:g} must differ from {j_name} = {j / 2:g} by an integer")
    if problems:
        raise InputError(problems)
    return doubled


def _triangle(a: int, b: int, c: int) -> bool:
    return (a + b + c) % 2 == 0 and abs(a - b) <= c <= a + b


@lru_cache(maxsize=_CACHE)
def _delta(a: int, b: int, c: int) -> Fraction:
    """Square of the triangle coefficient of the twice-values a, b, c."""
    f = math.factorial
    above = f((a + b - c) // 2) * f((a - b + c) // 2) * f((b + c - a) // 2)
    return Fraction(above, f((a + b + c) // 2 + 1))


def _signed_root(factor: Fraction | int, square: Fraction) -> float:
    """factor * sqrt(square), rounded once; exact integers keep huge factorials from overflowing."""
    total = Fraction(factor) ** 2 * square
    return math.copysign(math.sqrt(total), factor) if total else 0.0


@lru_cache(maxsize=_CACHE)
def _three_j(a: int, b: int, c: int, p: int, q: int, r: int) -> float:
    if p + q + r or not _triangle(a, b, c) or abs(p) > a or abs(q) > b or abs(r) > c:
        return 0.0
    f = math.factorial
    # Racah's sum; every argument below is twice-value / 2 and an integer.
    low = max(0, (b - c - p) // 2, (a - c + q) // 2)
    high = min((a + b - c) // 2, (a - p) // 2, (b + q) // 2)
    total = Fraction(0)
    for t in range(low, high + 1):
        below = f(t) * f((c - b + p) // 2 + t) * f((c - a - q) // 2 + t)
        below *= f((a + b - c) // 2 - t) * f((a - p) // 2 - t) * f((b + q) // 2 - t)
        total += Fraction(-1 if t % 2 else 1, below)
    square = _delta(a, b, c)
    for j, m in ((a, p), (b, q), (c, r)):
        square *= f((j + m) // 2) * f((j - m) // 2)
    return _signed_root(-total if ((a - b - r) // 2) % 2 else total, square)


def three_j(j1: float, j2: float, j3: float, m1: float, m2: float, m3: float) -> float:
    """Wigner 3j symbol (j1 j2 j3; m1 m2 m3), exact up to the last rounding; 0 where a selection rule fails.

    Parameters
    ----------
    j1, j2, j3 : float
        Angular momenta [hbar]; integer or half-integer, not negative.
    m1, m2, m3 : float
        Projections [hbar]; each differs from its j by an integer. |m| > j gives 0.

    Returns
    -------
    symbol : float
        The 3j symbol [1].

    Raises
    ------
    InputError
        An argument is not an integer or half-integer, a j is negative, or m does not belong to its j.

    Source
    ------
    Racah's single sum (Edmonds, eq. 3.6.11).
    """
    a, b, c = _momenta(j1=j1, j2=j2, j3=j3)
    p, q, r = _projections_of({"j1": a, "j2": b, "j3": c}, m1=m1, m2=m2, m3=m3)
    return _three_j(a, b, c, p, q, r)


def clebsch_gordan(j1: float, m1: float, j2: float, m2: float, J: float, M: float) -> float:
    """Clebsch-Gordan coefficient <j1 m1 j2 m2 | J M> with the Condon-Shortley phase.

    Parameters
    ----------
    j1, m1, j2, m2 : float
        The two momenta and their projections [hbar].
    J, M : float
        The coupled momentum and its projection [hbar].

    Returns
    -------
    coefficient : float
        (-1)^(j1-j2+M) sqrt(2J+1) (j1 j2 J; m1 m2 -M) [1]; 0 where a selection rule fails.

    Raises
    ------
    InputError
        As `three_j`.
    """
    a, b, c = _momenta(j1=j1, j2=j2, J=J)
    p, q, r = _projections_of({"j1": a, "j2": b, "J": c}, m1=m1, m2=m2, M=M)
    symbol = _three_j(a, b, c, p, q, -r)
    if symbol == 0.0:
        return 0.0
    return (-1.0 if ((a - b + r) // 2) % 2 else 1.0) * math.sqrt(c + 1) * symbol


@lru_cache(maxsize=_CACHE)
def _six_j_sum(a: int, b: int, c: int, d: int, e: int, f: int) -> int | Fraction:
    """Racah's alternating sum of {a b c; d e f}: the symbol without its four triangle coefficients."""
    fac = math.factorial
    triads = [(a + b + c) // 2, (a + e + f) // 2, (d + b + f) // 2, (d + e + c) // 2]
    quads = [(a + b + d + e) // 2, (b + c + e + f) // 2, (a + c + d + f) // 2]
    total = Fraction(0)
    for t in range(max(triads), min(quads) + 1):
        below = math.prod(fac(t - s) for s in triads) * math.prod(fac(s - t) for s in quads)
        total += Fraction(-fac(t + 1) if t % 2 else fac(t + 1), below)
    return total


def _six_j_allowed(a: int, b: int, c: int, d: int, e: int, f: int) -> bool:
    return _triangle(a, b, c) and _triangle(a, e, f) and _triangle(d, b, f) and _triangle(d, e, c)


@lru_cache(maxsize=_CACHE)
def _six_j(a: int, b: int, c: int, d: int, e: int, f: int) -> float:
    if not _six_j_allowed(a, b, c, d, e, f):
        return 0.0
    square = _delta(a, b, c) * _delta(a, e, f) * _delta(d, b, f) * _delta(d, e, c)
    return _signed_root(_six_j_sum(a, b, c, d, e, f), square)


def six_j(j1: float, j2: float, j3: float, j4: float, j5: float, j6: float) -> float:
    """Wigner 6j symbol {j1 j2 j3; j4 j5 j6}, exact up to the last rounding; 0 where a triad is broken.

    Parameters
    ----------
    j1, j2, j3, j4, j5, j6 : float
        Upper row, then lower row [hbar]; integer or half-integer, not negative.

    Returns
    -------
    symbol : float
        The 6j symbol [1].

    Raises
    ------
    InputError
        An argument is not an integer or half-integer, or is negative.

    Source
    ------
    Racah's sum (Edmonds, eq. 6.3.7).
    """
    return _six_j(*_momenta(j1=j1, j2=j2, j3=j3, j4=j4, j5=j5, j6=j6))


@lru_cache(maxsize=_CACHE)
def _nine_j(a: int, b: int, c: int, d: int, e: int, f: int, g: int, h: int, i: int) -> float:
    rows_columns = [(a, b, c), (d, e, f), (g, h, i), (a, d, g), (b, e, h), (c, f, i)]
    if not all(_triangle(*triad) for triad in rows_columns):
        return 0.0
    low = max(abs(a - i), abs(d - h), abs(b - f))
    high = min(a + i, d + h, b + f)
    total = Fraction(0)
    for x in range(low, high + 1, 2):
        term = _six_j_sum(a, b, c, f, i, x) * _six_j_sum(d, e, f, b, x, h) * _six_j_sum(g, h, i, x, a, d)
        # Each triad with x stands in two of the three 6j symbols, so its square root becomes rational.
        term *= _delta(a, i, x) * _delta(d, h, x) * _delta(b, f, x) * (x + 1)
        total += -term if x % 2 else term
    return _signed_root(total, math.prod((_delta(*triad) for triad in rows_columns), start=Fraction(1)))


def nine_j(j1: float, j2: float, j3: float, j4: float, j5: float, j6: float, j7: float, j8: float, j9: float) -> float:
    """Wigner 9j symbol, row by row {j1 j2 j3; j4 j5 j6; j7 j8 j9}; 0 where a row or column is no triangle.

    Parameters
    ----------
    j1, j2, j3, j4, j5, j6, j7, j8, j9 : float
        Angular momenta [hbar]; integer or half-integer, not negative.

    Returns
    -------
    symbol : float
        The 9j symbol [1], exact up to the last rounding.

    Raises
    ------
    InputError
        An argument is not an integer or half-integer, or is negative.

    Source
    ------
    Sum of products of three 6j symbols (Edmonds, eq. 6.4.3).
    """
    return _nine_j(*_momenta(j1=j1, j2=j2, j3=j3, j4=j4, j5=j5, j6=j6, j7=j7, j8=j8, j9=j9))


def projections(J: float) -> NDArray[np.float64]:
    """The projections of J in the order of every matrix here: m = J, J-1, ..., -J.

    Parameters
    ----------
    J : float
        Angular momentum [hbar].

    Returns
    -------
    m : array, shape (2J+1,)
        Projections [hbar], descending.

    Raises
    ------
    InputError
        J is not an integer or half-integer, or is negative.
    """
    (twice,) = _momenta(J=J)
    return np.arange(twice, -twice - 1, -2) / 2.0


def _rank(J: float, K: int, Q: int | None = None) -> tuple[int, int]:
    """(2J, K) after checking that a tensor of rank K exists in level J."""
    twice, twice_k = _momenta(J=J, K=K)
    problems = []
    if twice_k % 2 or twice_k // 2 > twice:
        problems.append(f"K = {K:g} must be an integer from 0 to 2J = {twice}")
    if Q is not None and (Q != int(Q) or abs(Q) > K):
        problems.append(f"Q = {Q:g} must be an integer from -K to K = {K:g}")
    if problems:
        raise InputError(problems)
    return twice, twice_k // 2


def tensor_operator(J: float, K: int, Q: int) -> NDArray[np.float64]:
    """Orthonormal irreducible tensor operator T_KQ of a level J: Tr(T_KQ^+ T_K'Q') = delta_KK' delta_QQ'.

    <J m| T_KQ |J m'> = (-1)^(J-m) sqrt(2K+1) (J K J; -m Q m').

    Parameters
    ----------
    J : float
        Angular momentum of the level [hbar].
    K, Q : int
        Rank 0 ... 2J and component -K ... K.

    Returns
    -------
    T : array, shape (2J+1, 2J+1)
        Matrix elements [1], real; rows m and columns m' both descending from J.

    Raises
    ------
    InputError
        J is no angular momentum, or K, Q do not exist in it.

    Source
    ------
    Omont, Prog. Quantum Electron. 5, 69 (1977), state multipoles.
    """
    twice, rank = _rank(J, K, Q)
    root = math.sqrt(2 * rank + 1)
    matrix = np.zeros((twice + 1, twice + 1))
    for row in range(twice + 1):
        m = twice - 2 * row
        column = row + int(Q)  # m' = m - Q, one row further down for each unit
        if 0 <= column <= twice:
            sign = -1.0 if row % 2 else 1.0
            matrix[row, column] = sign * root * _three_j(twice, 2 * rank, twice, -m, 2 * int(Q), m - 2 * int(Q))
    return matrix


@lru_cache(maxsize=256)
def _weights(J: float, K: int, J_final: float) -> NDArray[np.float64]:
    size, final = round(2 * J) + 1, round(2 * J_final) + 1
    weights = np.zeros((final, final, size, size))
    for Q in range(-K, K + 1):
        weights += np.multiply.outer(tensor_operator(J_final, K, Q), tensor_operator(J, K, Q))
    weights /= 2 * K + 1
    weights.flags.writeable = False
    return weights


def tensor_weights(J: float, K: int, J_final: float | None = None) -> NDArray[np.float64]:
    """Weights M that turn an S-matrix block into the survival or transfer of a multipole of rank K.

    M[a,b,c,d] = (2K+1)^-1 sum_Q conj(T_KQ(J_final)[a,b]) T_KQ(J)[c,d], so that
    (2K+1)^-1 sum_Q Tr[T_KQ^+(J_final) S T_KQ(J) S^+] = sum_abcd M[a,b,c,d] S[a,c] conj(S[b,d]).

    Parameters
    ----------
    J : float
        Level before the collision [hbar].
    K : int
        Rank, 0 ... 2J.
    J_final : float or None
        Level after the collision [hbar]; None means J itself (square S).

    Returns
    -------
    M : array, shape (2J_final+1, 2J_final+1, 2J+1, 2J+1)
        Weights [1], real, read-only (cached).

    Raises
    ------
    InputError
        J or J_final is no angular momentum, or K does not exist in both.

    Source
    ------
    Omont, Prog. Quantum Electron. 5, 69 (1977); notes/angular.md.
    """
    final = J if J_final is None else J_final
    _rank(J, K)
    _rank(final, K)
    return _weights(float(J), int(K), float(final))


def multipole_survival(S: ArrayLike, J: float, K: int, J_final: float | None = None) -> NDArray[np.float64]:
    """(2K+1)^-1 sum_Q Tr[T_KQ^+(J_final) S T_KQ(J) S^+] of a batch of S-matrix blocks.

    Parameters
    ----------
    S : array, shape (..., 2J_final+1, 2J+1)
        S-matrix block from J to J_final [1]; rows and columns over descending m.
    J : float
        Level before the collision [hbar].
    K : int
        Rank, 0 ... 2J.
    J_final : float or None
        Level after the collision [hbar]; None means J itself.

    Returns
    -------
    survival : array, shape (...)
        Fraction of the multipole that stays (J_final = J) or arrives in J_final [1]; it is real.

    Raises
    ------
    InputError : as `tensor_weights`, or S has the wrong shape.
    """
    weights = tensor_weights(J, K, J_final)
    block = np.asarray(S)
    final, size = weights.shape[0], weights.shape[2]
    if block.shape[-2:] != (final, size):
        raise InputError(f"S has shape {block.shape}: its last two axes must be ({final}, {size}) for J, J_final")
    half = np.einsum("abcd,...ac->...bd", weights, block, optimize=True)
    return np.sum(half * block.conj(), axis=(-2, -1)).real
