"""Published numbers that pumping rests on: resonant cross sections, saturation, Doppler widths, quenching."""

from __future__ import annotations

from dataclasses import replace

import pytest
from scipy import constants as codata

from pertcalc.species import alkali
from pertcalc.vapour.absorption import absorption_line
from pertcalc.vapour.quenching import quench_pressure_torr

# D2, stretched component F -> F+1, isotropic light: resonant cross section [cm^2] and saturation intensity [mW/cm^2].
# FROM MEMORY: compilations of D-line data of 23Na, 87Rb and 133Cs, to their first four digits.
ISOTROPIC = {
    "23Na": (2.0, 3.0, 7.735e-10, 13.41),
    "87Rb": (2.0, 3.0, 1.356e-9, 3.577),
    "133Cs": (4.0, 5.0, 1.413e-9, 2.706),
}


@pytest.mark.parametrize("isotope", ISOTROPIC)
def test_resonant_cross_section_and_saturation_of_the_cycling_component(isotope):
    F, upper, sigma_published, intensity_published = ISOTROPIC[isotope]
    atom = alkali(isotope.strip("0123456789"))
    made = absorption_line(atom, "D2", 300.0, isotope=isotope)
    one = next(c for c in made.components if (c.F, c.F_upper) == (F, upper))
    population = sum(c.weight for c in made.components if c.F == F)
    # Atoms at rest, this component alone.
    cold = replace(made, components=(replace(one, doppler_GHz=1e-9, offset_GHz=0.0),))
    # The strengths from F add up to the part of the atoms that is in F; here all are.
    sigma = float(cold.cross_section(0.0)) / population
    assert sigma == pytest.approx(sigma_published, rel=2e-3)
    # I_sat = h nu Gamma/(2 sigma), where excitation saturates half.
    photon = codata.h * codata.c / (made.wavelength_cm * 1e-2)
    intensity = photon * atom.decay_rate("P3/2") / (2 * sigma) * 1e3
    assert intensity == pytest.approx(intensity_published, rel=5e-3)


def test_doppler_width_of_rubidium_at_room_temperature():
    # FROM MEMORY: about 0.51 GHz at 300 K, D2 of 87Rb.
    made = absorption_line(alkali("Rb"), "D2", 300.0, isotope="87Rb")
    assert made.doppler_fwhm_GHz == pytest.approx(0.51, abs=0.006)


def test_ground_splitting_of_caesium_defines_the_second():
    # 9 192 631 770 Hz exactly (SI); our A constant carries its printed digits.
    assert absorption_line(alkali("Cs"), "D1", 300.0).splitting_GHz("S1/2") == pytest.approx(9.192631770, rel=1e-6)


def test_nitrogen_of_rubidium_pumping_cells():
    # Common practice, no source: some tens of Torr of N2 quench rubidium well enough for pumping.
    assert 10 < quench_pressure_torr(alkali("Rb"), 380.0).value < 100
