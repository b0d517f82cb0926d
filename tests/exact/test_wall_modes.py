"""The slowest wall mode: closed-form limits, the radial operator diagonalised, single orbits followed."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.linalg import eigh_tridiagonal
from scipy.special import jn_zeros

from pertcalc.vapour.cell import Cell, transit_rate, wall_rate

SPEED = 3e4
CELLS = (Cell("sphere", (2.5,)), Cell("cylinder", (2.5, 5.0)), Cell("cube", (1.0,)))


def geometric(cell: Cell) -> float:
    """k1^2 of a wall that lets nothing survive: (pi/R)^2; (2.4048/R)^2 + (pi/L)^2; 3 (pi/a)^2."""
    d = cell.sizes_cm[0]
    return {
        "sphere": (2 * math.pi / d) ** 2,
        "cylinder": (2 * jn_zeros(0, 1)[0] / d) ** 2 + (math.pi / cell.sizes_cm[-1]) ** 2,
        "cube": 3 * (math.pi / d) ** 2,
    }[cell.shape]


@pytest.mark.parametrize("cell", CELLS, ids=lambda c: c.shape)
def test_high_density_is_the_slowest_diffusion_mode(cell):
    D = 1e-6
    assert wall_rate(cell, D, SPEED, 1.0) == pytest.approx(D * geometric(cell), rel=1e-8)


@pytest.mark.parametrize("depolarisation", [1.0, 3e-4, 1e-12])
@pytest.mark.parametrize("cell", CELLS, ids=lambda c: c.shape)
def test_low_density_is_free_flight(cell, depolarisation):
    free = SPEED * cell.area_cm2 / (4 * cell.volume_cm3) * depolarisation
    assert wall_rate(cell, None, SPEED, depolarisation) == pytest.approx(free, rel=1e-14)
    assert wall_rate(cell, 1e14, SPEED, depolarisation) == pytest.approx(free, rel=1e-8)


@pytest.mark.parametrize("cell", CELLS, ids=lambda c: c.shape)
def test_between_the_limits_the_rate_is_below_both_and_rises(cell):
    """Each limit is an upper bound of the lowest eigenvalue: constant trial function; a more absorbing wall."""
    D = np.geomspace(1e-4, 1e7, 40)
    rates = np.array([wall_rate(cell, float(one), SPEED, 1.0) for one in D])
    assert np.all(np.diff(rates) > 0)
    assert np.all(rates < D * geometric(cell)) and np.all(rates < wall_rate(cell, None, SPEED, 1.0))
    # Poincare-type lower bound: the two resistances in series.
    assert np.all(1 / rates < 1 / (D * geometric(cell)) + 1 / wall_rate(cell, None, SPEED, 1.0) + 1e-12)


def lowest_eigenvalue(radius: float, dimension: int, h: float, n: int = 2000) -> float:
    """-Laplacian for functions of r in 1, 2, 3 dimensions, d rho/dr = -h rho at the wall: finite volumes."""
    dr = radius / n
    edge = np.arange(n + 1) * dr
    area = edge ** (dimension - 1)
    volume = np.diff(edge**dimension) / dimension
    flux = np.append(area[1:-1] / dr, area[-1] * h / (1 + h * dr / 2))  # half a cell between centre and wall
    diagonal = (flux + np.append(0.0, flux[:-1])) / volume
    beside = -flux[:-1] / np.sqrt(volume[:-1] * volume[1:])
    return float(eigh_tridiagonal(diagonal, beside, select="i", select_range=(0, 0), eigvals_only=True)[0])


@pytest.mark.parametrize("h", [1e-3, 0.3, 4.0, 1e3])
@pytest.mark.parametrize("cell", CELLS, ids=lambda c: c.shape)
def test_against_the_radial_operator(cell, h):
    D, half = 7.0, [size / 2 for size in cell.sizes_cm]
    parts = {"sphere": [(half[0], 3)], "cylinder": [(half[0], 2), (half[-1], 1)], "cube": [(half[0], 1)] * 3}
    expected = D * sum(lowest_eigenvalue(radius, dimension, h) for radius, dimension in parts[cell.shape])
    speed = 4 * D * h  # eps = 1
    assert wall_rate(cell, D, speed, 1.0) == pytest.approx(expected, rel=1e-5)


def test_only_the_product_of_speed_and_depolarisation_counts():
    cell = CELLS[1]
    assert wall_rate(cell, 3.0, 1e4, 0.3) == pytest.approx(wall_rate(cell, 3.0, 3e3, 1.0), rel=1e-12)


def test_transit_limits():
    assert transit_rate(0.5, None, SPEED) == pytest.approx(SPEED / 0.5, rel=1e-14)
    assert transit_rate(0.5, 1e-6, SPEED) == pytest.approx(1e-6 * (2.404825557695773 / 0.25) ** 2, rel=1e-8)
    long_cell = Cell("cylinder", (0.5, 1e4))
    assert transit_rate(0.5, 20.0, SPEED) == pytest.approx(wall_rate(long_cell, 20.0, SPEED, 1.0), rel=1e-6)


def late_decay(free_path: float, depolarisation: float, n: int = 20_000) -> tuple[float, float]:
    """Decay rate at late times, and its statistical error, of straight flights in a sphere of R = 1 at unit speed.

    Isotropic scattering with a mean free path; the wall depolarises with a probability, else reflects diffusely.
    """
    rng = np.random.default_rng(5)

    def directions(m: int) -> np.ndarray:
        u = rng.normal(size=(m, 3))
        return u / np.linalg.norm(u, axis=1)[:, None]

    x, t, death = directions(n) * rng.random(n)[:, None] ** (1 / 3), np.zeros(n), np.zeros(n)
    alive = np.arange(n)
    u = directions(n)
    while alive.size:
        to_scatter = rng.exponential(free_path, alive.size)
        b = (x * u).sum(1)
        to_wall = -b + np.sqrt(np.maximum(b * b - (x * x).sum(1) + 1, 0))
        hit = to_wall < to_scatter
        step = np.where(hit, to_wall, to_scatter)
        x, t, new = x + u * step[:, None], t + step, directions(alive.size)
        lost = hit & (rng.random(alive.size) < depolarisation)
        death[alive[lost]] = t[lost]
        back = hit & ~lost
        cosine_law = new[back] - x[back]  # unit vector plus inward normal
        new[back] = cosine_law / np.linalg.norm(cosine_law, axis=1)[:, None]
        x[back] *= 1 - 1e-9
        x, t, u, alive = x[~lost], t[~lost], new[~lost], alive[~lost]
    late = 1.5 * death.mean()
    spans = death[death > late] - late
    return float(1 / spans.mean()), float(1 / spans.mean() / math.sqrt(spans.size))


@pytest.mark.parametrize(("free_path", "depolarisation"), [(0.1, 1.0), (0.1, 0.3), (1.0, 0.1)])
def test_single_orbits_lie_between_the_plain_and_the_corrected_condition(free_path, depolarisation):
    """Independent method: no diffusion equation. The corrected condition is right to 3 %, the plain one is low."""
    rate, noise = late_decay(free_path, depolarisation)
    cell, D = Cell("sphere", (2.0,)), free_path / 3
    assert wall_rate(cell, D, 1.0, depolarisation, corrected=True) == pytest.approx(rate, rel=0.03, abs=3 * noise)
    assert wall_rate(cell, D, 1.0, depolarisation) < rate + 3 * noise
