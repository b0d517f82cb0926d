"""All levels of all N of the ground curve of Cs-Xe, the largest pair, against a dense uniform grid, in one run.

    python -m pytest tests/benchmarks/test_molecule_speed.py -m benchmark -s

Baseline: the sinc discrete-variable representation on a uniform grid in R, one dense diagonalisation per N, with the
smallest box and number of points (of those tried) that give every level of N = 0 to ACCURACY_CM1. Three values of N are
timed and scaled up. Its box must hold the weakest level, its spacing the wavelength at the bottom of the well.
"""

from __future__ import annotations

import resource
import time

import numpy as np
import pytest

from pertcalc.constants import HARTREE_CM1
from pertcalc.curves.files import load_default
from pertcalc.molecules.levels import bound_levels
from pertcalc.molecules.quasibound import quasibound_levels
from pertcalc.molecules.radial import state_problem
from pertcalc.molecules.spectrum import eigen

pytestmark = pytest.mark.benchmark

ACCURACY_CM1 = 1e-5
BOXES = (100.0, 150.0, 200.0, 300.0, 450.0)


def uniform(problem, end: float, n: int):
    """Points, kinetic matrix and R^-2 term of the sinc representation between the wall and an end [bohr]."""
    R = np.linspace(0.97 * problem.r_in, end, n)
    i = np.subtract.outer(np.arange(n), np.arange(n))
    with np.errstate(divide="ignore"):
        T = np.where(i == 0, np.pi**2 / 3, 2.0 / i**2 * (-1.0) ** i) / (2 * problem.reduced_mass * (R[1] - R[0]) ** 2)
    return R, T


def test_all_levels_of_the_largest_ground_state():
    problem = state_problem(load_default("Cs", "Xe"), "X")
    start = time.perf_counter()
    levels = bound_levels(problem)
    ours = time.perf_counter() - start
    start = time.perf_counter()
    quasi = quasibound_levels(problem, levels)
    metastable = time.perf_counter() - start

    highest = int(levels.N.max())
    wanted = levels.energy[levels.N == 0]
    for end in BOXES:
        for density in (4.5, 5.5):
            R, T = uniform(problem, end, int(density * end))
            E = eigen(T + np.diag(problem.potential(R)))[0][: len(wanted)]
            error = float(np.abs(E - wanted).max()) * HARTREE_CM1
            if error < ACCURACY_CM1:
                break
        if error < ACCURACY_CM1:
            break
    sample = (0, highest // 2, highest)
    start = time.perf_counter()
    for N in sample:
        eigen(T + np.diag(problem.effective(R, float(N))))
    baseline = (time.perf_counter() - start) * (highest + 1) / len(sample)
    memory = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024
    print(
        f"\nCs-Xe X: {len(levels.v)} bound levels, N up to {highest}: {ours:.2f} s on {levels.points} points (error "
        f"{levels.numerical_error * HARTREE_CM1:.0e} cm^-1); {len(quasi.N)} quasi-bound levels {metastable:.2f} s more"
        f"\nuniform grid to {end:.0f} bohr: {len(R)} points (error {error:.0e} cm^-1), {baseline:.0f} s: ratio "
        f"{baseline / ours:.0f}; peak memory {memory:.0f} MB"
    )
    assert error < ACCURACY_CM1
    assert ours < 5.0 and memory < 500.0
