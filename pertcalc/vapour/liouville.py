"""Steady state of the P levels after broad-band excitation: hyperfine structure, field and collisions at once.

The light is weak, the ground level unpolarised, the spectrum broad: an excitation leaves the nuclear spin alone, and so
do a collision and an emission. What is left is one linear equation for the density matrices of P1/2 and P3/2, each in
the operator basis ``T_kq(J) (x) |m_I><m_I'|``, where decay, collisions and the Zeeman term are diagonal and only the
hyperfine interaction couples. The axis is the field; ``Q = q + m_I - m_I'`` is conserved, so every Q is a system of its
own. Dropped: coherences between the two J (the fine structure is fast against every rate here) and the nuclear
Zeeman energy (g_I is below a thousandth of g_J). Equations, limits and checks: notes/scattering-polarisability.md.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from functools import lru_cache

import numpy as np
from numpy.typing import ArrayLike, NDArray

from pertcalc.angular import tensor_operator
from pertcalc.constants import MHZ_RAD_S
from pertcalc.errors import InputError, UnknownNameError
from pertcalc.species import UPPER_LEVEL, Isotope, alkali
from pertcalc.vapour.fill import larmor_rad_s
from pertcalc.vapour.level_rates import J_OF, OTHER_LEVEL, P_LEVELS, LevelRates

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]
Label = tuple[int, int, int, int]  # k, q, nuclear row, nuclear column (m_I descending)

# Fields solved in one batch: keeps the largest stack of matrices (40K) near 30 MB.
_BATCH = 64


@dataclass(frozen=True, slots=True)
class LevelStructure:
    """One fine-structure level of one isotope: ``H/hbar = A I.J + B (quadrupole) + g_J mu_B B J_z / hbar``.

    ``J``, ``I`` [hbar]; ``A``, ``B`` hyperfine constants [rad/s]; ``g`` electronic g factor [1].
    """

    J: float
    I: float
    A: float
    B: float
    g: float

    def energies(self) -> dict[float, float]:
        """Hyperfine energy of every F at zero field [rad/s], ``A C/2 + B [3C(C+1)/4 - I(I+1)J(J+1)]/[2I(2I-1)J(2J-1)]``
        with ``C = F(F+1) - I(I+1) - J(J+1)``. Source: any text on hyperfine structure."""
        I, J = self.I, self.J
        found = {}
        for F in np.arange(abs(I - J), I + J + 1):
            C = F * (F + 1) - I * (I + 1) - J * (J + 1)
            quadrupole = (0.75 * C * (C + 1) - I * (I + 1) * J * (J + 1)) / scale if (scale := _scale(J, I)) else 0.0
            found[float(F)] = float(0.5 * self.A * C + self.B * quadrupole)
        return found


def level_structure(isotope: Isotope, level: str) -> LevelStructure:
    """Structure of "S1/2", "P1/2" or "P3/2" of an isotope, from the species record; UnknownNameError for another."""
    if level not in J_OF:
        raise UnknownNameError("level", str(level), tuple(J_OF))
    constants = isotope.hyperfine[level]
    g = alkali(isotope.symbol).levels[level].gJ.value
    A, B = (MHZ_RAD_S * constants[name].value for name in ("A", "B"))
    return LevelStructure(J_OF[level], isotope.nuclear_spin, A, B, g)


@dataclass(frozen=True, slots=True)
class Response:
    """Polarisation of a level in the steady state, per polarisation of its excitation.

    ``level`` excited by ``line``; ``isotope`` its label; ``rank`` K; ``fields_G`` [G], shape (nB,); ``G`` [1], shape
    (len(components), nB): ``rho_KQ / source_KQ`` over ``rho_00 / source_00`` of the electron for each Q of
    ``components``, in ``rho = sum rho_KQ T_KQ`` with the field as axis (``G_-Q = G_Q*``), without hyperfine structure
    and collisions ``1/(1 + i Q omega/Gamma)``; ``population_s`` atoms in the level per excitation rate [s];
    ``work`` linear solves and the size of the largest.
    """

    line: str
    level: str
    isotope: str
    rank: int
    components: tuple[int, ...]
    fields_G: Array
    G: Complex
    population_s: float
    work: Mapping[str, int] = field(default_factory=dict)


def level_population(rates: LevelRates, level: str) -> float:
    """Steady population of ``level`` per rate of its excitation [s], return through the other P level included.

    ``n = 1 / (Gamma + o - o o' / (Gamma' + o'))`` with the outflows o, o'; the nuclear spin has no part in it.
    """
    other = OTHER_LEVEL[level]
    back = rates.gain[level][0] * rates.gain[other][0] / (rates.decay[other] + rates.loss[other][0])
    return 1.0 / (rates.decay[level] + rates.loss[level][0] - back)


def responses(
    isotope: Isotope,
    line: str,
    rates: LevelRates,
    fields_G: ArrayLike,
    rank: int = 2,
    components: Sequence[int] | None = None,
) -> Response:
    """Response of the level excited by ``line`` at every field: one linear system per field and component.

    ``(Gamma_J + loss_Jk + i q omega_J) rho + i [H_hfs, rho]/hbar - gain_J'k rho' = source T_KQ(J) (x) 1/(2I+1)``.

    Parameters
    ----------
    isotope : Isotope
        Gives nuclear spin, hyperfine constants and g_J.
    line : str
        "D1" or "D2".
    rates : LevelRates
        Decay, losses and gains of both P levels [s^-1].
    fields_G : array, shape (nB,)
        Fields along the axis, either sign [G].
    rank : int
        Rank K of excitation and detection: 2 for linear, 1 for circular polarisation.
    components : sequence of int, or None
        The Q wanted, 0 ... K; None means all.

    Returns
    -------
    Response
        A rank the level does not have (2 in P1/2) has no source, and the response is zero.

    Raises
    ------
    InputError
        A field or a rate is not finite, a decay is not positive, or rank or components do not fit.
    UnknownNameError
        Another line.

    Source
    ------
    Omont, Prog. Quantum Electron. 5, 69 (1977), relaxation of state multipoles with a spectator nuclear spin.
    """
    if line not in UPPER_LEVEL:
        raise UnknownNameError("line", str(line), tuple(UPPER_LEVEL))
    level = UPPER_LEVEL[line]
    structures = {name: level_structure(isotope, name) for name in P_LEVELS}
    wanted = tuple(range(rank + 1)) if components is None else tuple(int(Q) for Q in components)
    fields = _checked(rates, fields_G, rank, wanted)
    population = level_population(rates, level)
    G: Complex = np.zeros((len(wanted), fields.size), complex)
    work = {"solves": 0, "largest": 0}
    if rank <= 2 * structures[level].J:
        for row, Q in enumerate(wanted):
            G[row], size = _component(structures, level, rates, fields, rank, Q)
            work = {"solves": work["solves"] + fields.size, "largest": max(work["largest"], size)}
    G /= population
    return Response(line, level, isotope.label, rank, wanted, fields, G, population, work)


def _checked(rates: LevelRates, fields_G: ArrayLike, rank: int, components: tuple[int, ...]) -> Array:
    """The fields as an array; InputError that lists every bad argument."""
    fields = np.atleast_1d(np.asarray(fields_G, dtype=float))
    problems = []
    if fields.ndim != 1 or not np.isfinite(fields).all():
        problems.append("fields must be a list of finite numbers [G]; give other values")
    if rank not in (1, 2) or not all(0 <= Q <= rank for Q in components):
        problems.append(f"rank = {rank}, components = {components}: rank must be 1 or 2, components 0 ... rank")
    for level in P_LEVELS:
        if not (math.isfinite(rates.decay[level]) and rates.decay[level] > 0):
            problems.append(f"decay of {level} = {rates.decay[level]:g} s^-1 must be finite and > 0; give another rate")
        for name, values in (("loss", rates.loss[level]), ("gain", rates.gain[level])):
            problems += [
                f"{name} of rank {K} of {level} = {value:g} s^-1 must be finite{' and >= 0' * (name == 'loss')}; "
                "give another rate"
                for K, value in values.items()
                if not math.isfinite(value) or (name == "loss" and value < 0)
            ]
    if problems:
        raise InputError(problems)
    return fields


def _component(
    structures: Mapping[str, LevelStructure], level: str, rates: LevelRates, fields: Array, rank: int, Q: int
) -> tuple[Complex, int]:
    """rho_KQ of the electron per unit source at every field [s], and the size of the system."""
    other = OTHER_LEVEL[level]
    # What never returns cannot be felt: the other level is solved for only when both ways are open.
    returns = any(rates.gain[level][k] * rates.gain[other][k] for k in (0, 1))
    names = (level, other) if returns else (level,)
    labels = [(name, label) for name in names for label in _block(structures[name].J, structures[name].I, Q)[0]]
    index = {key: n for n, key in enumerate(labels)}
    matrix = _field_free(structures, names, rates, Q, index)
    # Zeeman term, diagonal: q times the Larmor frequency of the level, one diagonal per field.
    per_gauss = np.array([label[1] * larmor_rad_s(structures[name].g, 1.0) for name, label in labels])
    # The electron alone: rank K, component Q, times the unit matrix of the nucleus.
    trace = np.array([float(name == level and label[0] == rank and label[2] == label[3]) for name, label in labels])
    source = trace / trace.sum()
    size = len(labels)
    diagonal = np.arange(size)
    found = np.empty(fields.size, complex)
    for start in range(0, fields.size, _BATCH):
        some = fields[start : start + _BATCH]
        stack = np.repeat(matrix[None], some.size, axis=0)
        stack[:, diagonal, diagonal] += 1j * np.multiply.outer(some, per_gauss)
        solved = np.linalg.solve(stack, np.broadcast_to(source[:, None], (some.size, size, 1)))
        found[start : start + _BATCH] = solved[..., 0] @ trace
    return found, size


def _field_free(
    structures: Mapping[str, LevelStructure],
    names: tuple[str, ...],
    rates: LevelRates,
    Q: int,
    index: Mapping[tuple[str, Label], int],
) -> Complex:
    """Matrix of the system without field [s^-1]: decay, losses, hyperfine commutators, gains from the other level."""
    matrix = np.zeros((len(index), len(index)), complex)
    start = 0
    for name in names:
        one = structures[name]
        labels, dipole, quadrupole = _block(one.J, one.I, Q)
        here = slice(start, start + len(labels))
        start += len(labels)
        matrix[here, here] = 1j * (one.A * dipole + one.B * quadrupole)
        for label in labels:
            k, row = label[0], index[name, label]
            matrix[row, row] += rates.decay[name] + rates.loss[name][k]
            if k <= 1 and len(names) == 2:
                matrix[index[OTHER_LEVEL[name], label], row] = -rates.gain[name][k]
    return matrix


def _scale(J: float, I: float) -> float:
    """Denominator 2I(2I-1)J(2J-1) of the quadrupole term [1]; 0 where the term does not exist."""
    return 2 * I * (2 * I - 1) * J * (2 * J - 1)


def _hyperfine_operators(J: float, I: float) -> tuple[Array, Array]:
    """I.J and the quadrupole operator on |J m_J>|I m_I> [1], m descending; from rank-1 tensors, so real."""
    dot = np.zeros((round((2 * J + 1) * (2 * I + 1)),) * 2)
    if I > 0:
        # J_q = sqrt(J(J+1)(2J+1)/3) T_1q, and I.J = sum_q (-1)^q J_q I_-q.
        norm = math.prod(math.sqrt(j * (j + 1) * (2 * j + 1) / 3) for j in (J, I))
        for q in (-1, 0, 1):
            dot += norm * (-1) ** q * np.kron(tensor_operator(J, 1, q), tensor_operator(I, 1, -q))
    scale = _scale(J, I)
    if not scale:
        return dot, np.zeros_like(dot)
    return dot, (3 * dot @ dot + 1.5 * dot - I * (I + 1) * J * (J + 1) * np.eye(len(dot))) / scale


@lru_cache(maxsize=64)
def _block(J: float, I: float, Q: int) -> tuple[tuple[Label, ...], Array, Array]:
    """Labels of ``E_a = T_kq(J) (x) |m_I><m_I'|``, q + m_I - m_I' = Q; ``Tr(E_a^+ [H, E_b])`` of both operators.

    Row i of the nucleus is m_I = I - i, so m_I - m_I' = j - i.
    """
    electrons, nuclei = round(2 * J) + 1, round(2 * I) + 1
    labels = tuple(
        (k, Q - j + i, i, j)
        for k in range(electrons)
        for i in range(nuclei)
        for j in range(nuclei)
        if abs(Q - j + i) <= k
    )
    products = np.zeros((len(labels), electrons, nuclei, electrons, nuclei))
    for n, (k, q, i, j) in enumerate(labels):
        products[n, :, i, :, j] = tensor_operator(J, k, q)
    size = electrons * nuclei
    basis = products.reshape(len(labels), size, size)
    flat = basis.reshape(len(labels), size**2)
    commutators = [flat @ (H @ basis - basis @ H).reshape(flat.shape).T for H in _hyperfine_operators(J, I)]
    for matrix in commutators:
        matrix.flags.writeable = False  # shared by every caller through the cache
    return labels, commutators[0], commutators[1]
