"""Where the time of quantum close coupling goes, as ratios measured in one run. Nothing is asserted about the clock.

    python -m pytest tests/benchmarks/test_quantum_speed.py -m benchmark -s

Baseline: the same log-derivative recursion with the same steps, one matrix at a time with numpy.linalg, potentials
ready in arrays; its result is checked to be the same. The limit of batched numpy: every array operation of one step,
counted while it runs, at the speed of a plain multiplication of arrays of that size.
"""

from __future__ import annotations

import time
import tracemalloc
from dataclasses import dataclass

import numpy as np
import pytest

from pertcalc.collisions import close_coupling
from pertcalc.collisions.close_coupling import ground_matrices, scattering_matrices
from pertcalc.collisions.log_derivative import Blocks, propagate
from pertcalc.collisions.multipoles import OBSERVABLES
from pertcalc.collisions.partial_waves import LEVELS, line_cross_section, multipole_cross_sections
from pertcalc.collisions.quantum import level_cross_sections, level_tables
from pertcalc.collisions.semiclassical import reach
from tests.collision_cases import default_pair, thermal
from tests.test_log_derivative import full

pytestmark = pytest.mark.benchmark

SIZES = (200, 800, 3200)
STEPS = 200
SECONDS_ALLOWED = 15.0  # one pair, both levels, 12 energies, on two cores (issue of this method); printed beside ours


def best_of(n: int, work) -> float:
    """Shortest of n wall-clock times [s]."""
    times = []
    for _ in range(n):
        start = time.perf_counter()
        work()
        times.append(time.perf_counter() - start)
    return min(times)


def blocks_of_k_ar(n: int) -> tuple[Blocks, float, object]:
    """n blocks of K-Ar at E = kT = 373 K, one parity, partial waves as they come; k and the potentials."""
    pair = default_pair("K", "Ar")
    energy = thermal(373.0) + pair.splitting
    mass = pair.reduced_mass
    found = close_coupling.channels(0.5 + np.arange(n) % 300, "e")
    k2 = 2 * mass * np.array([energy, energy - pair.splitting, energy - pair.splitting])
    N = np.maximum(found.partial, 0)
    momentum2 = np.where(found.partial < 0, -k2[0], k2[:, None])

    def potential(R):
        _, difference, pi = pair.table(R)
        return 2 * mass * pi, 2 * mass * difference

    return Blocks(momentum2, N * (N + 1), found.axis), float(np.sqrt(k2[0])), potential


def one_at_a_time(blocks: Blocks, b: int, piece, pi, D, initial: float) -> np.ndarray:
    """The recursion of one block with numpy.linalg; pi, D at every point of the piece."""
    start, h, steps = piece
    eye, outer = np.eye(3), np.outer(blocks.axis[:, b], blocks.axis[:, b])
    k2, centrifugal = blocks.momentum2[:, b], blocks.centrifugal[:, b]
    z = h * initial * eye
    for i in range(steps + 1):
        Q = np.diag(k2 - centrifugal / (start + h * i) ** 2 - pi[i]) - D[i] * outer
        if i:
            z = np.linalg.solve(eye + z, z)
        if i % 2:
            z = z - 4 * h * h / 3 * (np.linalg.solve(eye + h * h / 6 * Q, Q))
        else:
            z = z - (1 if i in (0, steps) else 2) * h * h / 3 * Q
    return z / h


class Counting(np.ndarray):
    """Counts the elements that numpy's elementwise operations write."""

    elements = 0

    def __array_ufunc__(self, ufunc, method, *inputs, **kwargs):
        plain = [np.asarray(x) if isinstance(x, Counting) else x for x in inputs]
        out = getattr(ufunc, method)(*plain, **kwargs)
        Counting.elements += np.size(out if method == "__call__" else plain[0])
        return np.asarray(out).view(Counting) if np.ndim(out) else out


def elements_per_step(blocks: Blocks, potential, piece) -> float:
    """Elements written per matrix and step."""
    counted = Blocks(*(np.asarray(x).view(Counting) for x in (blocks.momentum2, blocks.centrifugal, blocks.axis)))
    Counting.elements = 0
    propagate(counted, potential, [piece], 20.0)
    return Counting.elements / blocks.momentum2.shape[1] / piece[2]


def test_one_matrix_and_step():
    print("\n\n== one matrix, one step (K-Ar, E = kT = 373 K)")
    blocks, k, potential = blocks_of_k_ar(SIZES[0])
    piece = (6.0, 1 / (4 * k), STEPS)
    pi, D = potential(piece[0] + piece[1] * np.arange(STEPS + 1.0))
    sample = (0, 60, 120)
    start = time.perf_counter()
    singly = [one_at_a_time(blocks, b, piece, pi, D, 20.0) for b in sample]
    baseline = (time.perf_counter() - start) / len(sample) / STEPS
    y, _ = propagate(blocks, potential, [piece], 20.0)
    for b, alone in zip(sample, singly, strict=True):
        np.testing.assert_allclose(full(y)[b], alone, rtol=1e-6, atol=1e-6 * np.abs(alone).max())
    print(f"  one at a time, numpy.linalg        {baseline * 1e9:9.0f} ns per matrix and step")
    for n in SIZES:
        blocks, _, potential = blocks_of_k_ar(n)
        count = propagate(blocks, potential, [piece], 20.0)[1]
        spent = best_of(5, lambda b=blocks, V=potential: propagate(b, V, [piece], 20.0))
        work = elements_per_step(blocks, potential, piece)
        a, c, out = np.random.default_rng(1).normal(size=(3, n))
        element = best_of(2000, lambda a=a, c=c, out=out: np.multiply(a, c, out=out)) / n
        limit = work * element
        print(
            f"  batch of {n:5d}                     {spent / n / STEPS * 1e9:9.1f} ns, {spent / count * 1e9:5.1f} ns "
            f"per inversion; ratio {baseline / (spent / n / STEPS):6.0f}\n"
            f"      {work:5.0f} elements written, at {element * 1e9:4.2f} ns each {limit * 1e9:6.1f} ns: "
            f"measured over limit {spent / n / STEPS / limit:4.1f}"
        )


