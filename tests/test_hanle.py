"""Hanle curves, Hanle fields and the limits of the treatment.

Sources: the damped-dipole formulas of the Hanle effect (any text on resonance fluorescence); a brute-force scattering
calculation in fixed laboratory axes from dipole matrix elements and the whole Liouvillian (tests/vapour_cases.py);
limits and symmetries otherwise.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from pertcalc.angular import six_j
from pertcalc.constants import HBAR_J_S
from pertcalc.errors import InputError, UnknownNameError
from pertcalc.species import alkali, isotope
from pertcalc.vapour.hanle import (
    BEAMS,
    GEOMETRIES,
    emission_tensor,
    excitation_tensor,
    field_grid,
    ground_hanle,
    hanle_curves,
    stokes,
)
from pertcalc.vapour.hanle_fields import (
    CLEAR,
    SMALL,
    field_limits,
    g_factor_F,
    ground_hanle_field,
    hanle_fields,
    loss_of_F,
    regime,
)
from pertcalc.vapour.level_rates import free_rates
from pertcalc.vapour.liouville import level_structure
from pertcalc.vapour.scattering import degree_linear, degree_unpolarised
from tests.vapour_cases import (
    DECAY,
    RAD_S_G,
    WholeLiouvillian,
    dipole_operator,
    invented,
    made_isotope,
    made_rates,
    scaled_isotope,
    spin_matrices,
)

GAS = made_rates(1.1e7, (3.1e7, 4.3e7, 2.9e7), (2.2e7, 1.4e7), (-0.9e7, -0.6e7))
HYPERFINE = ({"P1/2": 11.0, "P3/2": 4.7}, 2.3)
DIRECTIONS = {"beam": np.array([1.0, 0, 0]), "sight": np.array([0, 0, 1.0]), "normal": np.array([0, 1.0, 0])}
BEAM_VECTORS = {"unpolarised": [(0.5, [0, 1, 0]), (0.5, [0, 0, 1])], "linear": [(1.0, [0, 1, 0])]}


def rb_with(*isotopes):
    return replace(alkali("Rb"), isotopes=isotopes)


# --- the classical damped dipole ---------------------------------------------------------------------------------


@pytest.mark.parametrize("beam", BEAMS)
@pytest.mark.parametrize("W2", [1.0, 0.5, 0.11])
def test_damped_dipole_field_along_the_line_of_sight(beam, W2):
    """q = P0/(1 + x^2), P = P0/sqrt(1 + x^2), tan 2 angle = x = 2 omega/Gamma; counter-clockwise for B > 0."""
    x = np.array([-3.0, -0.2, 0.0, 0.5, 1.0, 8.0])
    G = 1 / (1 + 1j * np.outer((0, 0.5, 1.0), x))
    found = stokes(emission_tensor(excitation_tensor(beam), "sight", W2, G))
    P0 = degree_unpolarised(W2) if beam == "unpolarised" else degree_linear(W2)
    assert found.stokes_q == pytest.approx(P0 / (1 + x**2), rel=1e-12)
    assert found.degree == pytest.approx(P0 / np.sqrt(1 + x**2), rel=1e-12)
    assert np.tan(2 * np.radians(found.angle_deg)) == pytest.approx(x, rel=1e-12)


def test_damped_dipole_by_averaging_turned_dipoles():
    """A dipole along y that turns at omega about each axis and dies at Gamma: rho = <d d>, by quadrature in time."""
    omega = 0.7  # of Gamma
    t = np.linspace(0, 45, 200_001)
    weight = np.exp(-t) * (t[1] - t[0])
    weight[[0, -1]] /= 2
    c, s, o = np.cos(omega * t), np.sin(omega * t), np.zeros_like(t)
    turned = {"sight": (-s, c, o), "beam": (o, c, s), "normal": (o, o + 1, o)}  # R(axis, omega t) y
    G = (1 / (1 + 1j * np.array([0, 1, 2]) * omega))[:, None]
    for direction, d in turned.items():
        rho = np.einsum("it,jt,t->ij", d, d, weight)
        found = emission_tensor(excitation_tensor("linear"), direction, 1.0, G)[0]
        assert found == pytest.approx(rho, abs=1e-7)


def test_half_width_of_the_signal_is_half_the_hanle_field():
    """Without nuclear spin and with gas: the linear-polarisation signal q falls to half at B_H/2 with loss_2 in B_H."""
    element = rb_with(made_isotope(0.0))
    rank_2 = hanle_fields(element, "P3/2", GAS)[1]
    assert (rank_2.rank, rank_2.F) == (2, None)
    found = hanle_curves(element, "D2", GAS, [0.0, rank_2.half_width_G(2)], "linear")
    q = found.curves["sight"].stokes_q
    assert q[1] == pytest.approx(q[0] / 2, rel=1e-12)
    assert rank_2.half_width_G(2) == pytest.approx(rank_2.field_G / 2)
    assert rank_2.half_width_G(1) == rank_2.field_G


# --- brute force: fixed axes, dipole matrix elements, whole Liouvillian ------------------------------------------


@pytest.mark.parametrize("direction", GEOMETRIES)
@pytest.mark.parametrize("beam", BEAMS)
def test_curves_against_brute_force_scattering(direction, beam):
    """I(e') = Tr[D(e') rho], rho from D(e) and the whole Liouvillian with the field along the true axis; I = 1/2."""
    element, fields = rb_with(made_isotope(0.5, HYPERFINE[0])), np.array([-4.0, 0.0, 0.8, 5.0, 31.0])
    found = hanle_curves(element, "D2", GAS, fields, beam).curves[direction]
    seen = {"y": [0, 1, 0], "x": [1, 0, 0], "+45": [-1, 1, 0], "-45": [1, 1, 0]}
    excitation = sum(w * dipole_operator(1.5, np.array(e, float)) for w, e in BEAM_VECTORS[beam])
    for n, B in enumerate(fields):
        whole = WholeLiouvillian(element.isotopes[0], GAS, B * DIRECTIONS[direction])
        rho = whole.electron(np.linalg.solve(whole.L, whole.source("P3/2", excitation)), "P3/2")
        intensity = {
            name: np.trace(dipole_operator(1.5, np.array(e) / np.linalg.norm(e)) @ rho).real for name, e in seen.items()
        }
        total = intensity["y"] + intensity["x"]
        assert found.stokes_q[n] == pytest.approx((intensity["y"] - intensity["x"]) / total, abs=1e-11)
        assert found.stokes_u[n] == pytest.approx((intensity["+45"] - intensity["-45"]) / total, abs=1e-11)


@pytest.mark.parametrize("direction", GEOMETRIES)
def test_emission_tensor_against_brute_force_for_a_tilted_excitation(direction):
    """Light along no axis, seen from several sides: every component Q and the sense of every turn take part."""
    nucleus, B = made_isotope(0.5, HYPERFINE[0]), 2.7
    e = np.array([0.3, 0.8, -0.52]) / np.linalg.norm([0.3, 0.8, -0.52])
    G = hanle_curves(rb_with(nucleus), "D2", GAS, [B]).G
    tensor = emission_tensor(np.outer(e, e), direction, 0.5, G)[0]
    whole = WholeLiouvillian(nucleus, GAS, B * DIRECTIONS[direction])
    rho = whole.electron(np.linalg.solve(whole.L, whole.source("P3/2", dipole_operator(1.5, e))), "P3/2")
    total = sum(np.trace(dipole_operator(1.5, axis) @ rho).real for axis in np.eye(3))
    for seen in ([1, 0, 0], [0, 1, 0], [0, 0, 1], [0.6, 0.8, 0], [0.6, 0, 0.8], [0, 0.6, -0.8]):
        intensity = np.trace(dipole_operator(1.5, np.array(seen)) @ rho).real / total
        assert seen @ tensor @ seen == pytest.approx(intensity, abs=1e-11)


# --- symmetries of the curves ------------------------------------------------------------------------------------


@pytest.mark.parametrize("symbol", ["Na", "Rb"])
@pytest.mark.parametrize("beam", BEAMS)
def test_reversing_the_field_mirrors_the_plane(symbol, beam):
    B = np.array([0.2, 3.0, 40.0])
    plus = hanle_curves(alkali(symbol), "D2", GAS, B, beam)
    minus = hanle_curves(alkali(symbol), "D2", GAS, -B, beam)
    for name in GEOMETRIES:
        assert minus.curves[name].degree == pytest.approx(plus.curves[name].degree, rel=1e-10)
        assert minus.curves[name].stokes_u == pytest.approx(-plus.curves[name].stokes_u, abs=1e-12)


@pytest.mark.parametrize("beam", BEAMS)
def test_where_the_plane_must_stay(beam):
    """Fields along the beam and normal to both leave the scattering plane a mirror up to time reversal: u = 0."""
    found = hanle_curves(alkali("Cs"), "D2", GAS, np.geomspace(0.01, 500, 9), beam)
    for name in ("beam", "normal"):
        assert found.curves[name].stokes_u == pytest.approx(np.zeros(9), abs=1e-13)
        assert set(found.curves[name].angle_deg.tolist()) <= {0.0, 90.0}


def test_a_field_along_the_axis_of_the_excitation_only_decouples():
    """Q = 0 alone takes part: unpolarised light with B along the beam, linear light with B along its vector."""
    fields = np.array([0.0, 4.0, 60.0, 1e5])
    for beam, direction, degree in (("unpolarised", "beam", degree_unpolarised), ("linear", "normal", degree_linear)):
        found = hanle_curves(alkali("Rb"), "D2", free_rates(alkali("Rb")), fields, beam)
        G0 = found.G[0].real
        assert found.curves[direction].degree == pytest.approx(degree(found.electronic * G0), rel=1e-12)
        assert found.curves[direction].degree[-1] == pytest.approx(degree(0.5), rel=1e-4)


def test_the_trace_of_the_emission_is_kept_in_every_field():
    G = np.array([[0.7, 0.2], [0.3 - 0.4j, 0.1j], [0.2 - 0.1j, -0.3]])
    for direction in GEOMETRIES:
        rho = emission_tensor(excitation_tensor("linear"), direction, 0.5, G)
        assert np.trace(rho, axis1=1, axis2=2) == pytest.approx([1.0, 1.0], rel=1e-14)
        assert rho == pytest.approx(rho.transpose(0, 2, 1), abs=1e-15)


def test_zero_field_is_the_polarisability_in_every_geometry():
    for beam, degree in (("unpolarised", degree_unpolarised), ("linear", degree_linear)):
        found = hanle_curves(alkali("Li"), "D2", GAS, [0.0], beam)
        for curve in found.curves.values():
            assert curve.degree[0] == pytest.approx(degree(found.electronic * found.G[0, 0].real), rel=1e-12)
            assert curve.angle_deg[0] == pytest.approx(0.0, abs=1e-10)


def test_mixture_adds_intensities():
    """q of the mixture is the mean of q I over the mean of I of the isotopes, by their weights."""
    fields = np.array([0.5, 6.0, 30.0])
    both = hanle_curves(alkali("Rb"), "D2", GAS, fields)
    alone = [hanle_curves(alkali("Rb"), "D2", GAS, fields, isotope=label) for label in both.weights]
    for name, curve in both.curves.items():
        light = [w * one.curves[name].intensity for w, one in zip(both.weights.values(), alone, strict=True)]
        q = sum(i * one.curves[name].stokes_q for i, one in zip(light, alone, strict=True)) / sum(light)
        assert curve.stokes_q == pytest.approx(q, rel=1e-12)


def test_three_geometries_cost_one_set_of_solves():
    found = hanle_curves(alkali("Rb"), "D2", GAS, np.geomspace(0.1, 100, 20))
    assert found.work["solves"] == 2 * 3 * 20  # isotopes x components x fields


# --- Hanle fields ------------------------------------------------------------------------------------------------


def test_hanle_field_turns_one_radian_in_a_lifetime():
    for one in hanle_fields(alkali("K"), "P3/2", GAS):
        assert abs(one.g) * RAD_S_G * one.field_G == pytest.approx(one.decay + one.loss, rel=1e-12)
        assert one.free_G < one.field_G
        assert one.relative_error(0.1) == pytest.approx(0.1 * (1 - one.free_G / one.field_G), rel=1e-12)


def test_hanle_fields_name_their_g_factor_and_their_F():
    found = hanle_fields(alkali("Rb"), "P3/2", free_rates(alkali("Rb")), "87Rb")
    assert [(one.rank, one.F) for one in found[:3]] == [(1, None), (2, None), (3, None)]
    assert {one.F for one in found[3:]} == {1.0, 2.0, 3.0}  # F = 0 does not precess
    assert all("g_J" in one.basis for one in found[:3])
    assert all("g_F" in one.basis for one in found[3:])
    assert {one.isotope for one in found[3:]} == {"87Rb"}


@pytest.mark.parametrize("J, I", [(0.5, 1.5), (1.5, 1.0), (1.5, 3.5)])
def test_g_factor_of_F_is_the_projection_of_J(J, I):
    """P_F J_z P_F = (g_F/g_J) P_F F_z P_F with the projectors P_F from a diagonalised I.J."""
    electron = [np.kron(one, np.eye(round(2 * I) + 1)) for one in spin_matrices(J)]
    nucleus = [np.kron(np.eye(round(2 * J) + 1), one) for one in spin_matrices(I)]
    values, vectors = np.linalg.eigh(sum(a @ b for a, b in zip(electron, nucleus, strict=True)))
    for F in np.arange(abs(I - J), I + J + 1):
        own = np.isclose(values, (F * (F + 1) - I * (I + 1) - J * (J + 1)) / 2)
        P = vectors[:, own] @ vectors[:, own].conj().T
        g = g_factor_F(1.3, J, I, F)
        assert 1.3 * P @ electron[2] @ P == pytest.approx(g * P @ (electron[2] + nucleus[2]) @ P, abs=1e-12)
    assert g_factor_F(1.3, J, J, 0.0) is None


@pytest.mark.parametrize("F, rank", [(0.0, 0), (1.0, 1), (2.0, 2), (3.0, 1)])
def test_loss_of_F_is_a_mean_of_the_electronic_losses(F, rank):
    """Equal losses of every rank: that loss, by orthogonality of the 9j symbols. J = I = 3/2."""
    assert loss_of_F(1.5, 1.5, F, rank, dict.fromkeys(range(4), 7.0)) == pytest.approx(7.0, rel=1e-12)


def test_loss_of_F_against_the_recoupling_matrix():
    """Diagonal of the recoupling matrix, J = I = 3/2, gamma = 0, 1, 1, 1 (independent computation, direct m sums)."""
    gamma = {0: 0.0, 1: 1.0, 2: 1.0, 3: 1.0}
    populations = [loss_of_F(1.5, 1.5, F, 0, gamma) for F in (0.0, 1.0, 2.0, 3.0)]
    assert populations == pytest.approx([15 / 16, 13 / 16, 11 / 16, 9 / 16], rel=1e-12)
    orientation = [loss_of_F(1.5, 1.5, F, 1, gamma) for F in (1.0, 2.0, 3.0)]
    assert orientation == pytest.approx([0.975, 0.875, 0.65], rel=1e-12)


def test_half_widths_exist_for_precessing_components_only():
    field = hanle_fields(alkali("K"), "P1/2", GAS)[0]
    for Q in (0, 2):
        with pytest.raises(InputError, match="do not precess"):
            field.half_width_G(Q)


# --- which field to use ------------------------------------------------------------------------------------------


def test_regime_names_the_field_to_use():
    cs = isotope("133Cs")
    free = alkali("Cs").decay_rate("P3/2")
    assert (regime(cs, "P3/2", free, 0.5).structure, regime(cs, "P3/2", free, 0.5).g_factor) == ("resolved", "g_F")
    assert (regime(cs, "P3/2", free, 1e4).nucleus, regime(cs, "P3/2", free, 1e4).g_factor) == ("decoupled", "g_J")
    assert regime(cs, "P3/2", 1e11, 0.5).g_factor == "g_J"  # splittings washed out by collisions
    assert regime(cs, "P3/2", 1e9, 0.5).g_factor is None  # partly
    assert regime(cs, "P3/2", free, 200.0).g_factor is None  # half decoupled
    assert regime(made_isotope(0.0), "P3/2", free, 0.0).g_factor == "g_J"  # no nuclear spin


@pytest.mark.parametrize("edge", [0.999, 1.001])
def test_regime_changes_at_its_factor(edge):
    one = isotope("87Rb")
    energies = sorted(level_structure(one, "P3/2").energies().values())
    smallest, largest = min(np.diff(energies)), energies[-1] - energies[0]
    assert (regime(one, "P3/2", edge * smallest / CLEAR, 0.0).structure == "resolved") == (edge < 1)
    assert (regime(one, "P3/2", edge * largest * CLEAR, 0.0).structure == "unresolved") == (edge > 1)
    gauss = level_structure(one, "P3/2").g * RAD_S_G
    assert (regime(one, "P3/2", 1.0, edge * smallest / CLEAR / gauss).nucleus == "coupled") == (edge < 1)
    assert (regime(one, "P3/2", 1.0, edge * largest * CLEAR / gauss).nucleus == "decoupled") == (edge > 1)


@pytest.mark.parametrize("name, factor, edge", [("133Cs", 1e3, "g_F"), ("133Cs", 1e-4, "g_J")])
def test_the_named_field_is_the_width_of_the_curve(name, factor, edge):
    """Initial slope of the plane, d angle/dB = 1/B_eff with W_F-weighted 1/B_F (resolved) or 1/B_H (unresolved)."""
    one = scaled_isotope(isotope(name), factor)
    element = replace(alkali("Cs"), isotopes=(one,))
    rates, B = made_rates(), 1e-3
    assert regime(one, "P3/2", DECAY["P3/2"], B).g_factor == edge
    found = hanle_curves(element, "D2", rates, [B], "linear").curves["sight"]
    fields = [f for f in hanle_fields(element, "P3/2", rates) if f.rank == 2]
    if edge == "g_J":
        slope = 1 / next(f.field_G for f in fields if f.F is None)
    else:
        inverse = {f.F: np.sign(f.g) / f.field_G for f in fields if f.F is not None}
        assert 3.0 not in inverse  # g_F = 0 for F = 3: it stands still, with its weight
        weights = [(2 * F + 1) ** 2 * six_j(F, F, 2, 1.5, 1.5, 3.5) ** 2 for F in (2.0, 3.0, 4.0, 5.0)]
        slope = np.average([inverse.get(F, 0.0) for F in (2.0, 3.0, 4.0, 5.0)], weights=weights)
    assert np.radians(found.angle_deg[0]) / B == pytest.approx(slope, rel=2e-3)


# --- ground level ------------------------------------------------------------------------------------------------


def test_ground_level_is_a_lorentzian_of_its_hanle_field():
    """Half of the orientation is left at B_H = hbar gamma/(g_F mu_B); a vector turning at omega and dying at gamma."""
    one, damping = isotope("87Rb"), invented(250.0, "s^-1")
    field = ground_hanle_field(one, damping.value)
    found = ground_hanle(one, damping, [0.0, field.field_G, 10 * field.field_G], "walls")
    assert found.remaining == pytest.approx([1.0, 0.5, 1 / 101], rel=1e-12)
    gJ = alkali("Rb").levels["S1/2"].gJ.value
    assert field.field_G == pytest.approx(250.0 * 4 / (gJ * RAD_S_G), rel=1e-12)
    assert hanle_fields(alkali("Rb"), "P3/2", free_rates(alkali("Rb")))[0].field_G > 1e3 * field.field_G


def test_ground_level_refuses_bad_damping():
    one = isotope("87Rb")
    with pytest.raises(InputError, match="damping = 0 s"):
        ground_hanle_field(one, 0.0)
    with pytest.raises(InputError, match="must be in 's\\^-1'"):
        ground_hanle(one, invented(1.0, "cm^3/s"), [0.1])
    with pytest.raises(InputError, match="finite"):
        ground_hanle(one, invented(1.0, "s^-1"), [np.nan])


# --- limits of the treatment -------------------------------------------------------------------------------------


def test_field_limits_warn_with_their_numbers():
    quiet = field_limits(alkali("Cs"), 100.0, free_rates(alkali("Cs")), 1e-12)
    assert quiet.warnings == ()
    li = alkali("Li")
    loud = field_limits(li, 5e3, made_rates(ranks=(0.0, 3e10, 0.0)), 1e-11)
    assert len(loud.warnings) == 3
    for words, text in zip(("0.335 cm^-1", "GHz", "rad within a collision"), loud.warnings, strict=True):
        assert words in text
    # mu_B B / (h c splitting) from joules, written out.
    joules = li.fine_structure_cm1.value * 100 * 2.99792458e8 * 2 * np.pi * HBAR_J_S
    assert loud.zeeman == pytest.approx(5e3 * RAD_S_G * HBAR_J_S / joules, rel=1e-9)
    assert loud.turn == pytest.approx(5e3 * RAD_S_G * 1e-11, rel=1e-12)
    assert (loud.zeeman > SMALL) and (loud.damping > SMALL)
    assert field_limits(li, 5e3, free_rates(li)).turn is None


def test_curves_carry_the_warnings_of_their_largest_field():
    li = alkali("Li")
    assert hanle_curves(li, "D2", free_rates(li), [1.0, 10.0]).warnings == ()
    assert "fine structure" in hanle_curves(li, "D2", free_rates(li), [1.0, -4e3]).warnings[0]


# --- bad input ---------------------------------------------------------------------------------------------------


def test_bad_input_is_refused():
    rb = alkali("Rb")
    with pytest.raises(UnknownNameError, match="beam 'circular'"):
        hanle_curves(rb, "D2", GAS, [1.0], "circular")
    with pytest.raises(InputError, match="list is empty"):
        hanle_curves(rb, "D2", GAS, [])
    with pytest.raises(UnknownNameError, match="isotope of Rb"):
        hanle_curves(rb, "D2", GAS, [1.0], isotope="7Li")
    with pytest.raises(UnknownNameError, match="isotope of Rb"):
        hanle_fields(rb, "P3/2", GAS, "7Li")
    with pytest.raises(UnknownNameError, match="level 'S1/2'"):
        hanle_fields(rb, "S1/2", GAS)
    with pytest.raises(UnknownNameError, match="direction of the field"):
        emission_tensor(excitation_tensor("linear"), "up", 0.5, np.ones((3, 1)))
    with pytest.raises(InputError) as caught:
        regime(isotope("87Rb"), "P3/2", -1.0, np.inf)
    assert len(caught.value.problems) == 2
    with pytest.raises(InputError, match="Hanle fields"):
        field_grid(0.0)


def test_field_grid_covers_both_scales():
    grid = field_grid(3.0, 1e-4, points=60)
    assert np.all(np.diff(grid) > 0)
    assert (grid[0], grid[-1]) == (pytest.approx(1e-4 / 30), pytest.approx(300.0))
    assert len(grid) == 60 + 11
    assert len(field_grid(3.0)) == 240
