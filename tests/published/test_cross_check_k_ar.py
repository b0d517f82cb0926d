"""Semiclassical cross sections of K-Ar against an independent quantum close-coupling calculation on the same curves.

Source: data/cross_check_K-Ar.json, COMPUTED by another program (partial waves to 45 k + 15, R to 60 bohr, Born tail in
the shift; a second code reproduces all but the shift to 0.04 % at E = kT). Not published data, and not our program.
The rank-1 gains at E = kT are from a third program of that comparison (COMPUTED). Tolerances: what the method is
expected to hold.
"""

from __future__ import annotations

from functools import cache

import numpy as np
import pytest

from pertcalc.collisions.recipe import R_COLLISION, p32_weights
from pertcalc.collisions.semiclassical import cross_sections
from pertcalc.thermal import mean_speed
from tests.collision_cases import cross_check, model_k_ar, thermal

POINTS = range(4)
WIDTH, SHIFT, ORIENTATION, TRANSFER, GAIN = 0.03, 0.04, 0.04, 0.15, 0.18
MULTIPOLES = {1: 0.06, 2: 0.06, 3: 0.08}


def energies() -> np.ndarray:
    """Kinetic energy in the level of entrance [hartree]."""
    return thermal(cross_check()["T_K"]) * np.array(cross_check()["E_over_kT"])


@cache
def table(path: str):
    return cross_sections(model_k_ar(), path, energies(), 1.5, 1.5, False)


@cache
def carried(level: str, name: str) -> np.ndarray:
    """Transfer out of a level at its kinetic energies: path at the mean energy, factor of equal angular momentum."""
    offset = 0.5 * model_k_ar().splitting * (-1 if level == "P1/2" else 1)
    mean = energies() + offset
    return cross_sections(model_k_ar(), "lower", mean, 1.5, 1.5, False).column(name) * mean / energies()


def massey() -> float:
    """Splitting times the time to cross the collision at the mean thermal speed."""
    pair = model_k_ar()
    return pair.splitting * R_COLLISION / float(mean_speed(cross_check()["T_K"], pair.reduced_mass))


def quantum(level: str, column: str) -> np.ndarray:
    data = cross_check()["J0.5" if level == "P1/2" else "J1.5"]
    return np.array(data["quantum"])[:, data["columns"].index(column)]


def elastic(path: str, level: str, K: int) -> np.ndarray:
    return table(path).column(f"{level}.loss{K}") - table(path).column(f"{level}.outflow")


@pytest.mark.parametrize("i", POINTS)
@pytest.mark.parametrize(("level", "path"), [("P1/2", "lower"), ("P3/2", "pi")])
def test_width(level, path, i):
    assert table(path).column(f"{level}.width")[i] == pytest.approx(quantum(level, "optical_re")[i], rel=WIDTH)


@pytest.mark.parametrize("i", POINTS)
@pytest.mark.parametrize(("level", "path"), [("P1/2", "lower"), ("P3/2", "pi")])
def test_shift(level, path, i):
    assert table(path).column(f"{level}.shift")[i] == pytest.approx(quantum(level, "optical_im")[i], rel=SHIFT)


@pytest.mark.parametrize("i", POINTS)
@pytest.mark.parametrize("level", ["P1/2", "P3/2"])
def test_transfer(level, i):
    ours = carried(level, f"{level}.outflow")[i]
    assert ours == pytest.approx(quantum(level, "inelastic")[i], rel=TRANSFER)


@pytest.mark.parametrize("i", POINTS)
def test_orientation_of_p12(i):
    ours = elastic("lower", "P1/2", 1) + carried("P1/2", "P1/2.outflow")
    assert ours[i] == pytest.approx(quantum("P1/2", "multipole_loss_1")[i], rel=ORIENTATION)


@pytest.mark.parametrize("i", POINTS)
@pytest.mark.parametrize("K", [1, 2, 3])
def test_multipoles_of_p32(K, i):
    on_pi, on_upper = p32_weights(K, massey())
    ours = on_pi * elastic("pi", "P3/2", K) + on_upper * elastic("upper", "P3/2", K)
    ours += carried("P3/2", "P3/2.outflow")
    assert ours[i] == pytest.approx(quantum("P3/2", f"multipole_loss_{K}")[i], rel=MULTIPOLES[K])


@pytest.mark.parametrize(("level", "gain"), [("P1/2", -4.2495), ("P3/2", -6.7828)])
def test_orientation_carried_to_the_other_level(level, gain):
    """At E = kT in the level of entrance: the sign, and the size to 18 % (a small difference of larger parts)."""
    assert carried(level, "gain1")[1] == pytest.approx(gain, rel=GAIN)


def test_quantum_numbers_hang_together():
    """The file itself: the loss of rank 0 is the inelastic cross section."""
    for level in ("P1/2", "P3/2"):
        np.testing.assert_allclose(quantum(level, "multipole_loss_0"), quantum(level, "inelastic"), rtol=1e-6)


def test_the_path_of_entrance_is_the_better_one():
    """Why P1/2 follows its own adiabatic curve: on V_Pi the worst orientation is several times further off."""
    exact = quantum("P1/2", "multipole_loss_1")
    transfer = carried("P1/2", "P1/2.outflow")
    worst = {path: np.abs((elastic(path, "P1/2", 1) + transfer) / exact - 1).max() for path in ("lower", "pi")}
    assert worst["pi"] > 3 * worst["lower"]
