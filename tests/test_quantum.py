"""Quantum close coupling as a method: convergence, microreversibility of the cross sections, thermal rates, work.

Laws and self-consistency only; comparison with other calculations is in tests/published, limits in tests/exact.
"""

from __future__ import annotations

import math
from functools import cache

import numpy as np
import pytest

from pertcalc import thermal as averages
from pertcalc.collisions import close_coupling, quantum
from pertcalc.collisions.close_coupling import scattering_matrices
from pertcalc.collisions.multipoles import INDEX, OBSERVABLES
from pertcalc.collisions.partial_waves import LEVELS, multipole_cross_sections
from pertcalc.collisions.quantum import level_cross_sections, level_tables, thermal_rates
from pertcalc.collisions.semiclassical import CrossSections
from pertcalc.constants import AU_RATE_CM3_S, KELVIN_HARTREE
from pertcalc.thermal import energy_grid, maxwell
from tests import test_rates
from tests.collision_cases import default_pair, model_k_ar, thermal

# Inversions of K-Ar at 373 K, both levels, checks included, when this test was written; see the bound below.
INVERSIONS_K_AR = 124e6


def pair_named(name: str):
    return model_k_ar() if name == "model" else default_pair(*name.split("-"))


@cache
def rows(name: str, level: str, x: float, points: float = 4.0):
    """Cross sections at kinetic energy x kT, T = 373 K, with the error estimate of the method.

    Three energies, because the estimate is made at the middle one of three.
    """
    energy = thermal(373.0, x) * np.array([0.9, 1.0, 1.1])
    return level_cross_sections(pair_named(name), level, energy, np.full(3, points))


def of_level(level: str) -> list[int]:
    return [i for name, i in INDEX.items() if name.startswith(level) or (name == "gain1" and level == "P3/2")]


# --- cross sections ---------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("level", LEVELS)
def test_tables(level):
    """Columns of the other level are 0, everything is finite, losses contain the outflow."""
    table = rows("model", level, 1.0)
    assert table.sigma.shape == table.step_change.shape == (3, len(OBSERVABLES))
    assert np.all(np.isfinite(table.sigma)) and np.all(table.step_change >= 0)
    others = [i for i in range(len(OBSERVABLES)) if i not in of_level(level)]
    assert np.all(table.sigma[:, others] == 0)
    outflow = table.column(f"{level}.outflow")
    for K in (1,) if level == "P1/2" else (1, 2, 3):
        # |what survives of rank K| <= the population that stays.
        assert np.all(table.column(f"{level}.loss{K}") > outflow)
    np.testing.assert_array_equal(table.half_grid, table.sigma)


@pytest.mark.parametrize(
    ("name", "x"), [("model", 0.5), ("model", 2.0), ("Rb-He", 1.0), ("Na-Ne", 1.0), ("Cs-Ne", 4.0)]
)
def test_microreversibility(name, x):
    """Both directions from the one S at one total energy: k1^2 g1 sigma_12 = k2^2 g2 sigma_21 to 1e-6; rank 1."""
    pair = pair_named(name)
    matrices = scattering_matrices(pair, thermal(373.0, x) + pair.splitting, 20.0, 26.0, 4.0)
    k2 = matrices.momentum2
    out = [multipole_cross_sections(matrices, level, level, 0)[1] for level in LEVELS]
    assert 2 * k2[0] * out[0] == pytest.approx(4 * k2[1] * out[1], rel=1e-6)
    for K in (0, 1):
        up = multipole_cross_sections(matrices, "P1/2", "P3/2", K)[0]
        down = multipole_cross_sections(matrices, "P3/2", "P1/2", K)[0]
        assert k2[0] * up == pytest.approx(k2[1] * down, rel=1e-6)
        if K == 0:
            assert up == pytest.approx(out[0] * math.sqrt(0.5), rel=1e-6)
            assert down == pytest.approx(out[1] * math.sqrt(2.0), rel=1e-6)


@pytest.mark.parametrize("x", [0.5, 2.0])
def test_both_tables_hold_the_same_transfer(x):
    """Outflow of P1/2 from its own grid, at the same total energy, against that of P3/2 (other reach and steps)."""
    pair = model_k_ar()
    kinetic = thermal(373.0, x)
    down, up = (
        level_cross_sections(pair, level, np.array([E]), np.array([5.0])).column(f"{level}.outflow")[0]
        for level, E in (("P3/2", kinetic), ("P1/2", kinetic + pair.splitting))
    )
    assert 2 * (kinetic + pair.splitting) * up == pytest.approx(4 * kinetic * down, rel=2e-3)


