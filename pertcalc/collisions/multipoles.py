"""From S-matrices to what is averaged over impact parameters: optical amplitudes, multipole losses, transfer."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from pertcalc.angular import multipole_survival
from pertcalc.collisions.scattering import Scattering

Array = NDArray[np.float64]

# The order of the observables in every table of the semiclassical method.
OBSERVABLES = (
    "P1/2.width",  # Re[1 - Tr S e^{-i line phase}/(2J+1)]
    "P1/2.shift",  # Im of the same
    "P1/2.outflow",
    "P1/2.loss1",
    "P3/2.width",
    "P3/2.shift",
    "P3/2.outflow",
    "P3/2.loss1",
    "P3/2.loss2",
    "P3/2.loss3",
    "gain1",  # rank 1 carried from either level to the other (the same both ways: S is symmetric)
)
INDEX = {name: i for i, name in enumerate(OBSERVABLES)}


def level_blocks(scattering: Scattering) -> tuple[NDArray, NDArray, NDArray]:
    """S of P1/2 (n, 2, 2), of P3/2 (n, 4, 4) and from P1/2 to P3/2 (n, 4, 2), all over descending m [1]."""
    A, B = scattering.block_a, scattering.block_b
    n = A.shape[0]
    low = np.zeros((n, 2, 2), dtype=complex)
    high = np.zeros((n, 4, 4), dtype=complex)
    cross = np.zeros((n, 4, 2), dtype=complex)
    # Rows of P3/2 that a block holds: A has m = 3/2 and -1/2, B has m = -3/2 and 1/2. B is the mirror image of A, and
    # the image of |1/2, -1/2> is minus |1/2, 1/2> in the phases of Condon and Shortley.
    for block, rows, m_low, sign in ((A, (0, 2), 1, 1), (B, (3, 1), 0, -1)):
        low[:, m_low, m_low] = block[:, 2, 2]
        for i, row in enumerate(rows):
            cross[:, row, m_low] = sign * block[:, i, 2]
            for j, column in enumerate(rows):
                high[:, row, column] = block[:, i, j]
    return low, high, cross


def observables(scattering: Scattering) -> Array:
    """Every quantity of OBSERVABLES for every collision, shape (n, len(OBSERVABLES)) [1].

    Multipole losses are 1 - (2K+1)^-1 sum_Q Tr[T_KQ^+ S T_KQ S^+] (orthonormal T); K = 0 is the outflow.
    """
    low, high, cross = level_blocks(scattering)
    turned = np.exp(-1j * scattering.line_phase)
    optical = [1 - np.trace(S, axis1=1, axis2=2) * turned / S.shape[-1] for S in (low, high)]
    outflow = np.sum(np.abs(cross) ** 2, axis=(1, 2))
    columns = [
        optical[0].real,
        optical[0].imag,
        outflow / 2,
        1 - multipole_survival(low, 0.5, 1),
        optical[1].real,
        optical[1].imag,
        outflow / 4,
        *(1 - multipole_survival(high, 1.5, K) for K in (1, 2, 3)),
        multipole_survival(cross, 0.5, 1, 1.5),
    ]
    return np.stack(columns, axis=-1)
