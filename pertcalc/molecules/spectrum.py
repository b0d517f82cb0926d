"""Eigenvalues and vectors of many small symmetric matrices on one thread.

A linear-algebra library that splits a matrix of a hundred rows over threads waits longer than it computes: on two busy
processors the levels of one pair then take a hundred times as long.
"""

from __future__ import annotations

from functools import cache

import numpy as np
from threadpoolctl import ThreadpoolController

from pertcalc.molecules.radial import Array


@cache
def _threads() -> ThreadpoolController:
    """The thread pools of the libraries loaded by now; finding them takes milliseconds, so it is done once."""
    return ThreadpoolController()


def eigen(matrices: Array) -> tuple[Array, Array]:
    """Eigenvalues, rising, and orthonormal eigenvectors.

    Parameters
    ----------
    matrices : ndarray, shape (..., n, n)
        Symmetric [hartree].

    Returns
    -------
    values : ndarray, shape (..., n)
        [hartree]
    vectors : ndarray, shape (..., n, n)
        In the columns [1].
    """
    with _threads().limit(limits=1, user_api="blas"):
        values, vectors = np.linalg.eigh(matrices)
    return values, vectors
