"""Steady state of the P levels against closed forms, limits, laws and a brute-force Liouvillian.

Closed forms: any text on level crossing (Lorentzian response of a precessing moment), textbook hyperfine sums. The
brute force (tests/vapour_cases.py) builds every coherence of both levels by kron from ladder-operator spin matrices,
with no use of the conserved Q; it shares only the collision tensors with the program.
"""

from __future__ import annotations

import numpy as np
import pytest
from scipy.linalg import expm

from pertcalc.angular import six_j, tensor_operator
from pertcalc.constants import MHZ_RAD_S
from pertcalc.errors import InputError, UnknownNameError
from pertcalc.species import ISOTOPES, alkali, isotope
from pertcalc.vapour.hanle_fields import g_factor_F
from pertcalc.vapour.level_rates import J_OF, P_LEVELS, free_rates
from pertcalc.vapour.liouville import level_population, level_structure, responses
from tests.vapour_cases import DECAY, RAD_S_G, WholeLiouvillian, hamiltonian, made_isotope, made_rates, scaled_isotope

FIELDS = np.array([-2.0, 0.0, 0.3, 1.7, 6.0, 40.0, 900.0])
GAS = dict(
    loss_1=1.1e7, ranks=(3.1e7, 4.3e7, 2.9e7), outflow=(2.2e7, 1.4e7), gain_1=(-0.9e7, -0.6e7)
)  # every process at work, P1/2 and P3/2 coupled in both ranks
HYPERFINE = dict(A={"P1/2": 11.0, "P3/2": 4.7}, B=2.3)
g_P32 = alkali("Rb").levels["P3/2"].gJ.value


def electronic(gamma: float, fields: np.ndarray, g: float = g_P32) -> np.ndarray:
    """1/(gamma + i Q omega) for Q = 0, 1, 2 [s]."""
    return 1 / (gamma + 1j * np.outer((0, 1, 2), g * RAD_S_G * fields))


@pytest.mark.parametrize("spin", [0.0, 0.5, 1.0, 1.5, 3.5])
def test_without_hyperfine_structure_every_nucleus_gives_the_electron_alone(spin):
    found = responses(made_isotope(spin), "D2", made_rates(), FIELDS)
    assert found.G == pytest.approx(DECAY["P3/2"] * electronic(DECAY["P3/2"], FIELDS), rel=1e-12)


@pytest.mark.parametrize("spin", [0.0, 1.5])
def test_collisions_of_the_electron_alone_replace_gamma(spin):
    """loss_2 in the width, the closed population equation in the norm."""
    rates = made_rates(**GAS)
    found = responses(made_isotope(spin), "D2", rates, FIELDS)
    up, down = GAS["outflow"]
    population = 1 / (DECAY["P3/2"] + down - up * down / (DECAY["P1/2"] + up))
    expected = electronic(DECAY["P3/2"] + down + GAS["ranks"][1], FIELDS) / population
    assert found.population_s == pytest.approx(population, rel=1e-14)
    assert found.G == pytest.approx(expected, rel=1e-12)


def test_rank_1_returns_through_the_other_level():
    """Without hyperfine structure: two coupled scalars for rank 1, with the signed gains."""
    rates = made_rates(**GAS)
    found = responses(made_isotope(1.0), "D2", rates, FIELDS, rank=1)
    g = {level: alkali("Rb").levels[level].gJ.value for level in P_LEVELS}
    for row, Q in enumerate(found.components):
        for n, B in enumerate(FIELDS):
            own, other = (rates.decay[x] + rates.loss[x][1] + 1j * Q * g[x] * RAD_S_G * B for x in ("P3/2", "P1/2"))
            matrix = np.array([[own, -rates.gain["P1/2"][1]], [-rates.gain["P3/2"][1], other]])
            expected = np.linalg.solve(matrix, [1.0, 0.0])[0] / found.population_s
            assert found.G[row, n] == pytest.approx(expected, rel=1e-12)


