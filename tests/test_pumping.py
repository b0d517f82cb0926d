"""Pumping by one beam against sublevel rate equations, two-level formulas and photon counting; errors; bad input."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from scipy import constants as codata
from scipy.integrate import solve_ivp

from pertcalc.angular import clebsch_gordan, projections
from pertcalc.errors import InputError, UnknownNameError
from pertcalc.species import UPPER_LEVEL, alkali
from pertcalc.vapour.absorption import GHZ_RAD_S, absorption_line
from pertcalc.vapour.level_rates import J_OF, OTHER_LEVEL, LevelRates, free_rates
from pertcalc.vapour.pumping import Beam, pumping, spin_coefficients, surviving_orientation

RB = alkali("Rb")
WIDE = absorption_line(RB, "D1", 350.0, 50 * GHZ_RAD_S, -10 * GHZ_RAD_S, None, 5 * GHZ_RAD_S, 2 * GHZ_RAD_S)
NARROW = absorption_line(RB, "D1", 350.0)
BEAM = Beam(power_W=1e-3, diameter_cm=1.0)


def sublevel_rates(line: str, s: float, mixing: float):
    """Rate matrices of the sublevels without nuclear spin: excitation, and what the P level does, in units of Gamma.

    Excitation of m by the photon component q goes as |<1/2 m 1 q|J' m+q>|^2, its mean over m set to 1; emission follows
    the same squares; ``mixing`` equalises the sublevels of the P level.
    """
    J = J_OF[UPPER_LEVEL[line]]
    lower, upper = projections(0.5), projections(J)
    square = {
        q: np.array([[clebsch_gordan(0.5, m, 1, q, J, u) ** 2 for m in lower] for u in upper]) for q in (-1, 0, 1)
    }
    up = (1 + s) / 2 * square[1] + (1 - s) / 2 * square[-1]
    up /= up.sum() / 2
    down = sum(square.values()).T  # columns add to 1: every excited atom returns
    size = len(upper)
    hold = (np.eye(size) + mixing * np.ones((size, size)) / size) / (1 + mixing)  # steady state, population kept
    return up, down @ hold


@pytest.mark.parametrize("line", ["D1", "D2"])
@pytest.mark.parametrize("s", [1.0, -1.0, 0.4])
@pytest.mark.parametrize("mixing", [0.0, 0.7, 1e6])
def test_the_spin_equation_is_that_of_the_sublevels(line, s, mixing):
    up, back = sublevel_rates(line, s, mixing)
    gain, damping = spin_coefficients(line, surviving=1 / (1 + mixing))
    for S in (-0.5, 0.0, 0.2, 0.5):
        N = np.array([0.5 + S, 0.5 - S])
        flow = back @ (up @ N) - up.sum(axis=0) * N
        assert flow.sum() == pytest.approx(0.0, abs=1e-12)
        assert 0.5 * (flow[0] - flow[1]) == pytest.approx(gain * s / 2 - damping * S, abs=2e-6)


@pytest.mark.parametrize(("mixing", "photons"), [(1e6, 1.0), (0.0, 1.5)])
def test_photons_per_polarised_atom_by_counting(mixing, photons):
    # Four levels of D1: with fast mixing each excitation of the bright sublevel has an even chance (2 photons for half
    # of the atoms), without it 1/3 (3 photons for half of them).
    up, back = sublevel_rates("D1", 1.0, mixing)

    def flow(_, y):
        absorbed = up @ y[:2]
        return np.append(back @ absorbed - up.sum(axis=0) * y[:2], absorbed.sum())

    counted = solve_ivp(flow, (0, 60), [0.5, 0.5, 0.0], rtol=1e-9, atol=1e-12).y[:, -1]
    assert counted[0] == pytest.approx(1.0, abs=1e-6) and counted[2] == pytest.approx(photons, rel=1e-5)
    rates = mixed_rates(mixing)
    ours = pumping(WIDE, BEAM, rates, loss_error=0.2).spin
    assert ours.photons_per_atom.value == pytest.approx(photons, rel=1e-5)
    assert ours.limit == pytest.approx(0.5)


def mixed_rates(mixing: float) -> LevelRates:
    """Free rates with a loss of orientation of ``mixing`` times the decay and no transfer."""
    free = free_rates(RB)
    loss = {level: {K: mixing * free.decay[level] if K else 0.0 for K in ranks} for level, ranks in free.loss.items()}
    return LevelRates(free.decay, loss, free.gain)


def test_the_kind_of_pumping_follows_the_mixing():
    kinds = [pumping(WIDE, BEAM, mixed_rates(m)).spin.kind for m in (0.0, 1.0, 1e3)]
    assert kinds == ["repopulation", "mixed", "depopulation"]


def test_the_nuclear_spin_multiplies_photons_and_time():
    plain, slowed = (pumping(WIDE, BEAM, mixed_rates(5.0), slowing_down=q).spin for q in (1.0, 6.0))
    assert slowed.photons_per_atom.value == pytest.approx(6 * plain.photons_per_atom.value)
    assert slowed.time_s == pytest.approx(6 * plain.time_s) and slowed.gain == plain.gain


def test_photon_error_follows_that_of_the_mixing():
    def photons(mixing):
        return pumping(WIDE, BEAM, mixed_rates(mixing)).spin.photons_per_atom.value

    found = pumping(WIDE, BEAM, mixed_rates(2.0), loss_error=0.01).spin.photons_per_atom
    assert found.error == pytest.approx(abs(photons(2.02) - photons(1.98)) / 2, rel=1e-3)
    assert pumping(WIDE, BEAM, mixed_rates(2.0)).spin.photons_per_atom.error is None


@pytest.mark.parametrize(("line", "spin"), [("D2", 1.0), ("D1", 0.5), ("D1", 0.0)])
def test_absorption_that_never_stops_has_no_photon_number(line, spin):
    made = absorption_line(RB, line, 350.0, 50 * GHZ_RAD_S)
    found = pumping(made, Beam(1e-3, 1.0, photon_spin=spin)).spin
    assert found.photons_per_atom is None and found.reason


@pytest.mark.parametrize("line", ["D1", "D2"])
def test_orientation_through_both_levels_is_the_steady_state_of_both(line):
    # Invented rates; <J_z> of both levels integrated in time and the orientation of the emitted atoms added up.
    decay = {"P1/2": 1.0, "P3/2": 1.2}
    loss = {"P1/2": {0: 0.5, 1: 0.9}, "P3/2": {0: 0.3, 1: 0.8, 2: 1.0, 3: 1.0}}
    gain = {"P1/2": {0: 0.35, 1: -0.2}, "P3/2": {0: 0.42, 1: 0.25}}
    rates = LevelRates(decay, loss, gain)
    own, quench = UPPER_LEVEL[line], 0.4
    other = OTHER_LEVEL[own]
    norm = {level: 1 / math.sqrt(np.sum(projections(J_OF[level]) ** 2)) for level in (own, other)}  # T_10 = norm J_z

    def flow(_, y):
        x = {own: y[0], other: y[1]}
        turn = {a: gain[b][1] * x[b] - (decay[a] + loss[a][1] + quench) * x[a] for a, b in ((own, other), (other, own))}
        share = {"P1/2": -1 / 3, "P3/2": 1 / 3}
        emitted = sum(decay[level] * share[level] * x[level] / norm[level] for level in x)
        return [turn[own], turn[other], emitted]

    end = solve_ivp(flow, (0, 80), [norm[own], 0.0, 0.0], rtol=1e-10, atol=1e-13).y[2, -1]  # <J_z> = 1 at the start
    free = -1 / 3 if own == "P1/2" else 1 / 3
    assert surviving_orientation(line, rates, quench) == pytest.approx(end / free, rel=1e-6)


def test_without_gas_all_orientation_survives():
    assert surviving_orientation("D1", None) == surviving_orientation("D2", free_rates(RB)) == 1.0
    assert surviving_orientation("D1", mixed_rates(3.0)) == pytest.approx(0.25)


def test_rate_is_flux_times_cross_section():
    found = pumping(WIDE, Beam(2e-3, 0.5, detuning_GHz=7.0))
    photon = codata.h * codata.c / (RB.line_wavelength_nm("D1") * 1e-9)
    assert found.flux_cm2_s == pytest.approx(2e-3 / photon / (math.pi * 0.25**2), rel=1e-12)
    assert found.rate.value == pytest.approx(found.flux_cm2_s * float(WIDE.cross_section(7.0)), rel=1e-12)


def test_light_is_at_the_peak_unless_told_otherwise():
    at_peak = pumping(NARROW, BEAM)
    assert at_peak.detuning_GHz == NARROW.peak()[0]
    assert at_peak.rate.value >= pumping(NARROW, replace(BEAM, detuning_GHz=0.0)).rate.value


@pytest.mark.parametrize("detuning", [-80.0, 60.0])
def test_light_shift_far_from_resonance_is_that_of_two_levels(detuning):
    # Omega^2/(4 Delta) and R = (Omega^2/2)(gamma/2)/Delta^2: shift = R Delta/gamma, all as angular frequencies.
    made = absorption_line(alkali("K"), "D2", 340.0, 0.5 * GHZ_RAD_S)
    found = pumping(made, replace(BEAM, detuning_GHz=detuning))
    assert found.light_shift.value == pytest.approx(found.rate.value * detuning / made.lorentz_fwhm_GHz, rel=2e-3)
    # With the dipole: Omega^2 = 2 pi r_e c f Phi gives shift = pi r_e c f Phi/(2 Delta) with Delta in rad/s.
    f = alkali("K").oscillator_strength["D2"].value
    area = math.pi * 2.8179403262e-13 * 2.99792458e10 * f
    expected = area * found.flux_cm2_s / (2 * math.pi * detuning * 1e9)
    assert found.light_shift.value == pytest.approx(expected, rel=1e-2)


@pytest.mark.parametrize(("line", "s"), [("D1", 1.0), ("D1", -1.0), ("D2", 1.0)])
def test_vector_shift_is_the_difference_of_the_two_sublevels(line, s):
    # Each sublevel is shifted like it absorbs: shift(m) = scalar x (excitation of m)/mean.
    made = absorption_line(RB, line, 350.0, 50 * GHZ_RAD_S)
    found = pumping(made, Beam(1e-3, 1.0, detuning_GHz=20.0, photon_spin=s))
    up, _ = sublevel_rates(line, s, 0.0)
    plus, minus = up.sum(axis=0) * found.light_shift.value
    zeeman = codata.physical_constants["Bohr magneton"][0] * 1e-4 * RB.levels["S1/2"].gJ.value / codata.hbar
    assert found.light_shift_field_G.value == pytest.approx((plus - minus) / zeeman, rel=1e-9)


def test_no_single_field_when_the_ground_level_is_resolved():
    found = pumping(NARROW, BEAM)
    assert found.light_shift_field_G is None and "hyperfine" in found.field_reason
    assert any("empties one F" in words for words in found.warnings)
    assert pumping(NARROW, replace(BEAM, detuning_GHz=90.0)).light_shift_field_G is not None


def test_error_of_the_rate_is_that_of_width_and_shift():
    beam = replace(BEAM, detuning_GHz=15.0)
    found = pumping(WIDE, beam)

    def rate(width, shift):
        made = replace(WIDE, fwhm_rad_s=width * GHZ_RAD_S, shift_rad_s=shift * GHZ_RAD_S)
        return pumping(made, beam).rate.value

    wider = max(abs(rate(50 + d, -10) - found.rate.value) for d in (-5, 5))
    moved = max(abs(rate(50, -10 + d) - found.rate.value) for d in (-2, 2))
    assert found.rate.error == pytest.approx(math.hypot(wider, moved), rel=1e-9)
    assert found.light_shift.error > 0 and found.light_shift_field_G.error > 0


def test_an_unknown_width_error_makes_the_rate_error_unknown():
    assert pumping(replace(WIDE, fwhm_error_rad_s=None), BEAM).rate.error is None


def test_saturation_grows_with_power_and_stops_at_the_statistical_weights():
    weak, strong = (pumping(WIDE, replace(BEAM, power_W=power)) for power in (1e-3, 1e6))
    assert weak.saturation < 0.1 and not any("saturation" in words for words in weak.warnings)
    assert any("saturation parameter" in words for words in strong.warnings)
    assert strong.excited_fraction == pytest.approx(0.5, rel=1e-2)
    d2 = absorption_line(RB, "D2", 350.0, 50 * GHZ_RAD_S)
    assert pumping(d2, replace(BEAM, power_W=1e6)).excited_fraction == pytest.approx(2 / 3, rel=1e-2)
    # A line much wider than its hyperfine and Doppler structure: one class of atoms, s = 2 R/Gamma on D1.
    very_wide = absorption_line(RB, "D1", 350.0, 500 * GHZ_RAD_S)
    found = pumping(very_wide, BEAM)
    assert found.saturation == pytest.approx(2 * found.rate.value / RB.decay_rate("P1/2"), rel=1e-2)


def test_atoms_in_resonance_saturate_before_the_vapour_does():
    found = pumping(NARROW, Beam(1e-3, 1.0))
    assert found.saturation > 50 * 2 * found.rate.value / RB.decay_rate("P1/2")
    spread = pumping(NARROW, Beam(1e-3, 1.0, linewidth_GHz=5.0))
    assert spread.saturation < found.saturation / 50


def test_quenching_eases_saturation():
    decay = RB.decay_rate("P1/2")
    free, quenched = (pumping(WIDE, BEAM, quench_rate_s=rate).saturation for rate in (0.0, 9 * decay))
    assert quenched == pytest.approx(free / 10)


def test_lithium_lines_overlap():
    made = absorption_line(alkali("Li"), "D1", 600.0)
    assert any("D2 adds" in words for words in pumping(made, BEAM).warnings)
    assert not any("D2 adds" in words for words in pumping(WIDE, BEAM).warnings)


def test_a_far_wing_is_doubtful():
    assert any("wing" in words for words in pumping(WIDE, replace(BEAM, detuning_GHz=-300.0)).warnings)


def test_bad_beams_list_every_problem():
    with pytest.raises(InputError) as caught:
        Beam(power_W=0.0, diameter_cm=-1.0, detuning_GHz=math.nan, linewidth_GHz=-1.0, photon_spin=1.5)
    assert len(caught.value.problems) == 5
    for words in ("power = 0 W", "beam diameter = -1 cm", "detuning = nan GHz", "laser linewidth", "photon spin"):
        assert words in str(caught.value)
    with pytest.raises(InputError, match="the unit is cm"):
        Beam(1e-3, 250.0)
    with pytest.raises(InputError, match="within 1000 GHz"):
        Beam(1e-3, 1.0, detuning_GHz=5e9)


@pytest.mark.parametrize(("line", "detuning", "other"), [("D1", 300.0, "D2"), ("D2", -300.0, "D1")])
def test_light_nearer_to_the_other_line_is_refused(line, detuning, other):
    made = absorption_line(alkali("Na"), line, 400.0)  # lines 515 GHz apart
    with pytest.raises(InputError, match=f"name line {other}"):
        pumping(made, replace(BEAM, detuning_GHz=detuning))
    assert pumping(made, replace(BEAM, detuning_GHz=-detuning)).rate.value > 0


def test_bad_surroundings_are_named():
    with pytest.raises(InputError) as caught:
        pumping(WIDE, BEAM, quench_rate_s=-1.0, slowing_down=0.5)
    assert len(caught.value.problems) == 2
    for function, arguments in ((surviving_orientation, ("D3", None)), (spin_coefficients, ("D3", 1.0))):
        with pytest.raises(UnknownNameError):
            function(*arguments)
