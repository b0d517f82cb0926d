"""Log-derivative propagation against closed forms (hard sphere, square wells, constant coupling) and scipy's solve_ivp.

Atomic units; k^2 in 1/bohr^2, potentials as 2 mu V in 1/bohr^2. What is compared is the log-derivative itself or the
S-matrix made of it with scipy's spherical Bessel functions.
"""

from __future__ import annotations

import numpy as np
import pytest
from scipy.integrate import solve_ivp
from scipy.special import spherical_jn, spherical_yn

from pertcalc.collisions.log_derivative import Blocks, inverse, propagate, segments

COMPONENTS = ((0, 0), (1, 1), (2, 2), (0, 1), (0, 2), (1, 2))
WALL = 1e12  # log-derivative of a wave that starts at a wall [1/bohr]


def full(y) -> np.ndarray:
    """Six components as matrices, shape (n, 3, 3)."""
    matrices = np.empty((np.size(y[0]), 3, 3))
    for (i, j), value in zip(COMPONENTS, y, strict=True):
        matrices[:, i, j] = matrices[:, j, i] = value
    return matrices


def components(matrices: np.ndarray):
    return tuple(matrices[:, i, j] for i, j in COMPONENTS)


def uncoupled(N, k2, n: int = 1) -> Blocks:
    """Blocks of three channels that do not see each other: N and k^2, shape (3,)."""
    N, k2 = (np.repeat(np.asarray(x, dtype=float)[:, None], n, axis=1) for x in (N, k2))
    return Blocks(k2, N * (N + 1), np.zeros_like(k2))


def even_pieces(edges, step: float):
    """Pieces of one even number of steps each between the edges."""
    made = []
    for a, b in zip(edges[:-1], edges[1:], strict=True):
        steps = 2 * max(1, round((b - a) / step / 2))
        made.append((a, (b - a) / steps, steps))
    return made


def riccati(N: int, k: float, R: float):
    """kR j_N, kR y_N and their R-derivatives."""
    z = k * R
    j, y = spherical_jn(N, z), spherical_yn(N, z)
    dj, dy = spherical_jn(N, z, derivative=True), spherical_yn(N, z, derivative=True)
    return z * j, z * y, k * (j + z * dj), k * (y + z * dy)


def S_of(slope: float, N: int, k: float, R: float) -> complex:
    """exp(2 i delta) of a wave with this log-derivative at R."""
    j, y, dj, dy = riccati(N, k, R)
    K = (slope * j - dj) / (slope * y - dy)
    return (1 + 1j * K) / (1 - 1j * K)


# --- algebra --------------------------------------------------------------------------------------------------------


def random_symmetric(rng: np.random.Generator, n: int) -> np.ndarray:
    A = rng.normal(size=(n, 3, 3))
    return A + A.transpose(0, 2, 1)


def test_inverse_equals_numpy():
    A = random_symmetric(np.random.default_rng(1), 4000)
    A = A[np.linalg.cond(A) < 1e4]
    assert len(A) > 3900
    ours, theirs = full(inverse(components(A))), np.linalg.inv(A)
    error = np.abs(ours - theirs).max(axis=(1, 2)) / np.abs(theirs).max(axis=(1, 2))
    assert np.all(error < 1e-15 * np.linalg.cond(A) ** 2 + 1e-14)
    np.testing.assert_allclose(full(inverse(inverse(components(A[:100])))), A[:100], rtol=1e-5, atol=1e-5)


def test_inverse_keeps_any_shape():
    A = random_symmetric(np.random.default_rng(2), 12) + 8 * np.eye(3)
    parts = tuple(part.reshape(3, 4) for part in components(A))
    made = inverse(parts)
    assert made[4].shape == (3, 4)
    np.testing.assert_allclose(np.linalg.inv(A)[:, 0, 2], made[4].ravel(), rtol=1e-12)


# --- steps ----------------------------------------------------------------------------------------------------------


