"""Hyperfine levels: which F belong to J and I, and their energies from the constants A and B."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from pertcalc.errors import InputError
from pertcalc.species import Isotope
from pertcalc.vapour.level_rates import J_OF


def _whole_or_half(name: str, value: float, problems: list[str]) -> None:
    if not (isinstance(value, int | float | np.number) and math.isfinite(value) and 2 * value == round(2 * value) >= 0):
        problems.append(f"{name} = {value!r} must be a whole or half number >= 0, such as 1 or 1.5")


def check_momenta(I: float, levels: Sequence[float], K: int | None = None) -> None:
    """InputError that lists every bad quantum number; K must exist for the largest J."""
    problems: list[str] = []
    _whole_or_half("I", I, problems)
    for J in levels:
        _whole_or_half("J", J, problems)
    if not levels:
        problems.append("loss = {} must hold at least one level: give its electronic rates")
    if K is not None and not problems:
        top = round(2 * (max(levels) + I))
        if not isinstance(K, int | np.integer) or not 0 <= K <= top:
            problems.append(f"K = {K!r} must be an integer from 0 to 2(J+I) = {top}")
    if problems:
        raise InputError(problems)


def f_values(J: float, I: float) -> NDArray[np.float64]:
    """Hyperfine levels of J and I, ascending.

    Parameters
    ----------
    J, I : float
        Electronic angular momentum and nuclear spin [hbar].

    Returns
    -------
    F : array, shape (2 min(J, I) + 1,)
        |J-I|, ..., J+I [hbar].

    Raises
    ------
    InputError
        J or I is no angular momentum.
    """
    check_momenta(I, [J])
    return np.arange(round(2 * abs(J - I)), round(2 * (J + I)) + 1, 2) / 2.0


def hyperfine_energies(J: float, I: float, A_MHz: float, B_MHz: float = 0.0) -> NDArray[np.float64]:
    """Energies of the F levels against their centre of gravity (Casimir's formula).

    E(F) = A C/2 + B [3C(C+1)/4 - I(I+1)J(J+1)] / [2I(2I-1)J(2J-1)], C = F(F+1) - I(I+1) - J(J+1).

    Parameters
    ----------
    J, I : float
        Electronic angular momentum and nuclear spin [hbar].
    A_MHz, B_MHz : float
        Magnetic dipole and electric quadrupole constant [MHz]; B must be 0 where J or I is below 1.

    Returns
    -------
    E : array, shape of f_values(J, I)
        E(F)/h [MHz], F ascending.

    Raises
    ------
    InputError
        J or I is no angular momentum, a constant is not finite, or B is given where no quadrupole coupling exists.

    Source
    ------
    Arimondo, Inguscio and Violino, Rev. Mod. Phys. 49, 31 (1977), eq. (1), from memory; checked against the operators.
    """
    F = f_values(J, I)
    problems = [
        f"{name} = {value!r} must be finite [MHz]"
        for name, value in (("A_MHz", A_MHz), ("B_MHz", B_MHz))
        if not math.isfinite(value)
    ]
    if B_MHz and min(I, J) < 1:
        problems.append(f"B_MHz = {B_MHz!r} must be 0 for J = {J:g}, I = {I:g}: a quadrupole needs both at least 1")
    if problems:
        raise InputError(problems)
    squares = I * (I + 1), J * (J + 1)
    C = F * (F + 1) - sum(squares)
    energy = A_MHz * C / 2
    if B_MHz:
        energy += B_MHz * (0.75 * C * (C + 1) - squares[0] * squares[1]) / (2 * I * (2 * I - 1) * J * (2 * J - 1))
    return energy


def isotope_energies(isotope: Isotope, level: str) -> NDArray[np.float64]:
    """`hyperfine_energies` [MHz] of one level ("S1/2", "P1/2", "P3/2") of an isotope, from its species record."""
    constants = isotope.hyperfine[level]
    B = constants["B"].value if "B" in constants else 0.0
    return hyperfine_energies(J_OF[level], isotope.nuclear_spin, constants["A"].value, B)
