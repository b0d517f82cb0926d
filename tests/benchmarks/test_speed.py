"""Where the time goes, as ratios measured in one run on one machine. Nothing here is asserted about the clock.

    python -m pytest tests/benchmarks -m benchmark -s

Baseline: an ordinary integration of the same collision, one path at a time, with scipy's solve_ivp (DOP853, rtol 1e-6):
classical path (R, radial momentum, angle), amplitudes in fixed axes and phase of the ground level in one system of
equations, from 60 bohr inwards and out again (the package starts at 150 bohr). Three ways: the six amplitudes of one
initial state with the curves called where they are needed, as one would write it; the same with all curves from one
ready-made spline; and that for all six initial states, which is what the package's S-matrices hold.
The package's time is that of all S-matrices of a cross section at E = kT, divided by the number of paths; the table
shows the error of those cross sections beside it.
"""

from __future__ import annotations

import subprocess
import sys
import time
from collections.abc import Callable
from dataclasses import dataclass
from math import cos, sin, sqrt

import numpy as np
import pytest
from scipy.integrate import solve_ivp
from scipy.interpolate import CubicSpline

from pertcalc.collisions import impact
from pertcalc.collisions.multipoles import INDEX
from pertcalc.collisions.pair import CollisionPair
from pertcalc.collisions.paths import PathFamily
from pertcalc.collisions.propagation import apply_exponential
from pertcalc.collisions.scattering import scatter
from pertcalc.collisions.semiclassical import cross_sections, reach
from tests.collision_cases import default_pair, slow, thermal

pytestmark = pytest.mark.benchmark

CASES = [("K", "Ar", 373.0), ("Cs", "Xe", 313.0)]
R_START = 60.0
# Real multiply-adds of one exponential: a complex 3x3 product; polynomial (6 elements of 7), divided differences and
# spectrum (some 60). Seven sines, cosines and the like besides.
PRODUCT, REST, TRIGONOMETRIC = 108, 102, 7
# Step factors the rates use: 1 on the lower curve (transfer), 0.6 on the others.
FACTORS = (1.0, 0.6)
SHOWN = ("P1/2.width", "P1/2.shift", "P1/2.loss1", "P3/2.loss2", "P1/2.outflow")


def best_of(n: int, work) -> float:
    """Shortest of n wall-clock times [s]."""
    times = []
    for _ in range(n):
        start = time.perf_counter()
        work()
        times.append(time.perf_counter() - start)
    return min(times)