def hyperfine_sum(name: str, level: str, width: float) -> float:
    """sum (2F+1)(2F'+1)/(2I+1) {F F' 2; J J I}^2 / (1 + (omega/width)^2): zero-field response, textbook sum."""
    one = isotope(name)
    I, J, A, B = one.nuclear_spin, J_OF[level], *(one.hyperfine[level][k].value * MHZ_RAD_S for k in ("A", "B"))

    def energy(F: float) -> float:
        C = F * (F + 1) - I * (I + 1) - J * (J + 1)
        quadrupole = (0.75 * C * (C + 1) - I * (I + 1) * J * (J + 1)) / (2 * I * (2 * I - 1) * J * (2 * J - 1))
        return A * C / 2 + B * quadrupole

    Fs = np.arange(abs(I - J), I + J + 1)
    return sum(
        (2 * F + 1) * (2 * G + 1) / (2 * I + 1) * six_j(F, G, 2, J, J, I) ** 2
        / (1 + ((energy(F) - energy(G)) / width) ** 2)
        for F in Fs for G in Fs
    )  # fmt: skip


@pytest.mark.parametrize("name", ISOTOPES)
def test_zero_field_is_the_closed_hyperfine_sum(name):
    found = responses(isotope(name), "D2", free_rates(alkali(isotope(name).symbol)), [0.0])
    expected = hyperfine_sum(name, "P3/2", alkali(isotope(name).symbol).decay_rate("P3/2"))
    assert found.G[:, 0] == pytest.approx([expected] * 3, rel=1e-11)


@pytest.mark.parametrize("name", ["6Li", "39K", "133Cs"])
def test_equal_losses_of_every_rank_only_widen_the_hyperfine_sum(name):
    """A loss that no rank escapes is a shorter life: the sum with Gamma + loss."""
    rates = made_rates(ranks=(0.0, 0.0, 0.0), outflow=(0.0, 9e7))
    width = DECAY["P3/2"] + 9e7
    found = responses(isotope(name), "D2", rates, [0.0])
    assert found.G[:, 0] == pytest.approx([hyperfine_sum(name, "P3/2", width)] * 3, rel=1e-11)


def test_energies_are_eigenvalues_and_keep_the_centre():
    """Energies of the F levels against the eigenvalues of the brute-force Hamiltonian, and sum (2F+1) E_F = 0."""
    for name in ("6Li", "40K", "85Rb", "133Cs"):
        for level in P_LEVELS:
            energies = level_structure(isotope(name), level).energies()
            repeated = sorted(E for F, E in energies.items() for _ in range(round(2 * F) + 1))
            values = np.linalg.eigvalsh(hamiltonian(isotope(name), level, np.zeros(3)))
            assert repeated == pytest.approx(values, abs=1e-9 * np.abs(values).max())
            assert sum(repeated) == pytest.approx(0.0, abs=1e-9 * np.abs(values).max())


@pytest.mark.parametrize("spin, quadrupole", [(0.5, 0.0), (1.0, 2.3)])
@pytest.mark.parametrize("line", ["D1", "D2"])
def test_brute_force_steady_state(spin, quadrupole, line):
    """Whole Liouvillian of both levels, every coherence, dense solve, field along z: ranks 1 and 2 of the electron."""
    nucleus = made_isotope(spin, HYPERFINE["A"], quadrupole)
    level = {"D1": "P1/2", "D2": "P3/2"}[line]
    rates, J = made_rates(**GAS), J_OF[level]
    for rank in range(1, round(2 * J) + 1)[:2]:
        found = responses(nucleus, line, rates, FIELDS, rank=rank)
        for n, B in enumerate(FIELDS):
            whole = WholeLiouvillian(nucleus, rates, np.array([0.0, 0.0, B]))
            for Q in range(rank + 1):
                T = tensor_operator(J, rank, Q)
                solved = np.linalg.solve(whole.L, whole.source(level, T))
                expected = np.sum(T * whole.electron(solved, level)) / found.population_s
                assert found.G[Q, n] == pytest.approx(expected, rel=1e-9, abs=1e-12)