def test_segments_cover_the_range_with_small_even_steps():
    def local(R):
        return 3 + 20 * np.exp(-R / 4)

    pieces = segments(local, 2.3, 17.0, 5.0)
    ends = [start + h * steps for start, h, steps in pieces]
    assert pieces[0][0] == 2.3 and ends[-1] == pytest.approx(17.0)
    assert [start for start, _, _ in pieces[1:]] == pytest.approx(ends[:-1])
    for start, h, steps in pieces:
        assert steps % 2 == 0 and steps >= 2
        assert h * local(start) <= 1 / 5 + 1e-12, "a fifth of the shortest reduced wavelength"
    assert sum(n for _, _, n in segments(local, 2.3, 17.0, 10.0)) == pytest.approx(
        2 * sum(n for _, _, n in pieces), rel=0.1
    )


def test_work_is_counted():
    """Two inversions at odd points, one at even ones, for every block."""
    blocks = uncoupled((0, 1, 2), (1.0, 1.0, 1.0), n=7)
    _, inversions = propagate(blocks, lambda R: (0 * R, 0 * R), [(1.0, 0.1, 10), (2.0, 0.05, 4)], WALL)
    assert inversions == 7 * (10 + 5 + 4 + 2)


# --- one channel ----------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("k", [0.5, 2.0, 5.0])
def test_hard_sphere(k):
    """tan delta_N = j_N(ka)/y_N(ka): nothing outside the wall at a."""
    a, end, N = 3.0, 9.0, (0, 2, 7)
    y, _ = propagate(
        uncoupled(N, (k * k,) * 3), lambda R: (0 * R, 0 * R), even_pieces([a, end], 0.02 / max(k, 1)), WALL
    )
    for slope, n in zip(y[:3], N, strict=True):
        tangent = spherical_jn(n, k * a) / spherical_yn(n, k * a)
        exact = (1 + 1j * tangent) / (1 - 1j * tangent)
        assert S_of(float(slope[0]), n, k, end) == pytest.approx(exact, abs=1e-7)


def square_well(depth: float, a: float):
    """2 mu V = -depth inside a: pieces end at a, and the potential of a piece is that of its middle."""

    def potential(R):
        return np.full_like(R, -depth if R.mean() < a else 0.0), 0 * R

    return potential


@pytest.mark.parametrize("N", [0, 1, 4])
@pytest.mark.parametrize("depth", [0.8, 6.0])
def test_square_well(N, depth):
    """Regular Bessel function of q^2 = k^2 + depth inside, free outside: joined at the edge."""
    k, a, start, end = 1.3, 4.0, 1.0, 10.0
    q = np.sqrt(k * k + depth)
    j, _, dj, _ = riccati(N, q, start)
    y, _ = propagate(
        uncoupled((N,) * 3, (k * k,) * 3), square_well(depth, a), even_pieces([start, a, end], 0.01), dj / j
    )
    j, _, dj, _ = riccati(N, q, a)
    assert S_of(float(y[0][0]), N, k, end) == pytest.approx(S_of(dj / j, N, k, a), abs=2e-7)


def lennard_jones(R):
    """2 mu V [1/bohr^2] with a deep well: some four bound states."""
    x = (5.0 / R) ** 6
    return 8.0 * (x * x - 2 * x)


def phase_by_scipy(N: int, k: float, start: float, end: float) -> complex:
    """S of one wave in that well: u'' = (N(N+1)/R^2 + 2 mu V - k^2) u with DOP853."""

    def slope(R, u):
        return [u[1], (N * (N + 1) / R**2 + lennard_jones(R) - k * k) * u[0]]

    decay = np.sqrt(N * (N + 1) / start**2 + lennard_jones(start))
    u = solve_ivp(slope, (start, end), [1e-20, 1e-20 * decay], method="DOP853", rtol=1e-11, atol=1e-40).y[:, -1]
    return S_of(u[1] / u[0], N, k, end)


