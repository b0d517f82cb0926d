"""Invented isotopes and rates for the tests of the vapour, and a Liouvillian by brute force."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from pertcalc.angular import clebsch_gordan, tensor_operator
from pertcalc.constants import BOHR_MAGNETON_J_T, HBAR_J_S
from pertcalc.species import COMPUTED, Isotope, Sourced, alkali
from pertcalc.vapour.level_rates import J_OF, OTHER_LEVEL, P_LEVELS, LevelRates, population_gain

RAD_S_G = BOHR_MAGNETON_J_T * 1e-4 / HBAR_J_S  # mu_B/hbar [rad/s/G]
DECAY = {"P1/2": 3.6e7, "P3/2": 3.8e7}


def invented(value: float, unit: str) -> Sourced:
    return Sourced(value, unit, "invented for a test", COMPUTED)


def made_isotope(spin: float, A: dict[str, float] | None = None, B: float = 0.0, symbol: str = "Rb") -> Isotope:
    """An isotope with hyperfine constants A by level and B of P3/2 [MHz]; none given: no hyperfine structure."""
    constants = {level: {"A": 0.0, "B": 0.0} | {"A": (A or {}).get(level, 0.0)} for level in ("S1/2", *P_LEVELS)}
    constants["P3/2"]["B"] = B
    real = alkali(symbol).isotopes[0]
    hyperfine = {level: {n: invented(v, "MHz") for n, v in pair.items()} for level, pair in constants.items()}
    return replace(real, label=f"I={spin:g}", spin=invented(spin, "1"), hyperfine=hyperfine)


def scaled_isotope(isotope: Isotope, factor: float) -> Isotope:
    """The isotope with every hyperfine constant times a factor."""
    hyperfine = {
        level: {name: replace(one, value=factor * one.value) for name, one in pair.items()}
        for level, pair in isotope.hyperfine.items()
    }
    return replace(isotope, hyperfine=hyperfine)


def made_rates(
    loss_1: float = 0.0,
    ranks: tuple[float, float, float] = (0.0, 0.0, 0.0),
    outflow: tuple[float, float] = (0.0, 0.0),
    gain_1: tuple[float, float] = (0.0, 0.0),
    decay: dict[str, float] | None = None,
) -> LevelRates:
    """Depolarising losses of P1/2 (K = 1) and P3/2 (K = 1, 2, 3), outflows and gains of rank 1 of both [s^-1]."""
    low, high = outflow
    loss = {
        "P1/2": {0: low, 1: low + loss_1},
        "P3/2": {0: high} | {K: high + value for K, value in enumerate(ranks, 1)},
    }
    gain = {
        level: {0: population_gain(level, out), 1: one}
        for level, out, one in zip(P_LEVELS, outflow, gain_1, strict=True)
    }
    return LevelRates(decay or DECAY, loss, gain)


def spin_matrices(j: float) -> list[np.ndarray]:
    """J_x, J_y, J_z over m = j ... -j, from the ladder operators."""
    m = np.arange(j, -j - 1, -1)
    up = np.diag(np.sqrt(j * (j + 1) - m[1:] * (m[1:] + 1)), 1)
    return [(up + up.T) / 2, (up - up.T) / 2j, np.diag(m).astype(complex)]


def hamiltonian(isotope: Isotope, level: str, field: np.ndarray) -> np.ndarray:
    """A I.J + B (3 (I.J)^2 + 3/2 I.J - I(I+1)J(J+1)) / (2I(2I-1)J(2J-1)) + g_J mu_B B.J, over hbar [rad/s]."""
    I, J = isotope.nuclear_spin, J_OF[level]
    electron = [np.kron(one, np.eye(round(2 * I) + 1)) for one in spin_matrices(J)]
    nucleus = [np.kron(np.eye(round(2 * J) + 1), one) for one in spin_matrices(I)]
    dot = sum(a @ b for a, b in zip(electron, nucleus, strict=True))
    A, B = (2e6 * np.pi * isotope.hyperfine[level][name].value for name in ("A", "B"))
    H = A * dot
    if B:
        scale = 2 * I * (2 * I - 1) * J * (2 * J - 1)
        H = H + B * (3 * dot @ dot + 1.5 * dot - I * (I + 1) * J * (J + 1) * np.eye(len(dot))) / scale
    g = alkali(isotope.symbol).levels[level].gJ.value
    return H + g * RAD_S_G * sum(b * one for b, one in zip(field, electron, strict=True))


class WholeLiouvillian:
    """Both P levels of one isotope in full: every coherence inside a level, superoperators by kron, no symmetry used.

    rho of a level is flattened by rows: vec(A rho B) = (A kron B^T) vec(rho).
    """

    def __init__(self, isotope: Isotope, rates: LevelRates, field: np.ndarray):
        """``field`` vector [G], any direction."""
        self.nuclei = round(2 * isotope.nuclear_spin) + 1
        self.sizes = {level: (round(2 * J_OF[level]) + 1) * self.nuclei for level in P_LEVELS}
        self.start = {"P1/2": 0, "P3/2": self.sizes["P1/2"] ** 2}
        total = sum(size**2 for size in self.sizes.values())
        self.L = np.zeros((total, total), complex)
        for level in P_LEVELS:
            here = self.here(level)
            H = hamiltonian(isotope, level, field)
            one = np.eye(len(H))
            self.L[here, here] = 1j * (np.kron(H, one) - np.kron(one, H.T)) + rates.decay[level] * np.eye(len(H) ** 2)
            for K, loss in rates.loss[level].items():
                self.L[here, here] += loss * self.multipole_map(level, level, K)
            for K, gain in rates.gain[level].items():
                self.L[self.here(OTHER_LEVEL[level]), here] -= gain * self.multipole_map(level, OTHER_LEVEL[level], K)

    def here(self, level: str) -> slice:
        return slice(self.start[level], self.start[level] + self.sizes[level] ** 2)

    def multipole_map(self, level: str, final: str, K: int) -> np.ndarray:
        """sum_q |T_Kq(final)) (T_Kq(level)| on the electron, unit on |m_I><m_I'|, as a superoperator."""
        n = self.nuclei
        total = 0.0
        for q in range(-K, K + 1):
            a, b = tensor_operator(J_OF[final], K, q), tensor_operator(J_OF[level], K, q)
            # rho[m i, m' j] -> a[p, p'] sum_mm' b[m, m'] rho[m i, m' j]
            one = np.einsum("ab,cd,ij,kl->aibkcjdl", a, b, np.eye(n), np.eye(n), optimize=True)
            total = total + one.reshape(self.sizes[final] ** 2, self.sizes[level] ** 2)
        return total

    def source(self, level: str, electron: np.ndarray) -> np.ndarray:
        """Vector of an excitation of ``level`` with an electronic matrix, nucleus unpolarised."""
        vector = np.zeros(len(self.L), complex)
        vector[self.here(level)] = np.kron(electron, np.eye(self.nuclei) / self.nuclei).ravel()
        return vector

    def electron(self, vector: np.ndarray, level: str) -> np.ndarray:
        """Density matrix of the electron: trace over the nucleus."""
        d, n = round(2 * J_OF[level]) + 1, self.nuclei
        return np.einsum("aibi->ab", vector[self.here(level)].reshape(d, n, d, n))


def dipole_vectors(J: float) -> list[list[np.ndarray]]:
    """For each m of the lower level J = 1/2: columns <J m'| d_x, d_y, d_z |1/2 m>, from Clebsch-Gordan coefficients.

    d_x = (d_-1 - d_+1)/sqrt2, d_y = i (d_-1 + d_+1)/sqrt2, d_z = d_0.
    """
    uppers = np.arange(J, -J - 1, -1)
    found = []
    for m in (0.5, -0.5):
        d = {q: np.array([clebsch_gordan(0.5, m, 1, q, J, upper) for upper in uppers], complex) for q in (-1, 0, 1)}
        found.append([(d[-1] - d[1]) / np.sqrt(2), 1j * (d[-1] + d[1]) / np.sqrt(2), d[0]])
    return found


def dipole_operator(J: float, e: np.ndarray) -> np.ndarray:
    """sum_m (d.e)|1/2 m><1/2 m|(d.e)^+ for a real unit vector e: excitation by light along e, and detection of it."""
    amplitudes = [sum(a * one for a, one in zip(e, vectors, strict=True)) for vectors in dipole_vectors(J)]
    return sum(np.outer(one, one.conj()) for one in amplitudes)