@dataclass(frozen=True)
class Baseline:
    """What one path needs, prepared once per pair and energy."""

    pair: CollisionPair
    energy: float
    curves: Callable  # R -> V_Pi, V_Sigma, V_X, driving potential
    slope: Callable

    @classmethod
    def of(cls, pair: CollisionPair, energy: float, splined: bool) -> Baseline:
        if not splined:
            plain = slow(pair)

            def curves(R: float) -> tuple[float, float, float, float]:
                return float(pair.A(R)), float(pair.B(R)), float(pair.X(R)), 0.0

            return cls(pair, energy, curves, lambda R: plain.driving("lower", R)[1])
        R = np.geomspace(2.0, 2 * R_START, 1200)
        driving = pair.path_function("lower")(R)
        columns = [np.asarray(pair.A(R)), np.asarray(pair.B(R)), np.asarray(pair.X(R)), driving]
        return cls(pair, energy, CubicSpline(R, np.stack(columns, axis=-1)), CubicSpline(R, driving).derivative())

    def integrate(self, b: float, states: int):
        """One collision: amplitudes of `states` initial states (1 or 6); the scipy result."""
        mu, a = self.pair.reduced_mass, self.pair.splitting / 1.5
        angular = mu * sqrt(2 * self.energy / mu) * b
        half = a * sqrt(0.5)
        k = 1 if states == 1 else 3
        H = np.zeros((2, 3, 3), dtype=complex)  # blocks A and B
        H[:, 1, 2] = H[:, 2, 1] = half

        def equation(t, y):
            r, p, phi = y[:3].real
            pi, sigma, ground, _ = self.curves(r)
            mean, turn = 0.5 * (sigma + pi), 0.5 * (sigma - pi)
            flip = turn * complex(cos(2 * phi), -sin(2 * phi))
            H[:, 0, 0], H[:, 1, 1], H[:, 2, 2] = mean + 0.5 * a, mean - 0.5 * a, pi
            H[0, 0, 1] = H[1, 1, 0] = -flip
            H[0, 1, 0] = H[1, 0, 1] = -flip.conjugate()
            out = np.empty_like(y)
            out[:4] = p / mu, angular**2 / (mu * r**3) - self.slope(r), angular / (mu * r * r), ground
            out[4:] = (-1j * (H @ y[4:].reshape(2, 3, k))).ravel()
            return out

        def gone(t, y):
            return y[0].real - R_START - 1e-6

        gone.terminal, gone.direction = True, 1
        driving = float(self.pair.path_function("lower")(np.array(R_START)))
        kinetic = self.energy * (1 - (b / R_START) ** 2) - driving
        amplitudes = np.array([1, 0, 0, 0, 0, 1]) / sqrt(2) if states == 1 else np.stack([np.eye(3)] * 2).ravel()
        start = np.concatenate([[R_START, -sqrt(2 * mu * kinetic), 0, 0], amplitudes]).astype(complex)
        return solve_ivp(equation, (0, 1e8), start, "DOP853", rtol=1e-6, atol=1e-9, events=gone)


def time_baseline(label: str, baseline: Baseline, sample: np.ndarray, states: int) -> float:
    """Seconds per path; prints them."""
    drift, calls = [], []
    start = time.perf_counter()
    for b in sample:
        out = baseline.integrate(float(b), states)
        drift.append(abs(np.linalg.norm(out.y[4:, -1]) / np.linalg.norm(out.y[4:, 0]) - 1))
        calls.append(out.nfev)
    spent = (time.perf_counter() - start) / sample.size
    counts = f"{np.mean(calls):6.0f} right-hand sides, norm to {max(drift):.0e}"
    print(f"  baseline, {label:36s} {spent * 1e3:9.2f} ms   {counts}")
    assert max(drift) < 1e-3
    return spent