@dataclass
class Clock:
    """Seconds by part of the computation."""

    propagation: float = 0.0
    ground: float = 0.0
    sums: float = 0.0


def parts(pair, level: str, energy: float) -> tuple[Clock, int]:
    """One level at one kinetic energy, part by part, with the constants of ordinary use; inversions."""
    clock, index = Clock(), LEVELS.index(level)
    above = energy + index * pair.splitting
    radius = reach(pair, float(np.sqrt(2 * energy / pair.reduced_mass)))
    start = time.perf_counter()
    matrices = scattering_matrices(pair, above, 1.8 * radius * np.sqrt(energy / above), 2.2 * radius, 4.0)
    clock.propagation = time.perf_counter() - start
    start = time.perf_counter()
    ground, count = ground_matrices(pair, energy, int(matrices.total[-1] + 2), 2.2 * radius, above, 4.0)
    clock.ground = time.perf_counter() - start
    start = time.perf_counter()
    line_cross_section(matrices, level, ground)
    for K in range(2 if level == "P1/2" else 4):
        multipole_cross_sections(matrices, level, level, K)
    multipole_cross_sections(matrices, level, LEVELS[1 - index], 1)
    clock.sums = time.perf_counter() - start
    return clock, matrices.inversions + count


def test_one_pair():
    """K-Ar, both levels, 12 energies around kT, all partial waves."""
    pair = default_pair("K", "Ar")
    energy = thermal(373.0) * np.geomspace(0.15, 8.0, 12)
    print("\n\n== K-Ar, both levels, 12 energies from 0.15 to 8 kT at 373 K, one core")
    pair.table(np.array([10.0]))
    clocks = [parts(pair, level, float(E)) for level in LEVELS for E in energy]
    whole = {name: sum(getattr(clock, name) for clock, _ in clocks) for name in ("propagation", "ground", "sums")}
    total, inversions = sum(whole.values()), sum(count for _, count in clocks)
    shares = ", ".join(f"{name} {value / total:.0%}" for name, value in whole.items())
    print(
        f"  without checks {total:6.1f} s; {inversions / 1e6:.0f}e6 inversions, "
        f"{total / inversions * 1e9:.0f} ns each; {shares}"
    )
    start = time.perf_counter()
    tables = [level_cross_sections(pair, level, energy, np.full(12, 4.0)) for level in LEVELS]
    spent = time.perf_counter() - start
    print(f"  with checks    {spent:6.1f} s: {spent / SECONDS_ALLOWED:.2f} of the time allowed on two cores")
    change = 0.0
    for level, table in zip(LEVELS, tables, strict=True):
        fine = level_cross_sections(pair, level, energy[1::4], np.full(3, 8.0))
        i = [i for i, name in enumerate(OBSERVABLES) if name.startswith(level)]
        scale = np.maximum(np.abs(fine.sigma[:, i]), 1e-3)
        change = max(change, float(np.max(np.abs(table.sigma[1::4][:, i] - fine.sigma[:, i]) / scale)))
    print(f"  largest change with half the step: {change:.1e} (goal 5e-3)")
    tracemalloc.start()
    scattering_matrices(pair, float(energy[-1]), 30.0, 40.0, 4.0)
    print(f"  memory of the highest energy {tracemalloc.get_traced_memory()[1] / 2**20:6.1f} MB at its peak")
    tracemalloc.stop()
    assert inversions > 0


@pytest.mark.parametrize(
    ("alkali", "gas", "x"),
    [
        ("Li", "He", 8.0),
        ("Rb", "He", 1.0),
        ("K", "Ar", 0.3),
        ("K", "Ar", 1.0),
        ("K", "Ar", 4.0),
        ("Cs", "Xe", 0.3),
        ("Cs", "Xe", 1.0),
    ],
)
def test_cost_of_mass_and_energy(alkali, gas, x):
    """Light pairs at high energy, heavy ones at low energy: inversions go with mass x energy x reach^2."""
    pair = default_pair(alkali, gas)
    energy = thermal(373.0, x)
    clock, inversions = parts(pair, "P3/2", energy)
    total = clock.propagation + clock.ground + clock.sums
    above = energy + pair.splitting
    per_phase = inversions / (pair.reduced_mass * above)
    print(
        f"\n  {alkali}-{gas} at {x:g} kT, P3/2: {total:6.2f} s, {inversions / 1e6:7.2f}e6 inversions at "
        f"{total / inversions * 1e9:4.0f} ns, {per_phase:6.0f} per mu E (P1/2)"
    )
    assert inversions > 0


def test_whole_rates():
    """What `rates --method quantum` computes for K-Ar: both levels, full grid, checks."""
    start = time.perf_counter()
    tables = level_tables(default_pair("K", "Ar"), np.array([373.0]))
    spent = time.perf_counter() - start
    inversions = sum(table.work["inversions"] for table in tables.values())
    energies = sum(table.work["energies"] for table in tables.values())
    print(f"\n  K-Ar at 373 K, {energies} energies: {spent:.1f} s, {inversions / 1e6:.0f}e6 inversions, one core")
    assert energies > 0