def test_brute_force_population_and_conservation_of_the_trace():
    """Population of the excited level, and every excitation leaves by the decay of one level or the other."""
    nucleus, rates = made_isotope(1.0, HYPERFINE["A"], HYPERFINE["B"]), made_rates(**GAS)
    whole = WholeLiouvillian(nucleus, rates, np.array([0.4, -1.1, 2.5]))
    for level in P_LEVELS:
        d = round(2 * J_OF[level]) + 1
        solved = np.linalg.solve(whole.L, whole.source(level, np.eye(d) / d))
        populations = {name: np.trace(whole.electron(solved, name)).real for name in P_LEVELS}
        assert populations[level] == pytest.approx(level_population(rates, level), rel=1e-12)
        assert sum(rates.decay[name] * populations[name] for name in P_LEVELS) == pytest.approx(1.0, rel=1e-12)


def test_brute_force_in_time():
    """rho = Int exp(-L t) source dt by matrix exponentials, without any solve."""
    nucleus, rates = made_isotope(0.5, HYPERFINE["A"]), made_rates(**GAS)
    whole = WholeLiouvillian(nucleus, rates, np.array([0.0, 0.0, 3.0]))
    T = tensor_operator(1.5, 2, 2)
    source = whole.source("P3/2", T)
    size, step = len(source), 4e-9
    augmented = np.zeros((size + 1, size + 1), complex)
    augmented[:size, :size], augmented[:size, size] = -whole.L, source
    flow = expm(augmented * step)
    for _ in range(8):  # 256 steps, 1 microsecond: exp(-38)
        flow = flow @ flow
    found = responses(nucleus, "D2", rates, [3.0])
    expected = np.sum(T * whole.electron(flow[:size, size], "P3/2")) / found.population_s
    assert found.G[2, 0] == pytest.approx(expected, rel=1e-9)


def test_a_field_reversed_conjugates_the_response():
    one = made_isotope(1.5, HYPERFINE["A"], HYPERFINE["B"])
    plus = responses(one, "D2", made_rates(**GAS), [0.5, 5.0, 50.0]).G
    minus = responses(one, "D2", made_rates(**GAS), [-0.5, -5.0, -50.0]).G
    assert minus == pytest.approx(plus.conj(), rel=1e-11)


@pytest.mark.parametrize("name", ISOTOPES)
def test_a_strong_field_decouples_the_nucleus(name):
    """m_J is conserved: Q = 0 is electronic again, Q = 1, 2 precess away. What is missing falls as 1/B^2."""
    one = isotope(name)
    free = free_rates(alkali(one.symbol))
    weak, strong, stronger = responses(one, "D2", free, [0.0, 1e5, 1e6]).G[0].real
    assert weak < 0.9
    assert 1 - strong < 1e-5
    assert (1 - strong) / (1 - stronger) == pytest.approx(100, rel=0.02)
    assert np.abs(responses(one, "D2", free, [1e5]).G[1:]).max() < 1e-3


def test_a_strong_field_with_gas_is_the_electron_with_its_losses():
    one, rates = isotope("87Rb"), made_rates(**GAS)
    found = responses(one, "D2", rates, [3e6])
    expected = 1 / (rates.decay["P3/2"] + rates.loss["P3/2"][2]) / found.population_s
    assert found.G[0, 0] == pytest.approx(expected, rel=1e-5)


def test_unresolved_hyperfine_structure_meets_the_electron_with_its_losses():
    """Splitting << Gamma + losses: 1/(Gamma + loss_2 + i Q omega), the rest falling with the splitting squared."""
    rates = made_rates(**GAS)
    bare = responses(made_isotope(1.5), "D2", rates, FIELDS).G
    tenth, hundredth = (
        np.abs(responses(made_isotope(1.5, {"P3/2": A, "P1/2": A}, A), "D2", rates, FIELDS).G - bare).max()
        for A in (0.1, 0.01)
    )
    assert tenth < 5e-3
    assert hundredth == pytest.approx(tenth / 100, rel=0.05)


def test_fast_depolarisation_beats_hyperfine_structure():
    """loss_2 >> splittings and decay: the electron relaxes before the nucleus knows, G -> Gamma/(Gamma + loss_2)."""
    one = isotope("39K")
    for loss in (1e10, 1e12):
        found = responses(one, "D2", made_rates(ranks=(loss, loss, loss)), [0.0])
        expected = DECAY["P3/2"] / (DECAY["P3/2"] + loss)
        assert found.G[0, 0].real == pytest.approx(expected, rel=40 * (3e8 / loss) ** 2 + 1e-9)