def per_path(alkali: str, gas: str, T: float) -> None:
    """Print baseline against package for one pair at E = kT."""
    pair, energy = default_pair(alkali, gas), thermal(T)
    paths = PathFamily(pair, "lower")
    grid = impact.impact_grid(paths, energy, reach(pair, float(paths.speed(np.array(energy)))))
    sample = grid.b[np.linspace(0.1 * grid.b.size, 0.9 * grid.b.size, 7).astype(int)]
    places = ", ".join(f"{x:.1f}" for x in sample)
    print(f"\n{alkali}-{gas}, E = kT = {T:g} K, lower curve; baseline at b = {places} bohr")
    quick = Baseline.of(pair, energy, True)
    spent_before = [
        time_baseline("six amplitudes, plain", Baseline.of(pair, energy, False), sample[::3], 1),
        time_baseline("six amplitudes, splined curves", quick, sample, 1),
        time_baseline("all six initial states, splined", quick, sample, 6),
    ]

    n = max(1, 2048 // grid.b.size)  # a batch as large as in ordinary use
    b, R0 = np.tile(grid.b, n), np.tile(grid.turning_point, n)
    energies = np.full(b.size, energy)
    fine = cross_sections(pair, "lower", np.array([energy]), 4.0, 3.0, False).sigma[0]
    same_grid = cross_sections(pair, "lower", np.array([energy]), 1.0, 3.0, False).sigma[0]
    for factor in FACTORS:
        spent = best_of(5, lambda factor=factor: scatter(paths, energies, b, R0, factor)) / b.size
        steps = scatter(paths, energies, b, R0, factor).exponentials / b.size / 4
        print(
            f"  package, {factor:g} of the standard steps{'':14s} {spent * 1e3:9.3f} ms   {steps:6.0f} steps; "
            f"ratios {', '.join(f'{before / spent:.0f}' for before in spent_before)}"
        )
        ours = cross_sections(pair, "lower", np.array([energy]), 1.0, factor, False).sigma[0]
        for name in SHOWN:
            i = INDEX[name]
            print(
                f"      {name:13s}{fine[i]:11.4g} bohr^2; error of the steps {abs(ours[i] / same_grid[i] - 1):.0e}, "
                f"of steps and {grid.b.size} impact parameters {abs(ours[i] / fine[i] - 1):.0e}"
            )


def test_per_path():
    print("\n\n== one path: ordinary integration against the package")
    for case in CASES:
        per_path(*case)


def test_arithmetic_limit():
    """One exponential against the multiply-adds it is made of, timed on arrays of the same size."""
    n = 2048
    rng = np.random.default_rng(1)
    H = tuple(rng.normal(size=n) for _ in range(6))
    W = rng.normal(size=(3, 2, 3, n))
    phase = np.zeros(n)
    exponential = best_of(30, lambda: apply_exponential(W, H, phase)) / n

    def multiply_add(*shape: int) -> float:
        """Seconds per element of c = a b, d += c."""
        a, b, c, d = (rng.normal(size=shape) for _ in range(4))

        def once() -> None:
            np.multiply(a, b, out=c)
            np.add(d, c, out=d)

        return best_of(2000, once) / a.size

    large, small = multiply_add(2, 3, n), multiply_add(n)
    angle = rng.uniform(0, 3, n)
    trigonometry = sum(best_of(200, lambda f=f: f(angle)) for f in (np.sin, np.cos)) / 2 / n
    least = PRODUCT * large + REST * small + TRIGONOMETRIC * trigonometry
    print("\n\n== one exponential of one 3x3 block, applied to one 3x3 matrix")
    print(f"  measured                              {exponential * 1e9:7.0f} ns")
    sizes = f"ns per element of (2, 3, {n}), {small * 1e9:.2f} of ({n},)"
    print(f"  one numpy multiply-add, cached        {large * 1e9:7.2f} {sizes}")
    print(f"  one sine or cosine                    {trigonometry * 1e9:7.1f} ns per element")
    counts = f"{PRODUCT} + {REST} multiply-adds, {TRIGONOMETRIC} sines"
    print(f"  {counts:37s} {least * 1e9:7.0f} ns: the limit of batched numpy")
    print(f"  measured over limit                   {exponential / least:7.2f}")
    assert np.isfinite(exponential)


CHILD = """
import resource, subprocess, sys, time
start = time.perf_counter()
done = subprocess.run([sys.executable, "-m", "pertcalc", *sys.argv[1:]], capture_output=True)
spent = time.perf_counter() - start
print(spent, resource.getrusage(resource.RUSAGE_CHILDREN).ru_maxrss / 1024, done.returncode)
"""


def run_cold(*arguments: str) -> tuple[float, float]:
    """Seconds and the largest resident size [MB] of any one process of a command, started from nothing."""
    answer = subprocess.run([sys.executable, "-c", CHILD, *arguments], capture_output=True, text=True, check=True)
    seconds, memory, code = answer.stdout.split()
    assert code == "0", answer.stderr
    return float(seconds), float(memory)


def test_whole_program():
    print("\n\n== whole program, from nothing")
    helps = [run_cold("--help") for _ in range(5)]
    print(f"  pertcalc --help                    {min(h[0] for h in helps):7.2f} s   {helps[0][1]:6.0f} MB")
    for jobs in ("1", "2"):
        for alkali in ("Rb", "Cs"):
            seconds, memory = run_cold("report", alkali, "--jobs", jobs)
            command = f"pertcalc report {alkali} --jobs {jobs}"
            print(f"  {command:34s} {seconds:7.1f} s   {memory:6.0f} MB in the largest process")
            assert seconds > 0
