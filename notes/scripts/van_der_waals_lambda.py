"""Made the constants Lambda_K of `pertcalc.collisions.closed_form`: depolarisation by van der Waals anisotropy.

One level J on a straight path, coupling strength beta = dC6/(hbar v b^5), dC6 = C6(Sigma) - C6(Pi) (times 2/3 for
J = 3/2 of a P term). In the frame that turns with the molecular axis the coupling is diagonal and the turning is a
constant matrix, so one step is: half a phase, a fixed rotation, half a phase (Strang, second order, unitary).
    Pi_K = 1 - (2K+1)^-1 sum_Q Tr(T_KQ^+ S T_KQ S^+),  sigma_K = Lambda_K (dC6/hbar v)^(2/5),
    Lambda_K = 2 pi Int u du Pi_K(beta = u^-5).
Run: python notes/scripts/van_der_waals_lambda.py  (about one minute). Checked in tests/exact/test_closed_form.py.
"""

from __future__ import annotations

import numpy as np

from pertcalc import angular
from pertcalc.quadrature import gauss_legendre_panels


def straight_path_s_matrix(beta: np.ndarray, J: float, steps: int) -> np.ndarray:
    """S of each beta, shape (n, 2J+1, 2J+1), quantised along the incoming direction of the axis."""
    m = angular.projections(J)
    raise_m = np.diag(np.sqrt(J * (J + 1) - m[1:] * (m[1:] + 1)), 1)
    turn_generator = (raise_m - raise_m.T) / 2j  # J_y
    lowest = np.abs(m) == np.abs(m).min()  # |Omega| = 0 (J=1) or 1/2 (J=3/2): where Sigma is admixed
    strength = {1.0: 1.0, 1.5: 2 / 3}[J]
    d = np.pi / steps
    values, vectors = np.linalg.eigh(turn_generator)
    turn = (vectors * np.exp(1j * d * values)) @ vectors.conj().T

    edges = np.linspace(-np.pi / 2, np.pi / 2, 2 * steps + 1)
    primitive = 3 * edges / 8 + np.sin(2 * edges) / 4 + np.sin(4 * edges) / 32  # Int cos^4
    half_steps = np.diff(primitive)
    # Two half phases that meet between steps are one phase.
    phases = np.concatenate([half_steps[:1], half_steps[1:-1:2] + half_steps[2::2], half_steps[-1:]])
    U = np.broadcast_to(np.eye(len(m), dtype=complex), (len(beta), len(m), len(m))).copy()
    for index, share in enumerate(phases):
        U[:, lowest, :] *= np.exp(1j * strength * beta * share)[:, None, None]
        if index < steps:
            U = turn @ U
    whole = (vectors * np.exp(-1j * np.pi * values)) @ vectors.conj().T
    return whole @ U


def depolarisation(beta: np.ndarray, J: float, steps: int) -> dict[int, np.ndarray]:
    """Pi_K(beta) for K = 1 ... 2J, one Richardson step beyond Strang."""
    coarse, fine = (straight_path_s_matrix(np.asarray(beta, float), J, n) for n in (steps, 2 * steps))
    result = {}
    for K in range(1, round(2 * J) + 1):
        kept = [angular.multipole_survival(S, J, K) for S in (coarse, fine)]
        result[K] = 1 - (4 * kept[1] - kept[0]) / 3
    return result


def strong_limit(J: float) -> dict[int, float]:
    """Pi_K for beta -> infinity, phase between the two |Omega| averaged: each is followed adiabatically.

    Inside |Omega| = 1/2 the turning acts through its own block of J_y; the pairs +-Omega above it do not turn at all.
    """
    m = angular.projections(J)
    raise_m = np.diag(np.sqrt(J * (J + 1) - m[1:] * (m[1:] + 1)), 1)
    turn_generator = (raise_m - raise_m.T) / 2j
    lowest = np.diag((np.abs(m) == np.abs(m).min()).astype(float))
    parts = [lowest @ _exponential(np.pi * lowest @ turn_generator @ lowest) @ lowest, np.eye(len(m)) - lowest]
    whole = _exponential(-np.pi * turn_generator)
    return {
        K: 1 - sum(float(angular.multipole_survival(whole @ part, J, K)) for part in parts)
        for K in range(1, round(2 * J) + 1)
    }


def _exponential(generator: np.ndarray) -> np.ndarray:
    values, vectors = np.linalg.eigh(generator)
    return (vectors * np.exp(1j * values)) @ vectors.conj().T


# Pi_K / (pi beta)^2 for beta -> 0.
BORN = {(1.0, 1): 7 / 256, (1.0, 2): 21 / 1280, (1.5, 1): 7 / 960, (1.5, 2): 7 / 480, (1.5, 3): 7 / 960}


def lambdas(J: float, beta_max: float, panels: int, order: int, steps: int) -> dict[int, float]:
    """Lambda_K; Born law below beta = 0.05, and above beta_max the strong limit plus a term in beta^(-1/4).

    The two |Omega| decouple where beta cos^4 phi is about 1, an angle beta^(-1/4) from the ends: the order of the term.
    """
    low, high = beta_max**-0.2, 0.05**-0.2
    # Pi_K oscillates with beta, so panels are equal in beta^(1/2): even in phase, not wasteful at large beta.
    edges = np.linspace(0.05**0.5, beta_max**0.5, panels + 1)[::-1] ** -0.4
    edges[0], edges[-1] = low, high
    u, w = gauss_legendre_panels(edges, order)
    last = slice(0, panels // 4 * order)
    found = {}
    for K, loss in depolarisation(u**-5, J, steps).items():
        limit = strong_limit(J)[K]
        slope = np.sum((w * u * (loss - limit))[last]) / np.sum((w * u ** (1 + 5 / 4))[last])
        inner = limit * low**2 / 2 + slope * low ** (13 / 4) / (13 / 4)
        outer = BORN[J, K] * np.pi**2 * high**-8 / 8  # Int_high^inf u (u^-5)^2 du
        found[K] = float(2 * np.pi * (inner + w @ (u * loss) + outer))
    return found


if __name__ == "__main__":
    for level in (1.0, 1.5):
        print(level, "strong limit", strong_limit(level))
        for setting in ((300.0, 80, 12, 1000), (3000.0, 240, 12, 4000), (10000.0, 480, 12, 8000)):
            print(level, setting, lambdas(level, *setting))