@pytest.mark.parametrize("level", LEVELS)
@pytest.mark.parametrize(("name", "x"), [("model", 1.0), ("Rb-He", 1.0), ("Na-Ne", 2.0)])
def test_the_error_estimate_covers_half_the_step_and_twice_the_range(name, x, level, monkeypatch):
    """Points doubled, partial waves and matching half as far again: nothing moves by more than was said (plus 1e-3)."""
    table = rows(name, level, x)
    energy, points = table.energy[1:2], np.array([8.0])
    finer = level_cross_sections(pair_named(name), level, energy, points).sigma[0]
    monkeypatch.setattr(quantum, "LAST_REACH", 1.5 * quantum.LAST_REACH)
    monkeypatch.setattr(quantum, "MATCH_REACH", 1.5 * quantum.MATCH_REACH)
    further = level_cross_sections(pair_named(name), level, energy, points / 2).sigma[0]
    scale = np.abs(table.sigma[1])
    # A shift is what is left of two signs: its error is to be seen against the width.
    scale[INDEX[f"{level}.shift"]] = table.sigma[1, INDEX[f"{level}.width"]]
    for what, other in (("step", finer), ("range", further)):
        for i in of_level(level):
            change = abs(other[i] - table.sigma[1, i])
            assert change <= 2 * table.step_change[1, i] + 1e-3 * scale[i], (what, OBSERVABLES[i])


@pytest.mark.parametrize("level", LEVELS)
def test_starting_deeper_changes_nothing(level, monkeypatch):
    wanted = rows("Rb-He", level, 1.0, 6.0).sigma[1]
    monkeypatch.setattr(close_coupling, "FORBIDDEN", 22.0)
    monkeypatch.setattr(close_coupling, "GROUP", 70)
    deeper = level_cross_sections(pair_named("Rb-He"), level, np.array([thermal(373.0)]), np.array([6.0])).sigma[0]
    width = wanted[INDEX[f"{level}.width"]]
    np.testing.assert_allclose(deeper, wanted, rtol=2e-4, atol=1e-4 * width)


@pytest.mark.parametrize("name", ["P3/2.outflow", "gain1"])
def test_a_tiny_transfer_does_not_come_from_the_matching(name, monkeypatch):
    """Cs-Ne exchanges 2e-6 bohr^2 at E = kT: the same when the waves are matched further out."""
    wanted = rows("Cs-Ne", "P3/2", 1.0, 5.0).column(name)[1]
    monkeypatch.setattr(quantum, "MATCH_REACH", 1.6 * quantum.MATCH_REACH)
    further = level_cross_sections(pair_named("Cs-Ne"), "P3/2", np.array([thermal(373.0)]), np.array([5.0]))
    assert wanted == pytest.approx(further.column(name)[0], rel=0.03)


@pytest.mark.parametrize("x", [0.9, 1.1])
def test_losses_pass_the_threshold_smoothly(x):
    """P1/2 just below and above the threshold of P3/2: its orientation and width do not jump."""
    pair = model_k_ar()
    energy = pair.splitting * np.array([1 - 2e-3, 1 + 2e-3, x])
    table = level_cross_sections(pair, "P1/2", energy, np.full(3, 4.0))
    for name in ("P1/2.width", "P1/2.loss1"):
        below, above, _ = table.column(name)
        assert below == pytest.approx(above, rel=0.03)
    below, above, beyond = table.column("P1/2.outflow")
    assert abs(below) < 1e-9 and 0 <= above
    assert beyond > above if x > 1 else abs(beyond) < 1e-9


# --- thermal rates ----------------------------------------------------------------------------------------------------


def made_up_tables(T: float) -> dict[str, CrossSections]:
    """Arbitrary cross sections of either level on a grid for T."""
    energy = energy_grid(np.array([T]), 0.3, quantum.HIGHEST)
    rng = np.random.default_rng(9)
    tables = {}
    for level in LEVELS:
        sigma = rng.uniform(10, 500, size=(energy.size, len(OBSERVABLES)))
        tables[level] = CrossSections(energy, sigma, sigma, 0 * sigma, {})
    return tables


