"""Coarse tables on shared grids, and the batch that drops paths as they arrive."""

from __future__ import annotations

import numpy as np
import pytest

from pertcalc.collisions import scattering
from pertcalc.collisions.coarse import STEPS_WIDE, coarse_grids, coarse_rates, coarse_tables
from pertcalc.constants import KELVIN_HARTREE
from pertcalc.curves import files
from pertcalc.model_error import moved_pair
from tests.collision_cases import collide, default_pair, thermal

T = np.array([330.0])


@pytest.mark.parametrize("share", [0.5, 1.0])
def test_dropping_the_paths_that_arrived_changes_nothing_but_the_work(monkeypatch, share):
    pair, b = default_pair("Rb", "Ar"), np.linspace(0.5, 60.0, 300)
    found, work = [], []
    for still_going in (0.0, share):
        monkeypatch.setattr(scattering, "STILL_GOING", still_going)
        S = collide(pair, "lower", thermal(330.0), b)
        found.append((S.block_a, S.block_b, S.line_phase))
        work.append(S.exponentials)
    for kept, dropped in zip(*found, strict=True):
        assert np.abs(kept - dropped).max() < 1e-12
    assert work[1] < 0.8 * work[0]


def test_the_grid_covers_its_temperatures_and_takes_every_step_where_transfer_needs_it():
    pair = default_pair("Rb", "Ar")
    grid = coarse_grids(pair, np.array([300.0, 600.0]))["lower"]
    kT = KELVIN_HARTREE * np.array([300.0, 600.0])
    assert grid.energy[0] == pytest.approx(0.12 * kT[0]) and grid.energy[-1] == pytest.approx(14 * kT[1])
    # Transfer begins at a mean energy of splitting/2; the last energy below it shapes the spline there.
    below = np.flatnonzero(grid.energy < 0.5 * pair.splitting)[-1]
    assert np.all(grid.steps[below:] == STEPS_WIDE)


def test_the_pair_of_the_grids_needs_no_new_ones():
    pair = default_pair("K", "He")
    grids = coarse_grids(pair, T)
    first, again = (coarse_tables(pair, grids) for _ in range(2))
    for name, table in first.items():
        assert np.array_equal(table.sigma, again[name].sigma) and np.all(np.isfinite(table.sigma))
        assert table.work["paths"] == sum(one.b.size for one in grids[name].impact)


def test_transfer_keeps_detailed_balance_and_the_ground_curve_drives_no_path():
    curves, pair = files.load_default("K", "He"), default_pair("K", "He")
    grids = coarse_grids(pair, T)
    base, _ = coarse_rates(pair, T, grids)
    moved, _ = coarse_rates(moved_pair(curves, {"X": {"De": 0.3, "C6": 0.1}}), T, grids)
    up, down = base["transfer", "P1/2"], base["transfer", "P3/2"]
    # Microreversibility: degeneracies 4 and 2, and the Boltzmann factor of the splitting.
    assert up / down == pytest.approx(2 * np.exp(-pair.splitting / (KELVIN_HARTREE * T)))
    for key, value in moved.items():
        if key[0] in ("fwhm", "shift"):
            assert abs(value[0] / base[key][0] - 1) > 1e-4
        else:
            assert value == pytest.approx(base[key], rel=1e-9)