@pytest.mark.parametrize("k", [0.4, 1.5, 4.0])
def test_phase_shifts_of_a_curve_equal_an_independent_integration(k):
    N, start, end = (0, 3, 11), 3.1, 30.0
    pieces = segments(lambda R: np.sqrt(k * k + 8 + 0 * R), start, end, 20.0)
    y, _ = propagate(uncoupled(N, (k * k,) * 3), lambda R: (lennard_jones(R), 0 * R), pieces, 30.0)
    for slope, n in zip(y[:3], N, strict=True):
        assert S_of(float(slope[0]), n, k, end) == pytest.approx(phase_by_scipy(n, k, start, end), abs=1e-5)


def test_a_uniform_shift_of_the_curve_is_a_shift_of_energy():
    """V_Pi + c with k^2 + c is the same problem; so is V_Sigma - V_Pi along one channel."""
    blocks = uncoupled((1, 1, 1), (2.0, 2.0, 2.0))
    along = Blocks(blocks.momentum2, blocks.centrifugal, np.array([[1.0], [0.0], [0.0]]))
    pieces = even_pieces([3.1, 12.0], 0.02)
    plain, _ = propagate(blocks, lambda R: (lennard_jones(R), 0 * R), pieces, 30.0)
    moved = Blocks(blocks.momentum2 + 0.7, blocks.centrifugal, blocks.axis)
    shifted, _ = propagate(moved, lambda R: (lennard_jones(R) + 0.7, 0 * R), pieces, 30.0)
    by_axis, _ = propagate(along, lambda R: (0 * R, lennard_jones(R)), pieces, 30.0)
    assert shifted[0][0] == pytest.approx(plain[0][0], rel=1e-9)
    assert by_axis[0][0] == pytest.approx(plain[0][0], rel=1e-9)


# --- order of the step ----------------------------------------------------------------------------------------------


def test_error_falls_with_the_fourth_power_of_the_step_in_a_curve():
    k, end = 1.5, 20.0
    exact = [phase_by_scipy(N, k, 3.1, end) for N in (0, 3, 6)]
    errors = []
    for step in (0.04, 0.02, 0.01):
        y, _ = propagate(
            uncoupled((0, 3, 6), (k * k,) * 3),
            lambda R: (lennard_jones(R), 0 * R),
            even_pieces(np.linspace(3.1, end, 15), step),
            30.0,
        )
        errors.append([abs(S_of(float(y[i][0]), N, k, end) - exact[i]) for i, N in enumerate((0, 3, 6))])
    ratios = np.array(errors[:-1]) / np.array(errors[1:])
    assert np.all(np.abs(np.log2(ratios) - 4) < 0.25), ratios


AXIS = np.array([2.0, -1.0, 2.0]) / 3


def constant_coupling(k2: np.ndarray, D: float, length: float) -> np.ndarray:
    """Exact y after a wall and `length` of constant Q = diag(k2) - D t t^T, no centrifugal term: U q cot(q L) U^T."""
    values, U = np.linalg.eigh(np.diag(k2) - D * np.outer(AXIS, AXIS))
    q = np.sqrt(values.astype(complex))
    return (U * (q / np.tan(q * length)).real) @ U.T


def test_coupled_channels_with_constant_coupling():
    """Three coupled channels, one of them closed, against matrix functions; fourth order as well."""
    k2, D, length = np.array([4.0, 2.5, -1.0]), 2.2, 3.7
    blocks = Blocks(k2[:, None], np.zeros((3, 1)), AXIS[:, None])
    exact = constant_coupling(k2, D, length)
    errors = []
    for step in (0.04, 0.02, 0.01):
        y, _ = propagate(blocks, lambda R: (0 * R, np.full_like(R, D)), even_pieces([1.0, 1.0 + length], step), WALL)
        errors.append(np.abs(full(y)[0] - exact).max())
    assert errors[-1] < 1e-6 * np.abs(exact).max()
    assert np.log2(np.array(errors[:-1]) / np.array(errors[1:])) == pytest.approx(4, abs=0.2)


# --- closed channels ------------------------------------------------------------------------------------------------