@pytest.mark.parametrize("T", [300.0, 350.0, 400.0])
@pytest.mark.parametrize("splitting", [0.0, 1.5e-6, 2.6e-4, 2.5e-3])
def test_detailed_balance_is_exact(T, splitting):
    """k_up/k_down = 2 exp(-splitting/kT), orthonormal multipoles half that, to 1e-12; exponents alike."""
    found = thermal_rates(made_up_tables(350.0), splitting, T, 36_000.0)
    threshold = splitting / (KELVIN_HARTREE * T)
    for key, weight in ((("transfer",), 2.0), (("gain",), 1.0)):
        rank = () if weight == 2 else ("1",)
        up, down = (found[*key, level, *rank] for level in LEVELS)
        assert up.rate == pytest.approx(weight * math.exp(-threshold) * down.rate, rel=1e-12)
        assert up.exponent - down.exponent == pytest.approx(threshold, rel=1e-9, abs=1e-12)


def test_rates_are_maxwell_averages_of_their_columns():
    """Twice the half width, the shift, every loss: from the table of their own level."""
    tables, T, mass = made_up_tables(350.0), 350.0, 36_000.0
    found = thermal_rates(tables, 2.6e-4, T, mass)

    def average(level: str, name: str) -> float:
        table = tables[level]
        return maxwell(table.energy, table.column(name), T, mass).rate

    for line, level in (("D1", "P1/2"), ("D2", "P3/2")):
        assert found["fwhm", line].rate == pytest.approx(2 * average(level, f"{level}.width"), rel=1e-12)
        assert found["shift", line].rate == pytest.approx(average(level, f"{level}.shift"), rel=1e-12)
    assert found["loss", "P1/2", "1"].rate == pytest.approx(average("P1/2", "P1/2.loss1"), rel=1e-12)
    for K in (1, 2, 3):
        assert found["loss", "P3/2", str(K)].rate == pytest.approx(average("P3/2", f"P3/2.loss{K}"), rel=1e-12)
    assert found["transfer", "P3/2"].rate == pytest.approx(average("P3/2", "P3/2.outflow"), rel=1e-12)


@pytest.mark.slow
def test_upward_transfer_agrees_with_the_grid_of_p12():
    """Maxwell average of P1/2's own outflow above its threshold, a trapezoid sum across a step: to a few per cent."""
    pair = default_pair("Na", "He")
    tables = level_tables(pair, np.array([350.0]))
    direct = maxwell(tables["P1/2"].energy, tables["P1/2"].column("P1/2.outflow"), 350.0, pair.reduced_mass)
    found = thermal_rates(tables, pair.splitting, 350.0, pair.reduced_mass)
    assert found["transfer", "P1/2"].rate == pytest.approx(direct.rate, rel=0.03)


def test_progress_is_told(monkeypatch):
    monkeypatch.setattr(averages, "LOG_SPACING", 2.0)
    calls: list[tuple[int, int]] = []
    level_tables(default_pair("Li", "He"), np.array([60.0]), lambda done, total: calls.append((done, total)))
    done = [part / total for part, total in calls]
    assert len(done) > 5 and done == sorted(done) and 0 < done[0] < 0.5 and done[-1] == 1.0


def test_json_contract():
    test_rates.test_json_contract("quantum", 373.0)


def test_rates_have_errors_signs_and_origin():
    result = test_rates.rates("K", "Ar", 373.0, "quantum")
    assert result.method == "quantum"
    for name, c in test_rates.coefficients(result).items():
        assert np.all(np.isfinite(c.values)) and np.all((0 < c.numerical_error) & (c.numerical_error < 0.02)), name
        assert c.model_error is None or np.all(c.model_error > 0)
    up, down = (result.transfer[level].values[0] for level in LEVELS)
    boltzmann = math.exp(-default_pair("K", "Ar").splitting / (KELVIN_HARTREE * 373.0))
    assert up / down == pytest.approx(2 * boltzmann, rel=1e-12)
    for level in LEVELS:
        for c in result.multipole_loss[level].values():
            assert c.values[0] > result.transfer[level].values[0]


