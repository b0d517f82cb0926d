"""Semiclassical close coupling: cross sections of every observable on a grid of energies, per family of paths.

One table serves every temperature. Which family answers for which rate is decided in `pertcalc.thermal`; the method is
described in notes/semiclassical.md.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from pertcalc.collisions import born_tails
from pertcalc.collisions.impact import ImpactGrid, impact_grid
from pertcalc.collisions.multipoles import INDEX, OBSERVABLES, observables
from pertcalc.collisions.pair import R_END, CollisionPair
from pertcalc.collisions.paths import PathFamily
from pertcalc.collisions.scattering import scatter

Array = NDArray[np.float64]
Progress = Callable[[int, int], None]

# The step error is measured on every fourth path, repeated with this many times the steps: what changes is nearly all
# of the error. (Fewer steps would say nothing about a tiny transfer: its error falls exponentially.)
FINER_STEPS = 1.4
# Phase of -C6/R^6 on a straight path, over C6/(v b^5).
PHASE_OF_C6 = 3 * np.pi / 8
# A grid never stops closer than this [bohr]: pairs whose dispersion differences cancel still collide.
RADIUS_LEAST = 8.0


@dataclass(frozen=True, slots=True)
class CrossSections:
    """Cross sections of one path family on a grid of energies.

    Parameters
    ----------
    energy : ndarray, shape (n,)
        Kinetic energies, rising [hartree].
    sigma, half_grid : ndarray, shape (n, observables)
        Cross sections in the order of `multipoles.OBSERVABLES`, from all impact parameters and from every second one
        [bohr^2].
    step_change : ndarray, shape (n, observables)
        Estimated error from the step [bohr^2].
    work : dict
        Counts: paths, matrix exponentials.
    """

    energy: Array
    sigma: Array
    half_grid: Array
    step_change: Array
    work: dict[str, int]

    def column(self, name: str) -> Array:
        """Cross section of one observable, shape (n,) [bohr^2]."""
        return self.sigma[:, INDEX[name]]

    def thinned(self, first: int, every: int) -> CrossSections:
        """The table at every second, third ... energy, from number `first` on."""
        return replace(
            self,
            energy=self.energy[first::every],
            sigma=self.sigma[first::every],
            half_grid=self.half_grid[first::every],
            step_change=self.step_change[first::every],
        )


def reach(pair: CollisionPair, speed: float) -> float:
    """Weisskopf radius of the actual curves: the outermost R at which a straight path turns a phase of one radian.

    For a pure -C6/R^6 difference it is (3 pi C6/8 v)^(1/5); the B curves of helium repel further out than that.

    Parameters
    ----------
    pair : CollisionPair
    speed : float
        Relative speed [au].

    Returns
    -------
    float
        [bohr].
    """
    R = np.geomspace(4.0, 0.5 * R_END, 800)
    line, difference, _ = pair.table(R)
    phase = PHASE_OF_C6 * np.maximum(np.abs(line + difference / 3), np.abs(difference)) * R / speed
    strong = np.flatnonzero(phase >= 1)
    return max(float(R[strong[-1]]) if strong.size else 0.0, RADIUS_LEAST)


def tails(pair: CollisionPair, speed: float, last: float) -> Array:
    """Born cross sections of all impact parameters beyond `last` [bohr], shape (observables,) [bohr^2]."""
    values = np.zeros(len(OBSERVABLES))
    D, splitting = pair.anisotropy, pair.splitting
    for level in ("P1/2", "P3/2"):
        values[INDEX[f"{level}.width"]] = born_tails.half_width_tail(
            speed, last, pair.isotropic[0], D, splitting, level
        )
        values[INDEX[f"{level}.shift"]] = born_tails.shift_tail(speed, last, *pair.isotropic)
        values[INDEX[f"{level}.outflow"]] = born_tails.outflow_tail(speed, last, D, splitting, level)
        for K in (1,) if level == "P1/2" else (1, 2, 3):
            values[INDEX[f"{level}.loss{K}"]] = born_tails.multipole_loss_tail(speed, last, D, splitting, level, K)
    # In first order rank 1 goes over with the weight of the dipole part alone; measured against the inner paths it is
    # far below every error quoted, and no closed form is carried for it.
    return values


def cross_sections(
    pair: CollisionPair,
    path: str,
    energy: Array,
    density: Array | float = 1.0,
    step_factor: Array | float = 1.0,
    estimate_step_error: bool = True,
    progress: Progress | None = None,
) -> CrossSections:
    """Cross sections on one family of paths, all impact parameters of several energies stepped as one batch.

    Parameters
    ----------
    pair : CollisionPair
    path : str
        "lower", "pi", "upper" or "straight": which potential drives the path.
    energy : ndarray, shape (n,)
        Kinetic energies, rising [hartree].
    density : ndarray, shape (n,), or float
        Multiplies the number of impact parameters [1].
    step_factor : ndarray, shape (n,), or float
        Multiplies the number of steps [1].
    estimate_step_error : bool
        Repeat every fourth path with more steps.
    progress : callable or None
        Called with (done, total) after every batch.

    Returns
    -------
    CrossSections
    """
    family = PathFamily(pair, path)
    speed = family.speed(energy)
    densities = np.broadcast_to(np.asarray(density, dtype=float), energy.shape)
    factors = np.broadcast_to(np.asarray(step_factor, dtype=float), energy.shape)
    grids = [
        impact_grid(family, float(E), reach(pair, float(v)), float(d))
        for E, v, d in zip(energy, speed, densities, strict=True)
    ]
    batches = _batches([grid.b.size for grid in grids])
    rows, halves, changes = [], [], []
    work = {"paths": 0, "exponentials": 0}
    for done, members in enumerate(batches):
        some = [grids[i] for i in members]
        values = path_values(family, energy[members], some, factors[members], work)
        finer = None
        if estimate_step_error:
            quarter = [_quarter(grid) for grid in some]
            finer = path_values(family, energy[members], quarter, factors[members] * FINER_STEPS, work)
        for k, i in enumerate(members):
            grid, tail = grids[i], tails(pair, float(speed[i]), grids[i].last)
            rows.append(grid.full @ values[k] + tail)
            halves.append(grid.half @ values[k] + tail)
            changes.append(_step_change(grid, values[k], finer[k]) if finer is not None else 0 * tail)
        if progress is not None:
            progress(done + 1, len(batches))
    return CrossSections(energy, np.array(rows), np.array(halves), np.array(changes), work)


def _batches(sizes: list[int], least: int = 1500) -> list[list[int]]:
    """Consecutive energies gathered until a batch holds at least `least` paths."""
    batches: list[list[int]] = [[]]
    total = 0
    for i, size in enumerate(sizes):
        if total >= least:
            batches.append([])
            total = 0
        batches[-1].append(i)
        total += size
    return batches


def _quarter(grid: ImpactGrid) -> ImpactGrid:
    used = grid.quarter > 0
    return replace(grid, b=grid.b[used], turning_point=grid.turning_point[used], full=grid.quarter[used])


def path_values(
    family: PathFamily,
    energy: Array,
    grids: list[ImpactGrid],
    step_factor: Array,
    work: dict[str, int],
) -> list[Array]:
    """Observables of every path of several energies, one array (points, observables) per grid [1].

    Parameters
    ----------
    family : PathFamily
    energy, step_factor : ndarray, shape (n,)
        Kinetic energies [hartree] and multipliers of the number of steps [1].
    grids : list of n ImpactGrid
    work : dict
        "paths" and "exponentials" are counted up.
    """
    sizes = [grid.b.size for grid in grids]
    b = np.concatenate([grid.b for grid in grids])
    turning_point = np.concatenate([grid.turning_point for grid in grids])
    scattering = scatter(family, np.repeat(energy, sizes), b, turning_point, np.repeat(step_factor, sizes))
    work["paths"] += b.size
    work["exponentials"] += scattering.exponentials
    return np.split(observables(scattering), np.cumsum(sizes)[:-1])


def _step_change(grid: ImpactGrid, values: Array, finer: Array) -> Array:
    """Error left by the step: what more steps change, on every fourth path."""
    used = grid.quarter > 0
    weights = grid.quarter[used]
    return np.abs(weights @ (values[used] - finer))
