"""What a relaxation matrix of hyperfine multipoles holds: its rows, its eigenrates and what decays with them."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from pertcalc.errors import InputError

# Eigenvalues closer than this, relative to the largest element, belong together: their vectors are arbitrary.
_DEGENERATE = 1e-9


class Pair(NamedTuple):
    """Multipole rho^K(F1,F2) of the level with electronic angular momentum J; a coherence where F1 != F2."""

    J: float
    F1: float
    F2: float


class Product(NamedTuple):
    """Product T_k(J) x T_kappa(I) coupled to K: electronic rank k, nuclear rank kappa."""

    J: float
    k: int
    kappa: int


@dataclass(frozen=True, slots=True)
class Eigenrate:
    """One distinct eigenvalue rate + i frequency of a relaxation matrix and what decays with it.

    ``rate`` [s^-1], ``frequency`` [rad/s]; ``multiplicity`` how many eigenvalues coincide (2K+1 components apart);
    ``electronic`` (J, k) -> share of that electronic rank and ``hyperfine`` Pair -> share, each summing to 1 and
    averaged over coinciding vectors, which are arbitrary one by one (squared moduli of the right eigenvectors).
    Without gains rate = sum over k of share (gamma_k + decay), exactly, with hyperfine frequencies or without.
    """

    rate: float
    frequency: float
    multiplicity: int
    electronic: Mapping[tuple[float, int], float]
    hyperfine: Mapping[Pair, float]

    @property
    def rank(self) -> tuple[float, int]:
        """(J, k) with the largest share; the mode is purely electronic only where that share is 1."""
        return max(self.electronic, key=lambda key: self.electronic[key])


@dataclass(frozen=True, slots=True)
class Relaxation:
    """d rho^K/dt = -matrix rho^K of the hyperfine multipoles of rank K, the same for each component Q.

    ``pairs`` rows of ``matrix`` [s^-1] (complex with frequencies); ``products`` columns of ``U``, whose rows are
    ``pairs``. rho^K belongs to orthonormal tensors: Tr rho = sum_F sqrt(2F+1) rho^0(F,F).
    """

    I: float
    K: int
    pairs: tuple[Pair, ...]
    matrix: NDArray
    products: tuple[Product, ...]
    U: NDArray[np.float64]

    def losses(self) -> dict[Pair, float]:
        """Total loss of each multipole: the diagonal of the matrix [s^-1]."""
        return {pair: float(loss) for pair, loss in zip(self.pairs, np.diag(self.matrix).real, strict=True)}

    def population_matrix(self) -> NDArray[np.float64]:
        """W of dN_F/dt = -sum_F' W(F,F') N_F' for the populations N_F = sqrt(2F+1) rho^0(F,F) [s^-1].

        Raises
        ------
        InputError
            K is not 0.
        """
        if self.K != 0:
            raise InputError(f"K = {self.K} has no populations: build the relaxation with K = 0")
        root = np.sqrt([2 * pair.F1 + 1 for pair in self.pairs])
        return root[:, None] * self.matrix.real / root

    def eigenvalues(self) -> NDArray[np.complex128]:
        """Eigenvalues rate + i frequency, by rising rate [s^-1 and rad/s]."""
        return np.sort_complex(self._modes()[0])

    def _modes(self) -> tuple[NDArray, NDArray]:
        M = self.matrix
        symmetric = np.isrealobj(M) and np.max(np.abs(M - M.T)) <= 1e-13 * np.max(np.abs(M))
        values, vectors = np.linalg.eigh((M + M.T) / 2) if symmetric else np.linalg.eig(M)
        return values, vectors

    def eigenrates(self) -> tuple[Eigenrate, ...]:
        """The distinct eigenvalues by rising rate, with the share of each electronic rank and each pair in them."""
        values, vectors = self._modes()
        near = _DEGENERATE * np.max(np.abs(self.matrix), initial=0.0)
        groups: list[list[int]] = []
        for index in np.lexsort((values.imag, values.real)):
            home = next((group for group in groups if abs(values[group[0]] - values[index]) <= near), None)
            groups.append([index]) if home is None else home.append(index)
        return tuple(self._eigenrate(values[group], vectors[:, group]) for group in groups)

    def _eigenrate(self, values: NDArray, vectors: NDArray) -> Eigenrate:
        space = np.linalg.qr(vectors)[0]
        value, size = complex(np.mean(values)), len(values)
        electronic: dict[tuple[float, int], float] = {}
        for product, share in zip(self.products, np.sum(np.abs(self.U.T @ space) ** 2, axis=1) / size, strict=True):
            key = (product.J, product.k)
            electronic[key] = electronic.get(key, 0.0) + float(share)
        in_pairs = np.sum(np.abs(space) ** 2, axis=1) / size
        hyperfine = {pair: float(share) for pair, share in zip(self.pairs, in_pairs, strict=True)}
        return Eigenrate(value.real, value.imag, size, electronic, hyperfine)
