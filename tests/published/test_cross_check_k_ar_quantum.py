"""Quantum close coupling of K-Ar against independent close-coupling calculations of the same curves.

Independent close-coupling calculation, not published data. Sources: data/cross_check_K-Ar.json (COMPUTED by another
program: partial waves to 45 k + 15, R to 60 bohr, Born tail in the shift), and the lines at E = kT of a second
calculation with a renormalised-Numerov code (COMPUTED; R to 60 bohr, N to 45 k + 15). Neither is our program.
"""

from __future__ import annotations

from functools import cache

import numpy as np
import pytest

from pertcalc.collisions.multipoles import INDEX
from pertcalc.collisions.quantum import level_cross_sections
from tests.collision_cases import cross_check, model_k_ar, thermal

AGREEMENT = 0.005
POINTS = 4.0  # per radian: what the rates use where the average weighs most
COLUMNS = {
    "optical_re": "width",
    "optical_im": "shift",
    "inelastic": "outflow",
    "multipole_loss_0": "outflow",
    "multipole_loss_1": "loss1",
    "multipole_loss_2": "loss2",
    "multipole_loss_3": "loss3",
}
KEYS = {"P1/2": "J0.5", "P3/2": "J1.5"}
ALL = [(level, column, i) for level, key in KEYS.items() for column in cross_check()[key]["columns"] for i in range(4)]


@cache
def ours(level: str):
    """Cross sections at the four energies of the file, kinetic energy in the level of entrance."""
    energy = thermal(cross_check()["T_K"]) * np.array(cross_check()["E_over_kT"])
    return level_cross_sections(model_k_ar(), level, energy, np.full(energy.size, POINTS))


def theirs(level: str, column: str) -> np.ndarray:
    data = cross_check()[KEYS[level]]
    return np.array(data["quantum"])[:, data["columns"].index(column)]


@pytest.mark.parametrize(("level", "column", "i"), ALL)
def test_every_column_of_the_cross_check(level, column, i):
    found = ours(level).column(f"{level}.{COLUMNS[column]}")[i]
    assert found == pytest.approx(theirs(level, column)[i], rel=AGREEMENT)


def test_typical_agreement_is_far_better():
    """Median over all columns and energies below 0.05 %: what is left is where either sum ends."""
    ratios = [
        ours(level).column(f"{level}.{COLUMNS[column]}")[i] / theirs(level, column)[i] - 1 for level, column, i in ALL
    ]
    assert np.median(np.abs(ratios)) < 5e-4


# Second calculation, E = kT in the level of entrance [bohr^2]. sigma_0 and sigma_1: transfer of rank 0 and 1 to the
# other level as a gain, orthonormal tensors. The shift carries the second calculation's own tail.
SECOND = {
    "P1/2": {"width": 816.54, "outflow": 15.4355, "loss1": 298.892, "shift": -767.1},
    "P3/2": {
        "width": 816.37,
        "outflow": 13.0931,
        "loss1": 480.374,
        "loss2": 664.722,
        "loss3": 456.051,
        "shift": -645.6,
    },
}
GAINS = {"P1/2": (10.9145, -4.2495), "P3/2": (18.5165, -6.7828)}


@pytest.mark.parametrize(("level", "name"), [(level, name) for level, row in SECOND.items() for name in row])
def test_second_calculation(level, name):
    found = ours(level).column(f"{level}.{name}")[1]
    tolerance = 1e-3 if name != "shift" else 2e-3
    assert found == pytest.approx(SECOND[level][name], rel=tolerance)


@pytest.mark.parametrize("level", ["P1/2", "P3/2"])
@pytest.mark.parametrize("K", [0, 1])
def test_gains_of_the_second_calculation(level, K):
    """sigma_0 and sigma_1 to the other level, from the S-matrices of that energy; sign included."""
    from pertcalc.collisions.close_coupling import scattering_matrices
    from pertcalc.collisions.partial_waves import multipole_cross_sections

    pair = model_k_ar()
    energy = thermal(cross_check()["T_K"]) + (pair.splitting if level == "P3/2" else 0.0)
    matrices = scattering_matrices(pair, energy, 34.0, 44.0, 5.0)
    other = "P1/2" if level == "P3/2" else "P3/2"
    found = multipole_cross_sections(matrices, level, other, K)[0]
    assert found == pytest.approx(GAINS[level][K], rel=1e-3)
    if (level, K) == ("P3/2", 1):
        assert ours(level).sigma[1, INDEX["gain1"]] == pytest.approx(found, rel=1e-3)


def test_the_curves_are_those_of_the_calculation():
    """Depth and position of the wells, redundant in the file, to its printed digits."""
    pair, data = model_k_ar(), cross_check()["curves"]
    for name in "XAB":
        well = getattr(pair, name).well()
        assert well.depth * 219474.6313632 == pytest.approx(data[name]["De_cm"], rel=1e-4)
        assert well.position * 0.529177210544 == pytest.approx(data[name]["Re_angstrom"], rel=1e-4)
