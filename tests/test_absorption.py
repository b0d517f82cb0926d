"""Absorption lines of real vapours, optical depth, trapping, quenching: positions, judgements, errors, bad input."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from scipy import constants as codata

from pertcalc.errors import InputError, UnknownNameError
from pertcalc.species import ALKALIS, alkali
from pertcalc.vapour.absorption import (
    GHZ_RAD_S,
    NATURAL,
    absorption_line,
    doppler_sigma_GHz,
    isotope_shift,
)
from pertcalc.vapour.quenching import ENOUGH, QUENCHERS, quench_pressure_torr, quench_rate, quenching, quenching_rows
from pertcalc.vapour.trapping import escape_probability, optical_depth, trapping

RB = alkali("Rb")
LINE = absorption_line(RB, "D1", 333.0)
BROAD = absorption_line(RB, "D1", 400.0, 50 * GHZ_RAD_S, -10 * GHZ_RAD_S)


def test_the_sample_is_the_natural_mixture_or_one_isotope():
    assert LINE.sample == NATURAL
    assert {one.isotope for one in LINE.components} == {"85Rb", "87Rb"}
    pure = absorption_line(RB, "D1", 333.0, isotope="87Rb")
    assert {one.isotope for one in pure.components} == {"87Rb"}
    assert sum(one.weight for one in pure.components) == pytest.approx(1.0)


def test_isotopes_stand_apart_by_their_shift():
    # Mean position of each isotope's components, weighted by strength.
    centres = {}
    for label in ("6Li", "7Li"):
        mine = [one for one in absorption_line(alkali("Li"), "D2", 600.0).components if one.isotope == label]
        centres[label] = sum(one.weight * one.offset_GHz for one in mine) / sum(one.weight for one in mine)
    assert centres["7Li"] - centres["6Li"] == pytest.approx(-isotope_shift("6Li", "D2").value * 1e-3, rel=1e-9)


@pytest.mark.parametrize("label", [one.label for symbol in ALKALIS for one in alkali(symbol).isotopes])
def test_every_isotope_has_a_shift_with_error_and_source(label):
    shift = isotope_shift(label, "D1")
    assert shift.unit == "MHz" and shift.source and shift.error is not None
    assert (shift.mark == "COMPUTED") == (shift.value == 0)


def test_hyperfine_components_are_split_like_their_levels():
    # Ground splitting of I = 3/2: 2A; of P1/2: 2A'.
    pure = absorption_line(RB, "D1", 333.0, isotope="87Rb")
    at = {(one.F, one.F_upper): one.offset_GHz for one in pure.components}
    A = {level: RB.isotopes[1].hyperfine[level]["A"].value * 1e-3 for level in ("S1/2", "P1/2")}
    assert at[1, 1] - at[2, 1] == pytest.approx(2 * A["S1/2"])
    assert at[1, 2] - at[1, 1] == pytest.approx(2 * A["P1/2"])


def test_the_width_grows_with_doppler_and_collisions():
    hot = absorption_line(RB, "D1", 4 * 333.0)
    assert hot.doppler_fwhm_GHz == pytest.approx(2 * LINE.doppler_fwhm_GHz)
    assert BROAD.lorentz_fwhm_GHz == pytest.approx(50 + LINE.natural_fwhm_GHz)
    assert BROAD.component_fwhm_GHz() < BROAD.fwhm_GHz() < BROAD.component_fwhm_GHz() + 7
    assert BROAD.peak()[1] < LINE.peak()[1]


@pytest.mark.parametrize(("lorentz", "sigma"), [(1.0, 0.01), (1.0, 0.4), (0.2, 0.4), (0.01, 0.4)])
def test_the_quick_width_of_a_component_is_that_of_the_profile(lorentz, sigma):
    one = replace(LINE.components[0], weight=1.0, offset_GHz=0.0, doppler_GHz=sigma)
    made = replace(LINE, components=(one,), natural_fwhm_GHz=lorentz)
    assert made.component_fwhm_GHz() == pytest.approx(made.fwhm_GHz(), rel=5e-4)


@pytest.mark.parametrize(("symbol", "line"), [("Rb", "D1"), ("Rb", "D2"), ("Cs", "D1"), ("Li", "D2"), ("K", "D1")])
@pytest.mark.parametrize("width_GHz", [0.0, 1.0, 20.0])
def test_peak_and_width_agree_with_a_dense_scan(symbol, line, width_GHz):
    made = absorption_line(alkali(symbol), line, 340.0, width_GHz * GHZ_RAD_S, 0.4 * width_GHz * GHZ_RAD_S)
    nu = np.arange(-40, 40, 2e-3)
    sigma = made.cross_section(nu)
    top = int(np.argmax(sigma))
    where, value = made.peak()
    assert value >= sigma[top] and value == pytest.approx(sigma[top], rel=1e-4)
    assert where == pytest.approx(nu[top], abs=5e-3)
    low, high = top, top
    while sigma[low] > sigma[top] / 2:
        low -= 1
    while sigma[high] > sigma[top] / 2:
        high += 1
    assert made.fwhm_GHz() == pytest.approx(nu[high] - nu[low], abs=8e-3)


def test_resolution_is_judged_by_width_against_splitting():
    assert LINE.resolution("S1/2") == "resolved"
    assert BROAD.resolution("S1/2") == BROAD.resolution("P1/2") == "unresolved"
    assert absorption_line(RB, "D1", 333.0, 6 * GHZ_RAD_S).resolution("S1/2") == "partly resolved"
    assert LINE.resolution("S1/2", gaussian_fwhm_GHz=100.0) == "unresolved"


def test_a_rare_isotope_does_not_decide_the_resolution():
    # 40K: 1.286 GHz ground splitting at an abundance of 1e-4; 39K: 0.462 GHz.
    assert absorption_line(alkali("K"), "D1", 340.0).splitting_GHz("S1/2") == pytest.approx(0.462, abs=1e-3)
    assert absorption_line(alkali("K"), "D1", 340.0, isotope="40K").splitting_GHz("S1/2") == pytest.approx(
        1.286, abs=1e-3
    )


def test_bad_lines_are_named():
    with pytest.raises(InputError) as caught:
        absorption_line(RB, "D1", -1.0, -2.0, math.nan, fwhm_error_rad_s=-1.0)
    assert len(caught.value.problems) == 4 and "temperature = -1 K" in str(caught.value)
    with pytest.raises(UnknownNameError, match="D3"):
        absorption_line(RB, "D3", 300.0)
    with pytest.raises(UnknownNameError, match="87Rb"):
        absorption_line(RB, "D1", 300.0, isotope="88Rb")
    with pytest.raises(UnknownNameError, match="S1/2"):
        LINE.splitting_GHz("P3/2")
    with pytest.raises(InputError, match="finite"):
        LINE.cross_section([0.0, math.inf])
    with pytest.raises(InputError, match=">= 0"):
        LINE.cross_section(0.0, -1.0)
    with pytest.raises(UnknownNameError):
        isotope_shift("1H", "D1")
    with pytest.raises(UnknownNameError):
        isotope_shift("87Rb", "D3")


def test_optical_depth_is_density_times_peak_times_path():
    assert optical_depth(LINE, 2e11, 3.0) == pytest.approx(2e11 * 3.0 * LINE.peak()[1])
    with pytest.raises(InputError) as caught:
        optical_depth(LINE, -1.0, 0.0)
    assert len(caught.value.problems) == 2


def test_light_escapes_a_thin_vapour_and_less_the_thicker_it_is():
    assert escape_probability(LINE, 0.0, 1.0) == pytest.approx(1.0, abs=2e-4)
    depths = [escape_probability(LINE, n, 1.0) for n in (1e8, 1e10, 1e11, 1e12, 1e14)]
    assert all(a > b for a, b in zip(depths, depths[1:], strict=False)) and depths[0] > 0.99


@pytest.mark.parametrize("kind", ["Lorentz", "Doppler"])
def test_one_flight_is_near_the_decay_of_a_long_cylinder(kind):
    # Holstein (1947, 1951), FROM MEMORY: g = 1.115/sqrt(pi k0 R) and 1.60/(k0 R sqrt(pi ln k0 R)) for k0 R >> 1.
    one = replace(LINE.components[0], weight=1.0, offset_GHz=0.0, doppler_GHz=1e-8 if kind == "Lorentz" else 0.2)
    made = replace(LINE, components=(one,), natural_fwhm_GHz=2.0 if kind == "Lorentz" else 1e-12)
    depth = 1e4
    root = math.sqrt(math.pi * depth)
    published = 1.115 / root if kind == "Lorentz" else 1.60 / (depth * math.sqrt(math.pi * math.log(depth)))
    ratio = published / escape_probability(made, depth / made.peak()[1], 1.0)
    low, high = (1.10, 1.13) if kind == "Lorentz" else (1.55, 1.75)
    assert low < ratio < high
    result = trapping(made, depth / made.peak()[1], 2.0)
    assert abs(published - result.escape.value) < 1.2 * result.escape.error


def test_trapping_counts_photons():
    decay = RB.decay_rate("P1/2")
    thick = trapping(LINE, 1e12, 2.5)
    assert thick.matters and thick.depth_to_wall == pytest.approx(thick.optical_depth.value / 2)
    assert thick.emissions == pytest.approx(1 / thick.escape.value)
    assert thick.decay_rate.value == pytest.approx(decay * thick.escape.value)
    assert thick.reabsorbed == pytest.approx(thick.emissions - 1)
    # Every excitation ends in escape or quenching.
    quenched = trapping(LINE, 1e12, 2.5, quench_rate_s=20 * decay)
    assert quenched.emissions * quenched.escape.value + 20 * decay / quenched.decay_rate.value == pytest.approx(1.0)
    assert not quenched.matters and quenched.reabsorbed < 0.1


def test_trapping_warns_of_what_it_spoils():
    thin, thick = trapping(LINE, 1e9, 2.5), trapping(LINE, 1e12, 2.5, density_error=0.1)
    assert not thin.warnings and not thin.matters
    assert "reabsorbed" in thick.warnings[-1] and "quenching gas" in thick.warnings[-1]
    assert thin.optical_depth.error is None
    assert thick.optical_depth.error == pytest.approx(0.1 * thick.optical_depth.value)


def test_bad_cells_are_named():
    with pytest.raises(InputError) as caught:
        trapping(LINE, math.nan, -1.0, quench_rate_s=-2.0)
    assert {problem.split(" =")[0] for problem in caught.value.problems} == {
        "path",
        "distance to the wall",
        "alkali density",
        "quenching rate",
    }


def test_quenching_is_read_from_the_table():
    sigma = quenching("Rb", "P1/2", "N2")
    # Hrycyshyn & Krause, Can. J. Phys. 48, 2761 (1970), FROM MEMORY: 58 A^2 within 15 to 25 %.
    assert sigma.value == pytest.approx(58e-16) and sigma.unit == "cm^2" and sigma.mark == "FROM MEMORY"
    assert sigma.error == pytest.approx(0.25 * sigma.value)


def test_quenching_takes_the_measurement_nearest_in_temperature():
    assert quenching("Na", "P1/2", "N2", 420.0).value == pytest.approx(20e-16)
    flame = quenching("Na", "P1/2", "N2", 1600.0)
    assert flame.value == pytest.approx(math.pi * 6.95e-16, rel=1e-4) and flame.mark == "READ"


def test_noble_gases_have_only_bounds():
    assert quenching("Rb", "P3/2", "Ar") is None
    assert quench_rate(RB, "P3/2", "Ar", 1e19, 400.0) is None
    assert quench_pressure_torr(RB, 400.0, "P3/2", "He") is None
    rows = quenching_rows("Rb", "P3/2", "Ar")
    assert [row.kind for row in rows] == ["bound"] and rows[0].value == 0.01


def test_every_row_has_source_mark_and_error():
    rows = [
        row
        for symbol in ALKALIS
        for level in ("P1/2", "P3/2")
        for gas in QUENCHERS
        for row in quenching_rows(symbol, level, gas)
    ]
    assert len(rows) == 68
    for row in rows:
        assert row.source and row.mark in ("READ", "FROM MEMORY") and row.low_K <= row.high_K
        assert (row.error is None) == (row.kind == "bound")
        assert row.mark == "FROM MEMORY" or "read at http" in row.source
    assert all(quenching(symbol, "P1/2", "N2") is not None for symbol in ALKALIS)


@pytest.mark.parametrize("symbol", ALKALIS)
def test_the_quenching_pressure_makes_quenching_ten_times_faster(symbol):
    atom = alkali(symbol)
    pressure = quench_pressure_torr(atom, 380.0, "P3/2")
    density = pressure.value * codata.torr / (codata.k * 380.0) * 1e-6
    rate = quench_rate(atom, "P3/2", "N2", density, 380.0)
    assert rate.value == pytest.approx(ENOUGH * atom.decay_rate("P3/2"))
    assert pressure.error / pressure.value == pytest.approx(rate.error / rate.value)
    # Mean relative speed from SI: sqrt(8 k T/(pi mu)).
    mu = atom.mass_u.value * 28.0134 / (atom.mass_u.value + 28.0134) * codata.atomic_mass
    speed = math.sqrt(8 * codata.k * 380.0 / (math.pi * mu)) * 100
    assert rate.value == pytest.approx(density * speed * quenching(symbol, "P3/2", "N2", 380.0).value, rel=1e-6)


def test_bad_quenching_is_named():
    with pytest.raises(UnknownNameError, match="N2"):
        quenching("Rb", "P1/2", "SF6")
    with pytest.raises(UnknownNameError):
        quenching("Rb", "S1/2", "N2")
    with pytest.raises(InputError, match="temperature"):
        quench_pressure_torr(RB, 0.0)
    with pytest.raises(InputError, match="density"):
        quench_rate(RB, "P1/2", "N2", -1.0, 300.0)


def test_doppler_width_is_linear_in_frequency():
    assert doppler_sigma_GHz(2e5, 300.0, 87.0) == pytest.approx(2 * doppler_sigma_GHz(1e5, 300.0, 87.0))