def test_fast_outflow_shares_the_population_and_kills_the_alignment():
    """o, o' -> infinity at fixed ratio r = o/o': populations in equilibrium, n = 1/(Gamma + Gamma' o/o')."""
    one = isotope("85Rb")
    for down, bound in ((1e10, 2e-2), (1e12, 2e-4)):
        found = responses(one, "D2", made_rates(outflow=(2 * down, down)), [0.0])
        n = 1 / (DECAY["P3/2"] + DECAY["P1/2"] / 2)
        assert found.population_s == pytest.approx(n, rel=10 * DECAY["P3/2"] / down)
        assert 0 < found.G[0, 0].real < bound


def test_weak_field_of_resolved_structure_turns_each_F_with_its_own_g():
    """Splittings >> Gamma >> Zeeman: G_Q = sum_F w_F / (1 + i Q g_F mu_B B/(hbar Gamma)), w_F of F = F'."""
    one = scaled_isotope(isotope("85Rb"), 1e4)
    B = np.array([0.5, 2.0, 10.0, 60.0])
    found = responses(one, "D2", made_rates(), B)
    I, J = 2.5, 1.5
    weights = {F: (2 * F + 1) ** 2 / (2 * I + 1) * six_j(F, F, 2, J, J, I) ** 2 for F in (1.0, 2.0, 3.0, 4.0)}
    for Q in (0, 1, 2):
        expected = sum(
            w / (1 + 1j * Q * g_factor_F(g_P32, J, I, F) * RAD_S_G * B / DECAY["P3/2"]) for F, w in weights.items()
        )
        assert found.G[Q] == pytest.approx(expected, rel=2e-4, abs=2e-5)


def test_rank_2_has_no_place_in_a_level_with_J_one_half():
    """Common practice, no source: D1 from an unpolarised ground level carries no alignment. Nothing is solved for."""
    found = responses(isotope("87Rb"), "D1", made_rates(**GAS), FIELDS)
    assert not found.G.any()
    assert found.work["solves"] == 0
    assert responses(isotope("87Rb"), "D1", made_rates(**GAS), FIELDS, rank=1).G.any()  # orientation exists


def test_work_is_one_small_solve_for_each_field_and_component():
    """60 fields of the heaviest natural mixture: bounded by its count of systems and the size of the largest."""
    fields = np.geomspace(0.01, 1e3, 60)
    work = [responses(one, "D2", made_rates(**GAS), fields).work for one in alkali("K").isotopes]
    assert sum(one["solves"] for one in work) == 3 * 60 * 3
    assert max(one["largest"] for one in work) <= 160
    cs = responses(isotope("133Cs"), "D2", made_rates(), [0.0], components=[0])
    assert cs.work == {"solves": 1, "largest": 108}


def test_batches_do_not_change_the_answer():
    one, fields = made_isotope(1.0, HYPERFINE["A"]), np.linspace(-5, 5, 131)
    together = responses(one, "D2", made_rates(**GAS), fields).G
    apart = np.concatenate([responses(one, "D2", made_rates(**GAS), [B]).G for B in fields], axis=1)
    assert together == pytest.approx(apart, rel=1e-13)


def test_bad_input_is_refused_with_every_fault():
    with pytest.raises(UnknownNameError, match="line 'D3'"):
        responses(isotope("87Rb"), "D3", made_rates(), [0.0])
    rates = made_rates(decay={"P1/2": 0.0, "P3/2": float("nan")})
    with pytest.raises(InputError) as caught:
        responses(isotope("87Rb"), "D2", rates, [0.0, np.inf], rank=3)
    text = str(caught.value)
    assert len(caught.value.problems) == 4
    for words in ("fields", "rank = 3", "decay of P1/2 = 0 s^-1", "decay of P3/2 = nan"):
        assert words in text
    with pytest.raises(InputError, match="loss of rank 2 of P3/2"):
        responses(isotope("87Rb"), "D2", made_rates(ranks=(0.0, -1e6, 0.0)), [0.0])