def test_method_differs_from_the_semiclassical_one_by_what_it_should():
    """The same pair both ways: equal within the method error the semiclassical result quotes, and not identical."""
    quantum_way, other = (
        test_rates.coefficients(test_rates.rates("K", "Ar", 373.0, m)) for m in ("quantum", "semiclassical")
    )
    for name, c in quantum_way.items():
        theirs = other[name]
        allowed = float(theirs.model_error[0] + theirs.numerical_error[0] + c.numerical_error[0])
        assert c.values[0] == pytest.approx(theirs.values[0], rel=allowed), name
        assert c.values[0] != theirs.values[0]


def finer_rates(name: str, T: float, monkeypatch) -> dict:
    """Twice the energies, twice the points, a longer reach, energies further up."""
    for constant, value in (
        ("POINTS", 2 * quantum.POINTS),
        ("LEAST_POINTS", 2 * quantum.LEAST_POINTS),
        ("LAST_REACH", 1.15 * quantum.LAST_REACH),
        ("MATCH_REACH", 1.15 * quantum.MATCH_REACH),
        ("HIGHEST", 15.0),
        ("CHECK_EVERY", 10_000),
    ):
        monkeypatch.setattr(quantum, constant, value)
    monkeypatch.setattr(averages, "LOG_SPACING", averages.LOG_SPACING / 2)
    pair = pair_named(name)
    return thermal_rates(level_tables(pair, np.array([T])), pair.splitting, T, pair.reduced_mass)


SLOW = pytest.mark.slow


@pytest.mark.parametrize(
    ("alkali", "gas", "T"),
    [
        ("Na", "Ne", 300.0),
        pytest.param("Rb", "He", 350.0, marks=SLOW),
        pytest.param("K", "Ar", 373.0, marks=SLOW),
        pytest.param("Cs", "Ne", 313.0, marks=SLOW),
        pytest.param("Li", "He", 350.0, marks=SLOW),
    ],
)
def test_numerical_error_covers_what_a_finer_computation_changes(alkali, gas, T, monkeypatch):
    """The change stays below three times the error quoted, which is an estimate, not a bound."""
    result = test_rates.rates(alkali, gas, T, "quantum")
    finer = finer_rates(f"{alkali}-{gas}", T, monkeypatch)
    keys = {("fwhm", line): result.fwhm[line] for line in ("D1", "D2")}
    keys |= {("shift", line): result.shift[line] for line in ("D1", "D2")}
    for level in LEVELS:
        keys["transfer", level] = result.transfer[level]
        keys["gain", level, "1"] = result.multipole_transfer[level][1]
        keys |= {("loss", level, str(K)): c for K, c in result.multipole_loss[level].items()}
    wrong = []
    for key, c in keys.items():
        change = abs(finer[key].rate * AU_RATE_CM3_S / c.values[0] - 1)
        if change > 3 * c.numerical_error[0]:
            wrong.append(f"{key}: {change:.2e} > {c.numerical_error[0]:.2e}")
    assert not wrong, "; ".join(wrong)


# --- work -------------------------------------------------------------------------------------------------------------


def test_work_of_one_pair_is_bounded():
    """3x3 inversions of K-Ar at 373 K, both levels with checks: a benchmark that does not depend on the clock."""
    work = test_rates.rates("K", "Ar", 373.0, "quantum").work
    assert work["inversions"] < 1.3 * INVERSIONS_K_AR
    # Not fewer than the problem has: one point per radian of k over 2 x 20 bohr for every block.
    assert work["inversions"] > 40 * work["partial_waves"]
    spacing = averages.energy_spacing(default_pair("K", "Ar").reduced_mass)
    energies = energy_grid(np.array([373.0]), spacing, quantum.HIGHEST).size
    assert work["energies"] == 2 * energies


def test_work_grows_with_mass_and_energy():
    """Partial waves go with k, points per wave with k: inversions with mass x energy, about."""
    counts = {}
    for name, x in (("Rb-He", 1.0), ("Rb-Ar", 1.0), ("Rb-Ar", 4.0)):
        pair = pair_named(name)
        energy = thermal(373.0, x) + pair.splitting
        counts[name, x] = scattering_matrices(pair, energy, 15.0, 20.0, 4.0).inversions, energy * pair.reduced_mass
    for first, second in ((("Rb-He", 1.0), ("Rb-Ar", 1.0)), (("Rb-Ar", 1.0), ("Rb-Ar", 4.0))):
        work, strength = (b / a for a, b in zip(counts[first], counts[second], strict=True))
        assert 0.6 * strength < work < 1.5 * strength