def resonant_S(k2: float, gap: float, depth: float, D: float, a: float, closed: bool) -> complex:
    """s-wave S of one open and one closed channel coupled inside a square well, in closed form.

    Inside Q = (k2 + depth, k2 - gap + depth) - D/2 (1 1; 1 1); outside free, the closed wave falls as exp(-kappa R).
    closed=False leaves the second channel out.
    """
    Q = np.diag([k2 + depth, k2 - gap + depth]) - D / 2
    if not closed:
        q = np.sqrt(Q[0, 0])
        slope = q / np.tan(q * a)
    else:
        values, U = np.linalg.eigh(Q)
        q = np.sqrt(values.astype(complex))
        Y = (U * (q / np.tan(q * a)).real) @ U.T
        slope = Y[0, 0] - Y[0, 1] ** 2 / (Y[1, 1] + np.sqrt(gap - k2))
    return S_of(slope, 0, np.sqrt(k2), a)


def test_closed_channels_are_kept():
    """A bound state of the closed channel makes a resonance in the open one: S over the whole resonance."""
    gap, depth, D, a, end = 5.0, 6.0, 1.0, 3.0, 9.0
    k2 = np.linspace(0.2, 4.6, 120)
    momentum2 = np.stack([k2, k2 - gap, np.full_like(k2, -3.0)])
    axis = np.repeat(np.sqrt([[0.5], [0.5], [0.0]]), k2.size, axis=1)

    def potential(R):
        inside = R.mean() < a
        return np.full_like(R, -depth if inside else 0.0), np.full_like(R, D if inside else 0.0)

    y, _ = propagate(Blocks(momentum2, np.zeros((3, k2.size)), axis), potential, even_pieces([1e-6, a, end], 0.01), 1e6)
    Y = full(y)
    kappa = np.sqrt(gap - k2)
    slope = Y[:, 0, 0] - Y[:, 0, 1] ** 2 / (Y[:, 1, 1] + kappa)
    found = np.array([S_of(s, 0, np.sqrt(e), end) for s, e in zip(slope, k2, strict=True)])
    wanted = np.array([resonant_S(e, gap, depth, D, a, True) for e in k2])
    without = np.array([resonant_S(e, gap, depth, D, a, False) for e in k2])
    np.testing.assert_allclose(found, wanted, atol=3e-5)
    assert np.abs(wanted - without).max() > 1.0, "the closed channel matters here"


def test_channels_that_do_not_exist_stay_apart():
    """axis = 0 in one channel: the other two are what they are without it."""
    axis = np.array([[np.sqrt(0.5)], [np.sqrt(0.5)], [0.0]])
    pieces = even_pieces([3.1, 14.0], 0.02)
    found = []
    for k2 in (-4.0, 1.0):
        blocks = Blocks(np.array([[2.0], [1.5], [k2]]), np.array([[2.0], [2.0], [6.0]]), axis)
        y, _ = propagate(blocks, lambda R: (lennard_jones(R), 1 / R**3), pieces, 30.0)
        assert y[4][0] == y[5][0] == 0
        found.append(full(y)[0, :2, :2])
    np.testing.assert_allclose(found[0], found[1], rtol=1e-11)


# --- batches --------------------------------------------------------------------------------------------------------


def random_blocks(n: int) -> Blocks:
    rng = np.random.default_rng(5)
    N = np.arange(n, dtype=float) % 40
    axis = rng.normal(size=(3, n))
    k2 = np.stack([6 + rng.random(n), 5 + rng.random(n), rng.normal(size=n)])
    return Blocks(k2, np.stack([N * (N + 1)] * 3), axis / np.linalg.norm(axis, axis=0))


def coupled_curves(R):
    return lennard_jones(R), 12 * np.exp(-R / 3)


def test_one_batch_equals_one_matrix_at_a_time():
    """Every block on its own with numpy's inverse and the textbook recursion: the batch and its closed forms."""
    n = 12
    blocks, pieces = random_blocks(n), even_pieces([3.1, 7.0, 12.0], 0.03)
    y, _ = propagate(blocks, coupled_curves, pieces, 25.0)
    for b in range(n):
        one = textbook(blocks, b, pieces, 25.0)
        np.testing.assert_allclose(full(y)[b], one, rtol=1e-8, atol=1e-8 * np.abs(one).max())


