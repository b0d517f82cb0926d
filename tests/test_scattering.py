"""S-matrices of single collisions: symmetries, an independent integration of the whole path, and exact limits.

Sources: the slow integration of tests/six_state.py (fixed axes, no symmetry of the path used); exact sudden-limit
algebra (pertcalc.collisions.sudden, tested on its own); numbers of an independent full-path integration (DOP853, rtol
1e-9) of pure van der Waals collisions (COMPUTED, not published data).
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from pertcalc.angular import tensor_operator
from pertcalc.collisions import born_tails
from pertcalc.collisions.multipoles import INDEX, OBSERVABLES, level_blocks, observables
from pertcalc.collisions.paths import PathFamily
from pertcalc.collisions.sudden import sudden_limit
from tests.collision_cases import collide, default_pair, dispersion_pair, model_k_ar, slow, thermal
from tests.six_state import newton_path, s_matrix

SPEED = 2.5629e-4  # K-Ar at 373 K [au]
MASS = 36_000.0
STRAIGHT_ENERGY = 0.5 * MASS * SPEED**2


def observed(pair, path, energy, b, step_factor=1.0) -> dict[str, np.ndarray]:
    values = observables(collide(pair, path, energy, b, step_factor))
    return {name: values[:, INDEX[name]] for name in OBSERVABLES}


# --- symmetries -----------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(("alkali", "gas"), [("Li", "He"), ("Na", "Xe"), ("K", "Ar"), ("Rb", "Ne"), ("Cs", "Xe")])
@pytest.mark.parametrize("path", ["lower", "pi", "upper"])
def test_s_is_unitary_and_symmetric(alkali, gas, path):
    """Both blocks to 1e-9, from 0.03 to 14 kT, head-on to far out and a millionth beside orbiting."""
    pair = default_pair(alkali, gas)
    for x in (0.03, 1.0, 14.0):
        energy = thermal(350.0, x)
        b = [1e-3, 1.0, 5.0, 9.0, 14.0, 20.0, 40.0]
        for orbiting in PathFamily(pair, path).orbiting_impact_parameters(energy):
            b += [orbiting * (1 - 1e-6), orbiting * (1 + 1e-6)]
        collision = collide(pair, path, energy, b)
        for S in (collision.block_a, collision.block_b):
            assert np.abs(np.einsum("nab,ncb->nac", S, S.conj()) - np.eye(3)).max() < 1e-9
            assert np.abs(S - S.transpose(0, 2, 1)).max() < 1e-12


def test_the_two_blocks_differ():
    """They are mirror images with the axis turning the other way: equal only where nothing turns, at b = 0."""
    collision = collide(model_k_ar(), "lower", thermal(373.0), [1e-6, 8.0])
    apart = np.abs(collision.block_a - collision.block_b).max(axis=(1, 2))
    assert apart[0] < 1e-4
    assert apart[1] > 0.1


# --- the whole path in fixed axes -----------------------------------------------------------------------------------


def slow_observables(S: np.ndarray) -> dict[str, float]:
    """The same observables from explicit tensor operators and the 6x6 matrix (m = 3/2 ... -3/2, then 1/2, -1/2)."""
    high, low, cross = S[:4, :4], S[4:, 4:], S[:4, 4:]

    def survival(block, J_in, J_out, K):
        return sum(
            np.trace(tensor_operator(J_out, K, Q).T @ block @ tensor_operator(J_in, K, Q) @ block.conj().T).real
            for Q in range(-K, K + 1)
        ) / (2 * K + 1)

    values = {}
    for level, J, block in (("P1/2", 0.5, low), ("P3/2", 1.5, high)):
        optical = 1 - np.trace(block) / len(block)
        values |= {f"{level}.width": optical.real, f"{level}.shift": optical.imag}
        values[f"{level}.outflow"] = 1 - survival(block, J, J, 0)
        values |= {f"{level}.loss{K}": 1 - survival(block, J, J, K) for K in range(1, round(2 * J) + 1)}
    values["gain1"] = survival(cross, 0.5, 1.5, 1)
    return values


WHOLE_PATHS = [
    ("model", "lower", 373.0, 9.0),  # inside the well, strong transfer
    ("model", "pi", 373.0, 5.0),  # on the wall
    ("model", "lower", 373.0, 14.0),
    ("Li-Ar", "pi", 400.0, 8.0),  # nearly sudden
    ("Na-He", "upper", 400.0, 7.0),
    ("Rb-He", "lower", 350.0, 7.0),  # nearly adiabatic: transfer of 1e-6
]


@pytest.mark.parametrize(("which", "path", "T", "b"), WHOLE_PATHS)
def test_half_path_equals_the_whole_path_in_fixed_axes(which, path, T, b):
    pair = model_k_ar() if which == "model" else default_pair(*which.split("-"))
    whole = s_matrix(slow(pair), newton_path(slow(pair), path, thermal(T), b, 150.0))
    fine = collide(pair, path, thermal(T), b, 3.0)
    low, high, cross = level_blocks(fine)
    line = np.exp(-1j * fine.line_phase[0])
    for ours, theirs in ((low, whole[4:, 4:]), (high, whole[:4, :4]), (cross, whole[:4, 4:])):
        assert np.abs(ours[0] * line - theirs).max() < 1e-5
    expected = slow_observables(whole)
    ours = {name: float(value) for name, value in zip(OBSERVABLES, observables(fine)[0], strict=True)}
    assert ours == pytest.approx(expected, rel=2e-3, abs=2e-5)
    # At the steps of ordinary use: an error of some 1e-3, half a per cent at worst.
    coarse = dict(zip(OBSERVABLES, observables(collide(pair, path, thermal(T), b))[0], strict=True))
    assert coarse == pytest.approx(expected, rel=0, abs=1e-2)


@pytest.mark.parametrize(
    ("which", "splitting", "path", "b"),
    [
        ("model", None, "lower", [4.0, 7.0, 9.0]),
        ("model", 0.0, "pi", [4.0, 7.0, 9.0]),
        ("Li-Ar", None, "pi", [5.0, 8.0]),
    ],
)
def test_step_error_falls_at_least_with_the_fourth_power(which, splitting, path, b):
    """Four times the steps: 256 times less error. (One step alone is of fourth order, tests/test_propagation.py; along
    a path the errors of successive steps cancel, and fall faster once a step turns by less than 2 pi everywhere.)
    """
    pair = model_k_ar() if which == "model" else default_pair(*which.split("-"))
    pair = pair if splitting is None else replace(pair, splitting=splitting)
    blocks = [collide(pair, path, thermal(373.0), b, factor).block_a for factor in (1.0, 4.0, 16.0)]
    standard, finer = (np.abs(block - blocks[-1]).max() for block in blocks[:2])
    assert 1e-4 < standard < 2e-2
    assert finer < standard / 256


# --- exact limits ---------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("path", ["lower", "pi", "straight"])
def test_no_anisotropy_means_no_relaxation(path):
    """V_Sigma = V_Pi: every sublevel gets the same phase; the line is broadened by that phase alone."""
    pair = model_k_ar()
    alike = replace(pair, B=pair.A, anisotropy=0.0)
    b = [3.0, 6.0, 10.0, 16.0]
    seen = observed(alike, path, thermal(373.0), b)
    phase = collide(alike, path, thermal(373.0), b).line_phase
    for name, values in seen.items():
        if name.endswith("width"):
            np.testing.assert_allclose(values, 1 - np.cos(phase), atol=1e-10)
        elif name.endswith("shift"):
            np.testing.assert_allclose(values, np.sin(phase), atol=1e-10)
        else:
            np.testing.assert_allclose(values, 0, atol=1e-10, err_msg=name)
    assert np.abs(phase).max() > 1


@pytest.mark.parametrize("which", ["model", "Rb-He", "Cs-Xe"])
@pytest.mark.parametrize("path", ["pi", "upper", "straight"])
def test_no_splitting_is_the_sudden_limit(which, path):
    """The spin is a spectator: all 11 observables of one collision follow from two numbers, whatever the path."""
    pair = model_k_ar() if which == "model" else default_pair(*which.split("-"))
    seen = observed(replace(pair, splitting=0.0), path, thermal(373.0), [2.0, 5.0, 8.0, 11.0, 15.0, 22.0])
    limit = sudden_limit(1.5 * seen["P1/2.outflow"], seen["P3/2.loss3"])
    for level, losses in limit.multipole_loss.items():
        for K, loss in losses.items():
            name = f"{level}.loss{K}" if K else f"{level}.outflow"
            np.testing.assert_allclose(seen[name], loss, rtol=0, atol=1e-10, err_msg=name)
    np.testing.assert_allclose(seen["gain1"], limit.multipole_transfer[1], rtol=0, atol=1e-10)
    # The line does not see the spin either: both components are the mean over the three orbital states.
    np.testing.assert_allclose(seen["P1/2.width"], seen["P3/2.width"], rtol=0, atol=1e-10)
    np.testing.assert_allclose(seen["P1/2.shift"], seen["P3/2.shift"], rtol=0, atol=1e-10)
    assert seen["P1/2.outflow"].max() > 0.1


@pytest.mark.parametrize("splitting", [1e-11, 1e-10, 1e-9, 1e-8, 1e-7])
def test_small_splitting_approaches_the_sudden_limit(splitting):
    """The change is bounded by the angle the splitting turns over the whole path, and stays below a per cent."""
    pair, energy = model_k_ar(), thermal(373.0)
    b = [4.0, 8.0, 12.0]
    # Fine steps: the standard ones differ a little between the two.
    limit = observables(collide(replace(pair, splitting=0.0), "pi", energy, b, 4.0))
    change = np.abs(observables(collide(replace(pair, splitting=splitting), "pi", energy, b, 4.0)) - limit).max()
    speed = np.sqrt(2 * energy / pair.reduced_mass)
    assert change < min(splitting * 2 * 150.0 / speed, 0.01)


def isolated(beta: float, x: float, b: float = 20.0):
    """P3/2 alone (splitting x v/b too large to be crossed) with pure van der Waals anisotropy of strength beta."""
    return observed(dispersion_pair(0.0, 0.0, beta * SPEED * b**5, x * SPEED / b), "straight", STRAIGHT_ENERGY, b)


# beta = D/(v b^5); x = splitting b/v, large enough for the second-order shift beta^2/x to vanish, and small enough not
# to drown the phases in rounding (a 3x3 spectrum with one far level). Loss of K = 1, 2, 3, independent integration.
VAN_DER_WAALS_P32 = [
    (0.5, 1e4, (0.017855, 0.035597, 0.017909)),
    (3.0, 1e5, (0.490962, 0.871271, 0.544479)),
    (20.0, 1e6, (0.827241, 1.377269, 0.786956)),
    (200.0, 1e6, (1.165597, 0.813234, 1.194169)),
]


@pytest.mark.parametrize(("beta", "x", "losses"), VAN_DER_WAALS_P32)
def test_van_der_waals_depolarisation_of_p32(beta, x, losses):
    seen = isolated(beta, x)
    assert [seen[f"P3/2.loss{K}"][0] for K in (1, 2, 3)] == pytest.approx(losses, rel=1e-3)
    assert seen["P1/2.loss1"][0] == pytest.approx(0, abs=1e-4)
    assert seen["P3/2.outflow"][0] == pytest.approx(0, abs=1e-6)


def test_weak_van_der_waals_depolarisation_of_p32():
    """beta -> 0: 7 pi^2/960, 7 pi^2/480, 7 pi^2/960 times beta^2 (exact, Born)."""
    beta = 0.005
    seen = isolated(beta, 1e3)
    coefficients = [seen[f"P3/2.loss{K}"][0] / beta**2 for K in (1, 2, 3)]
    assert coefficients == pytest.approx([7 * np.pi**2 / 960, 7 * np.pi**2 / 480, 7 * np.pi**2 / 960], rel=1e-3)


# Loss of orbital orientation and alignment (J = 1 without spin): zero splitting, s1 from the outflow, s2 from K = 3.
VAN_DER_WAALS_P1 = [
    (0.5, (0.06584, 0.04007)),
    (3.0, (0.957357, 0.960516)),
    (20.0, (1.070867, 1.051046)),
    (200.0, (1.279540, 0.787696)),
]


@pytest.mark.parametrize(("beta", "losses"), VAN_DER_WAALS_P1)
def test_van_der_waals_depolarisation_without_spin(beta, losses):
    b = 20.0
    seen = observed(dispersion_pair(0.0, 0.0, beta * SPEED * b**5, 0.0), "straight", STRAIGHT_ENERGY, b)
    assert (1.5 * seen["P1/2.outflow"][0], seen["P3/2.loss3"][0]) == pytest.approx(losses, rel=1e-3)


def test_weak_van_der_waals_depolarisation_without_spin():
    """beta -> 0: 7 pi^2/256 and 21 pi^2/1280 times beta^2 (exact, Born)."""
    beta, b = 0.005, 20.0
    seen = observed(dispersion_pair(0.0, 0.0, beta * SPEED * b**5, 0.0), "straight", STRAIGHT_ENERGY, b)
    found = (1.5 * seen["P1/2.outflow"][0] / beta**2, seen["P3/2.loss3"][0] / beta**2)
    assert found == pytest.approx((7 * np.pi**2 / 256, 21 * np.pi**2 / 1280), rel=1e-3)


# --- first order at b = 22 ------------------------------------------------------------------------------------------

# C6 of X, A, B = 278, 340, 560. Full-path integration by an independent program (DOP853): splitting in units of v/b,
# observable, its value.
FULL_PATH = [
    (22.6, "P3/2.loss1", 1.9875e-3),
    (22.6, "P3/2.loss2", 3.9735e-3),
    (22.6, "P3/2.loss3", 1.9881e-3),
    (22.6, "P1/2.shift", -0.12063),
    (22.6, "P1/2.width", 7.302e-3),
    (1.29, "P1/2.outflow", 4.689e-3),
    (1.29, "P3/2.loss2", 6.265e-3),
    (0.0, "P1/2.outflow", 4.978e-3),
]


def at_22(x: float, name: str, step_factor: float = 1.0) -> float:
    # 22.6 is the rounded ratio: that row was integrated with the splitting 2.6295e-4 hartree.
    splitting = 2.6295e-4 if x == 22.6 else x * SPEED / 22.0
    pair = dispersion_pair(278.0, 340.0, 560.0, splitting)
    return float(observed(pair, "straight", STRAIGHT_ENERGY, 22.0, step_factor)[name][0])


@pytest.mark.parametrize(("x", "name", "value"), FULL_PATH)
def test_distant_collisions_against_a_full_path_integration(x, name, value):
    """Printed to four digits, and x = 1.29 to three."""
    assert at_22(x, name) == pytest.approx(value, rel=3e-3 if x == 1.29 else 1e-3)


def test_orientation_of_p12_is_lost_in_second_order_only():
    """2.3e-10 by the independent integration: 1e-7 of the loss of P3/2."""
    assert abs(at_22(22.6, "P1/2.loss1", 4.0)) < 1e-8


@pytest.mark.parametrize("b", [22.0, 35.0, 50.0])
@pytest.mark.parametrize("x", [0.3, 1.29])
def test_born_probabilities_are_the_limit_of_the_paths(b, x):
    """First order against the exact collision: the difference falls like the next power of the phase, b^-5."""
    splitting = x * SPEED / b
    seen = observed(dispersion_pair(278.0, 340.0, 560.0, splitting), "straight", STRAIGHT_ENERGY, b)
    D, dC6 = 220.0, (560.0 + 680.0) / 3 - 278.0
    for level in ("P1/2", "P3/2"):
        expected = {
            "outflow": born_tails.outflow_probability(SPEED, b, D, splitting, level),
            "shift": -np.sin(born_tails.phase(SPEED, b, dC6)),
            "width": born_tails.half_width_probability(SPEED, b, dC6, D, splitting, level),
        }
        for K in (1,) if level == "P1/2" else (1, 2, 3):
            expected[f"loss{K}"] = born_tails.multipole_loss_probability(SPEED, b, D, splitting, level, K)
        for name, value in expected.items():
            # the path ends at R = 150 bohr: (b/150)^5 of the phase is not there
            tolerance = 0.03 * (22.0 / b) ** 5 + 2 * (b / 150.0) ** 5 + 1e-3
            assert seen[f"{level}.{name}"][0] == pytest.approx(float(value), rel=tolerance), (level, name)
