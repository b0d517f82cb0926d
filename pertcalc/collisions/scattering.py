"""S-matrices of a batch of semiclassical collisions: half paths, S = W W^T, interaction picture.

Quantised along the normal of the collision plane and turned with the internuclear axis, the six P states fall into
two blocks of three, here in the basis |3/2, 3/2>, |3/2, -1/2>, |1/2, -1/2> (block A; block B has m -> -m). With
D = V_Sigma - V_Pi, w = dphi/dt, a = splitting/1.5 and V_Pi kept apart as a phase, the Hamiltonian of A is real,

    H = D n n^T + diag(a/2, a/2, -a) - w diag(3/2, -1/2, -1/2),   n = (1, -sqrt(1/3), sqrt(2/3))/sqrt 2,

and that of B the same with w -> -w. The apse lies on phi = 0 and the incoming half is the mirror of the outgoing one:
hence S = W W^T for either block. notes/semiclassical.md has the derivation and the limits.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.special import erfc

from pertcalc.collisions.paths import PATH_SCALE, PathFamily
from pertcalc.collisions.propagation import GAUSS_OFFSET, MAGNUS_FAR, MAGNUS_NEAR, Symmetric, apply_exponential

Array = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]

# A step turns by at most STEP_PHASE radian of the splitting where the levels are coupled, or by 1/SIGMA_PI_SHARE times
# as much of the Sigma-Pi difference (mixed only by the slow turn of the axis), and moves on by at most STEP_LARGEST in
# s. Convergence: tests/test_semiclassical.py.
STEP_PHASE = 2.0
STEP_LARGEST = 0.085
SIGMA_PI_SHARE = 0.1
# A path that lingers at a barrier meets a constant Hamiltonian, which a step of any length treats exactly: the slowness
# of the radial motion counts up to LINGERING times that of a straight path. STEPS_MOST ends a path that never leaves.
LINGERING = 10.0
STEPS_MOST = 4000
# Beyond the last place where |D| is WEAK of the splitting the levels follow adiabatically; their coupling is there
# switched off over WINDOW turns of the splitting (to e^-20 of what it could excite) and replaced by its second-order
# shift, so that the splitting need no longer be resolved. ONSET widths further in than the middle of the window the
# coupling is whole to 1e-8.
WEAK = 0.05
WINDOW = 9.0
ONSET = 4.0
_PROBES = 14
# A chunk goes on without the paths that arrived once less than this share of it is still under way.
STILL_GOING = 0.9
# Paths stepped together: both blocks of one chunk fill the level-2 cache of common machines.
CHUNK = 1024

_N = np.array([1.0, -np.sqrt(1 / 3), np.sqrt(2 / 3)]) / np.sqrt(2)
_M_OF_BLOCK_A = np.array([1.5, -0.5, -0.5])


@dataclass(frozen=True, slots=True)
class Scattering:
    """S-matrices of n collisions.

    `block_a` (m = 3/2, -1/2 of P3/2 and -1/2 of P1/2) and `block_b` (m -> -m), shape (n, 3, 3) [1], in the interaction
    picture and without the phase of V_Pi; `line_phase`, shape (n,) [radian], is Int (V_Pi - V_X) dt over the whole
    path, so that the optical amplitude of a level is Tr_J(S) exp(-i line_phase)/(2J+1). `exponentials` counts work.
    """

    block_a: ComplexArray
    block_b: ComplexArray
    line_phase: Array
    exponentials: int


@dataclass(frozen=True, slots=True)
class _Paths:
    """A set of paths of one family; arrays of shape (n,) [au]. `release` and `softness` place the switching-off."""

    family: PathFamily
    energy: Array
    b: Array
    turning_point: Array
    speed: Array
    release: Array
    softness: Array

    @classmethod
    def of(cls, family: PathFamily, energy: Array, b: Array, turning_point: Array) -> _Paths:
        speed = family.speed(energy)
        # Without splitting the levels are never released, at any distance.
        splitting = family.pair.splitting
        softness = WINDOW * speed / (splitting or 1.0)
        release = family.pair.last_strong_coupling(WEAK) + ONSET * softness if splitting else np.full(b.shape, np.inf)
        return cls(family, energy, b, turning_point, speed, release, softness)

    def some(self, index: NDArray[np.intp]) -> _Paths:
        arrays = (self.energy, self.b, self.turning_point, self.speed, self.release, self.softness)
        return _Paths(self.family, *(array[index] for array in arrays))


@dataclass(frozen=True, slots=True)
class _Points:
    """What paths meet at coordinates s: all of the shape of s, rates per unit of s [radian or au of time]."""

    time: Array
    turn: Array
    anisotropy: Array
    line: Array
    coupling: Array  # share of the fine-structure coupling still switched on
    stiffness: Array  # steps per unit of s


def _meet(paths: _Paths, s: Array) -> _Points:
    """Evaluate curves and motion at s, shape (..., n)."""
    family = paths.family
    grown = np.exp(s)
    y = 0.5 * PATH_SCALE * (grown - 1 / grown)
    square = paths.turning_point**2 + y * y
    R = np.sqrt(square)
    line, anisotropy, pi = family.pair.table(R)
    potential = family.pair.path_potential(family.path, pi, anisotropy)
    rate = family.rate_of_time(paths.energy, paths.b, R, y, potential)
    place = (R - paths.release) / paths.softness
    coupling = 0.5 * erfc(place)
    free = np.sqrt(PATH_SCALE**2 + y**2) / paths.speed
    steady = rate / np.sqrt(1 + (rate / (LINGERING * free)) ** 2)
    splitting = family.pair.splitting
    crossing = np.sqrt(splitting * np.hypot(splitting, anisotropy)) * 0.5 * erfc(place - 3)
    turning = steady * (crossing + SIGMA_PI_SHARE * np.abs(anisotropy))
    stiffness = np.hypot(turning / STEP_PHASE, 1 / STEP_LARGEST)
    return _Points(rate, paths.b * paths.speed / square * rate, anisotropy * rate, line * rate, coupling, stiffness)


def expected_steps(paths: _Paths) -> Array:
    """About how many steps every path takes, shape (n,) [1]."""
    last = paths.family.last_coordinate(paths.turning_point)
    s = (np.arange(_PROBES)[:, None] + 0.5) / _PROBES * last
    return np.mean(_meet(paths, s).stiffness, axis=0) * last


def scatter(
    family: PathFamily, energy: Array, b: Array, turning_point: Array, step_factor: Array | float = 1.0
) -> Scattering:
    """S-matrices of the collisions (energy, b) on one family of paths.

    Parameters
    ----------
    family : PathFamily
    energy, b, turning_point : ndarray, shape (n,)
        Kinetic energy [hartree], impact parameter [bohr], turning point [bohr].
    step_factor : ndarray, shape (n,), or float
        Multiplies the number of steps of every path [1].

    Returns
    -------
    Scattering
        Unitary to rounding. The error per element is about 1e-3 at the default steps, 1e-2 at worst, and falls
        abruptly to 1e-6 by three times as many: along a path the errors of the steps beat against each other.
    """
    block_a = np.empty((b.size, 3, 3), dtype=complex)
    block_b = np.empty_like(block_a)
    line_phase = np.empty(b.size)
    exponentials = 0
    factor = np.broadcast_to(np.asarray(step_factor, dtype=float), b.shape)
    paths = _Paths.of(family, energy, b, turning_point)
    # Paths of like length travel together.
    order = np.argsort(expected_steps(paths) * factor, kind="stable")
    for some in np.array_split(order, max(1, -(-b.size // CHUNK))):
        S, line_phase[some], count = _scatter_chunk(paths.some(some), factor[some])
        block_a[some], block_b[some] = S[: some.size], S[some.size :]
        exponentials += count
    return Scattering(block_a, block_b, line_phase, exponentials)


def _both(a: NDArray, b: NDArray) -> NDArray:
    return np.concatenate([a, b], axis=-1)


@dataclass(slots=True)
class _State:
    """Where n half paths are: propagators W (3, 2, 3, 2 n) and their phase (2 n,), integrals and coordinate (n,)."""

    W: Array
    phase: Array
    time: Array
    turn: Array
    line_phase: Array
    s: Array

    @classmethod
    def at_rest(cls, n: int) -> _State:
        W = np.zeros((3, 2, 3, 2 * n))
        for i in range(3):
            W[i, 0, i] = 1.0
        return cls(W, np.zeros(2 * n), *(np.zeros(n) for _ in range(4)))

    def take(self, index: NDArray[np.intp]) -> _State:
        both = _both(index, index + self.s.size)
        single = (array[index] for array in (self.time, self.turn, self.line_phase, self.s))
        return _State(self.W[..., both], self.phase[both], *single)

    def put(self, index: NDArray[np.intp], part: _State) -> None:
        both = _both(index, index + self.s.size)
        self.W[..., both], self.phase[both] = part.W, part.phase
        self.time[index], self.turn[index], self.line_phase[index] = part.time, part.turn, part.line_phase


def _scatter_chunk(paths: _Paths, step_factor: Array) -> tuple[ComplexArray, Array, int]:
    """S of blocks A then B, shape (2 n, 3, 3), the line phase, shape (n,), and the number of exponentials."""
    splitting = paths.family.pair.splitting
    state = whole = _State.at_rest(paths.b.size)
    going = np.arange(paths.b.size)
    last = paths.family.last_coordinate(paths.turning_point)
    offsets = np.array([[0.5 - GAUSS_OFFSET], [0.5 + GAUSS_OFFSET]])
    width = 1 / (step_factor * _meet(paths, state.s + 1e-3).stiffness)
    steps = exponentials = 0
    while steps < STEPS_MOST and np.any(width > 0):
        at = _meet(paths, state.s + offsets * width)
        times, turns = at.time * width, at.turn * width
        matrices = _hamiltonian(splitting, times, turns, at.anisotropy * width, at.coupling)
        state.time += 0.5 * times.sum(axis=0)
        state.turn += 0.5 * turns.sum(axis=0)
        state.line_phase += np.sum(at.line * width, axis=0)  # both halves of the path
        for near, far in ((MAGNUS_NEAR, MAGNUS_FAR), (MAGNUS_FAR, MAGNUS_NEAR)):
            H: Symmetric = tuple(near * element[0] + far * element[1] for element in matrices)  # type: ignore
            state.W, state.phase = apply_exponential(state.W, H, state.phase)
        state.s = state.s + width
        width = np.where(state.s < last, 1 / (step_factor * at.stiffness[1]), 0.0)
        steps += 1
        exponentials += 4 * width.size
        left = np.flatnonzero(width)
        if left.size < STILL_GOING * width.size:  # those that arrived step no further
            whole.put(going, state)
            state, going, paths = state.take(left), going[left], paths.some(left)
            step_factor, last, width = step_factor[left], last[left], width[left]
    whole.put(going, state)
    return _close(whole.W, whole.phase, whole.time, whole.turn, splitting), whole.line_phase, exponentials


def _hamiltonian(splitting: float, time: Array, turn: Array, anisotropy: Array, coupling: Array) -> Symmetric:
    """Elements 11, 22, 33, 12, 13, 23 of H dt of both blocks, each shape (..., 2 n) [radian]."""
    a = splitting / 1.5
    # What the coupling that is switched off would do in second order, to P3/2 (plus) and P1/2 (minus); where the
    # difference is not small it is still coupled, and the square root only keeps the missing 1e-8 from counting.
    shift = (1 - coupling**2) * anisotropy**2 / np.hypot(splitting * time + 1e-30, anisotropy) * _N[2] ** 2
    aligned = [anisotropy * _N[i] * _N[j] + shift * _N[i] * _N[j] for i, j in ((0, 0), (1, 1), (0, 1))]
    upper, lower = 0.5 * a * time, anisotropy * _N[2] ** 2 - shift * (_N[0] ** 2 + _N[1] ** 2) - a * time
    first, second, mixed = aligned[0] + upper, aligned[1] + upper, aligned[2]
    cross = coupling * anisotropy * _N[2]
    return (
        _both(first - 1.5 * turn, first + 1.5 * turn),
        _both(second + 0.5 * turn, second - 0.5 * turn),
        _both(lower + 0.5 * turn, lower - 0.5 * turn),
        _both(mixed, mixed),
        _both(cross * _N[0], cross * _N[0]),
        _both(cross * _N[1], cross * _N[1]),
    )


def _close(W: Array, phase: Array, time: Array, turn: Array, splitting: float) -> ComplexArray:
    """From the half-path matrices in the turning frame to S in the space frame and the interaction picture."""
    half = (W[:, 0] + 1j * W[:, 1]) * np.exp(-1j * phase)
    half *= np.exp(-1j * _M_OF_BLOCK_A[:, None, None] * _both(turn, -turn))
    # Free evolution of the levels, V_Pi apart: +a/2 for P3/2, -a for P1/2.
    level = splitting * np.array([1 / 3, 1 / 3, -2 / 3])
    half *= np.exp(1j * level[:, None, None] * _both(time, time))
    return np.einsum("acn,bcn->nab", half, half)