def textbook(blocks: Blocks, b: int, pieces, initial: float) -> np.ndarray:
    """Johnson's recursion z_n = (1 + z_{n-1})^-1 z_{n-1} - (h^2/3) w_n u_n with one matrix and numpy.linalg."""
    eye, t = np.eye(3), blocks.axis[:, b]
    y = initial * eye
    for start, h, steps in pieces:
        z = h * y
        for i in range(steps + 1):
            pi, D = coupled_curves(np.array(start + h * i))
            R = start + h * i
            Q = np.diag(blocks.momentum2[:, b] - blocks.centrifugal[:, b] / R**2 - pi) - D * np.outer(t, t)
            u = np.linalg.inv(eye + h * h / 6 * Q) @ Q if i % 2 else Q
            weight = 1 if i in (0, steps) else 4 if i % 2 else 2
            z = np.linalg.inv(eye + z) @ z if i else z
            z = z - h * h / 3 * weight * u
        y = z / h
    return y


# --- nodes on grid points -------------------------------------------------------------------------------------------

NODE_STEP, NODE_POINT, NODE_LENGTH = 0.02, 100, 4.6


def smallest_eigenvalue(k2: np.ndarray, D: float) -> np.ndarray:
    """Eigenvalue of least size of the matrices inverted at NODE_POINT, with numpy.linalg: 0 at a node. Shape of k2."""
    eye, h = np.eye(3), NODE_STEP
    Q = (k2[:, None] - [0.0, 1.5, 1.5])[:, :, None] * eye - D * np.outer(AXIS, AXIS)
    odd = np.linalg.inv(eye + h * h / 6 * Q) @ Q
    z = h * WALL * eye - h * h / 3 * Q
    for i in range(1, NODE_POINT):
        z = np.linalg.inv(eye + z) @ z - h * h / 3 * (4 * odd if i % 2 else 2 * Q)
    values = np.linalg.eigvalsh(eye + z)
    return np.take_along_axis(values, np.abs(values).argmin(axis=1)[:, None], axis=1)[:, 0]


def energy_of_a_node(D: float) -> float:
    """k^2 at which a node of the coupled solution falls on NODE_POINT: brackets of a zero, ever narrower."""
    low, high = 5.0, 14.0
    for _ in range(7):
        trial = np.linspace(low, high, 301)
        values = smallest_eigenvalue(trial, D)
        change = np.flatnonzero((values[:-1] * values[1:] <= 0) & (np.abs(values[:-1]) < 0.5))
        low, high = trial[change[0]], trial[change[0] + 1]
    return float(low)


def test_a_node_on_a_grid_point_does_no_harm():
    """Log-derivatives are smooth in energy at the end, however close to a grid point a node falls on the way.

    At a node the matrix to be inverted is singular; among 1e8 inversions some come within 1e-8 of it.
    """
    D = 2.2
    offsets = np.geomspace(1e-10, 1e-3, 40)
    k2 = energy_of_a_node(D) + np.concatenate([-offsets, offsets])
    axis = np.repeat(AXIS[:, None], k2.size, axis=1)
    y, _ = propagate(
        Blocks(np.stack([k2, k2 - 1.5, k2 - 1.5]), np.zeros((3, k2.size)), axis),
        lambda R: (0 * R, np.full_like(R, D)),
        [(1.0, NODE_STEP, round(NODE_LENGTH / NODE_STEP))],
        WALL,
    )
    exact = np.array([constant_coupling(np.array([e, e - 1.5, e - 1.5]), D, NODE_LENGTH) for e in k2])
    error = np.abs(full(y) - exact).max(axis=(1, 2)) / np.abs(exact).max(axis=(1, 2))
    far = np.abs(k2 - np.median(k2)) > 1e-4
    assert np.all(error[far] < 2e-5), "away from the node only the step counts"
    bad = [f"{e:.1e} at k^2 - node = {o:.1e}" for o, e in zip(k2 - np.median(k2), error, strict=True) if e > 1e-4]
    assert not bad, "; ".join(bad)
