"""Cross sections of pure -C6/R^6 curves on straight paths against closed forms of impact theory.

Sources: Lindholm-Foley constants from gamma functions (pertcalc.collisions.lindholm_foley, checked there with mpmath);
constants of van der Waals depolarisation 2.10, 2.575, 2.31 (P3/2) and 2.80, 2.54 (no spin), +-0.01, from an independent
straight-path integration (COMPUTED, not published data). Every curve gets a core, C6/(R^6 + core^6): inside it the
phases turn by hundreds of radians and average out, and without it the number of turns would grow without limit.
"""

from __future__ import annotations

import numpy as np
import pytest

from pertcalc.collisions import born_tails
from pertcalc.collisions.lindholm_foley import lindholm_foley
from pertcalc.collisions.multipoles import OBSERVABLES
from pertcalc.collisions.pair import CollisionPair
from pertcalc.collisions.semiclassical import cross_sections, reach, tails

MASS = 36_000.0
SPEEDS = np.array([1e-4, 2.5e-4, 6e-4])
ENERGIES = 0.5 * MASS * SPEEDS**2
CORE = 4.0


def van_der_waals(X: float, A: float, B: float, splitting: float) -> CollisionPair:
    def curve(C6: float):
        return lambda R: -C6 / (R**6 + CORE**6)

    return CollisionPair(MASS, splitting, curve(X), curve(A), curve(B), ((B + 2 * A) / 3 - X, 0.0, 0.0), B - A)


@pytest.mark.parametrize("C6", [300.0, -120.0])
def test_isotropic_c6_gives_lindholm_and_foley(C6):
    """Width and shift of both lines to 0.2 %, red for C6 > 0, blue for C6 < 0."""
    table = cross_sections(van_der_waals(400.0, 400.0 + C6, 400.0 + C6, 2.6e-4), "straight", ENERGIES)
    fwhm, shift = lindholm_foley(C6, SPEEDS)
    for level in ("P1/2", "P3/2"):
        np.testing.assert_allclose(2 * SPEEDS * table.column(f"{level}.width"), fwhm, rtol=2e-3)
        np.testing.assert_allclose(SPEEDS * table.column(f"{level}.shift"), shift, rtol=2e-3)
    for name in OBSERVABLES:
        if "width" not in name and "shift" not in name:
            np.testing.assert_allclose(table.column(name), 0, atol=1e-8, err_msg=name)


def test_anisotropic_c6_relaxes_p32_by_the_van_der_waals_constants():
    """loss_K = Lambda_K (D/v)^(2/5) with a splitting that is never crossed."""
    D, speed = 300.0, SPEEDS[1]
    pair = van_der_waals(0.0, 0.0, D, 1e5 * speed / 17.0)
    table = cross_sections(pair, "straight", ENERGIES[1:2])
    found = [table.column(f"P3/2.loss{K}")[0] / (D / speed) ** 0.4 for K in (1, 2, 3)]
    assert found == pytest.approx([2.10, 2.575, 2.31], rel=5e-3)
    assert table.column("P1/2.loss1")[0] == pytest.approx(0, abs=0.1)


def test_anisotropic_c6_without_spin():
    """Zero splitting: orbital orientation from 3/2 of the outflow of P1/2, alignment from rank 3 of P3/2."""
    D, speed = 300.0, SPEEDS[1]
    table = cross_sections(van_der_waals(0.0, 0.0, D, 0.0), "straight", ENERGIES[1:2])
    found = [1.5 * table.column("P1/2.outflow")[0], table.column("P3/2.loss3")[0]]
    assert np.array(found) / (D / speed) ** 0.4 == pytest.approx([2.80, 2.54], rel=5e-3)
    # What the sudden limit says of whole cross sections, tails included.
    s1, s2 = found
    assert table.column("P1/2.loss1")[0] == pytest.approx(2 / 9 * s1 + 20 / 27 * s2, rel=1e-3)
    assert table.column("P3/2.loss1")[0] == pytest.approx(5 / 9 * s1 + 2 / 27 * s2, rel=1e-3)
    assert table.column("P3/2.loss2")[0] == pytest.approx(2 / 3 * s1 + s2 / 3, rel=1e-3)
    assert table.column("gain1")[0] == pytest.approx(-np.sqrt(10) * (s1 / 9 - 2 * s2 / 27), rel=1e-3)


def test_tails_go_to_the_right_observables():
    """One tail per observable, from the closed forms of born_tails (tested on their own)."""
    pair = van_der_waals(278.0, 340.0, 560.0, 2.6e-4)
    speed = float(SPEEDS[1])
    last = 3 * reach(pair, speed)
    added = dict(zip(OBSERVABLES, tails(pair, speed, last), strict=True))
    D, dC6, splitting = 220.0, 1240.0 / 3 - 278.0, 2.6e-4
    assert added["P1/2.shift"] == added["P3/2.shift"] == pytest.approx(float(born_tails.shift_tail(speed, last, dC6)))
    for level in ("P1/2", "P3/2"):
        width = born_tails.half_width_tail(speed, last, dC6, D, splitting, level)
        assert added[f"{level}.width"] == pytest.approx(float(width))
        outflow = born_tails.outflow_tail(speed, last, D, splitting, level)
        assert added[f"{level}.outflow"] == pytest.approx(float(outflow))
    for K in (1, 2, 3):
        loss = born_tails.multipole_loss_tail(speed, last, D, splitting, "P3/2", K)
        assert added[f"P3/2.loss{K}"] == pytest.approx(float(loss))
