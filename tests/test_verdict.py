"""The verdict on one cell: arithmetic by hand, crossovers recomputed where they lie, limits. Rates are invented
(tests/report_fakes.py) except in the one real computation; diffusion, pairs, walls and light are always the real ones.
"""

from __future__ import annotations

import math
from dataclasses import replace
from functools import cache

import numpy as np
import pytest
from scipy import constants as codata
from sympy import Rational
from sympy.physics.wigner import wigner_6j

import pertcalc.vapour.verdict as module
from pertcalc.errors import InputError, OutOfRangeError, UnknownNameError
from pertcalc.measured import as_rate, measurements
from pertcalc.report.verdict_words import ground_sentence
from pertcalc.species import UPPER_LEVEL, alkali
from pertcalc.vapour.excited import COLLISIONS, DECAY, FIELD
from pertcalc.vapour.fill import IMPACT_LIMIT
from pertcalc.vapour.ground import TRANSIT, WALL
from pertcalc.vapour.ground_balance import PUMPING, decays_at, light_decay
from pertcalc.vapour.hanle_fields import regime
from pertcalc.vapour.pairs import PAIRS
from pertcalc.vapour.pump_light import PumpLight
from pertcalc.vapour.question import DEFAULT_CELL, DEFAULT_LINE, ask
from pertcalc.vapour.spin_destruction import BY_ALKALI, BY_GAS, EXCHANGE
from pertcalc.vapour.verdict import hanle_of, verdict
from tests.report_fakes import fake_rates
from tests.test_cli_molecule import curve_file

RAD_S_G = codata.physical_constants["Bohr magneton"][0] * 1e-4 / codata.hbar  # mu_B/hbar [rad/s/G]
REAL_RATES, REAL_DIFFUSION = module.collision_rates, module.diffusion
J = {"P1/2": 0.5, "P3/2": 1.5}


@cache
def kept_diffusion(symbol: str, gas: str, T: float):
    return REAL_DIFFUSION(symbol, gas, T)


def diffusion(symbol, gas, T, curves=None):
    """The real one, computed once for each pair of the default curves."""
    return kept_diffusion(symbol, gas, T) if curves is None else REAL_DIFFUSION(symbol, gas, T, curves)


@pytest.fixture(autouse=True)
def _invented_rates(monkeypatch):
    monkeypatch.setattr(module, "collision_rates", fake_rates)
    monkeypatch.setattr(module, "diffusion", diffusion)


def of(symbol: str, gas: str, **conditions):
    return verdict(ask(symbol, gas, **conditions))


# What is asked --------------------------------------------------------------------------------------------------------


def test_a_question_fills_in_defaults_and_names_them():
    question = ask("rb", "ar")
    assert (question.alkali, question.gas) == ("Rb", "Ar")
    assert question.defaults == ("temperature", "pressure", "fill temperature", "field", "cell")
    assert question.cell == ask("Rb", "Ar", cell=DEFAULT_CELL).cell and question.light is None
    given = ask(
        "Rb", "Ar", temperature_K=333.0, pressure_torr=5.0, fill_temperature_K=295.0, field_G=0.0, cell="cube 1 cm"
    )
    assert given.defaults == ()
    # Ideal gas at the fill temperature: 9.6565e18 p[Torr]/T cm^-3.
    assert given.gas_density_cm3 == pytest.approx(9.6565e18 * 5 / 295, rel=1e-4)


@pytest.mark.parametrize("word", ["none", "None", " NONE "])
def test_a_cell_without_gas_has_no_pressure(word):
    question = ask("Cs", word)
    assert question.gas is None and question.gas_density_cm3 == 0
    assert question.defaults == ("temperature", "field", "cell")


def test_light_is_on_d1_at_the_peak_and_narrow_unless_said():
    light = ask("K", "He", power_W=1e-3, beam_diameter_cm=0.5).light
    assert light is not None and light.line == DEFAULT_LINE == "D1"
    assert (light.beam.detuning_GHz, light.beam.linewidth_GHz) == (None, 0.0)
    # A beam without power is only the region looked at.
    assert ask("K", "He", beam_diameter_cm=0.5).light is None


BAD = [
    ({"gas": "Argon"}, UnknownNameError, "Did you mean Ar"),
    ({"alkali": "Rbb"}, UnknownNameError, "Did you mean Rb"),
    ({"gas": "none", "pressure_torr": 1.0}, InputError, "gas = none has no --pressure"),
    ({"gas": "none", "fill_temperature_K": 300.0, "curves": "x.toml"}, InputError, "no --fill-temperature, --curves"),
    ({"method": "closed-form"}, InputError, "Take semiclassical or quantum"),
    ({"method": "guess"}, UnknownNameError, "semiclassical, quantum"),
    ({"wall": "paraffin"}, UnknownNameError, "bare, coated"),
    ({"cell": "box 1 cm"}, InputError, "must begin with sphere, cylinder, cube"),
    ({"field_G": -1.0}, InputError, "field = -1 G"),
    ({"field_G": 1.0001e6}, InputError, "fine structure of every alkali"),
    (
        {"power_W": 1e-3, "beam_diameter_cm": 1.0, "alkali": "Na", "detuning_GHz": 260.0},
        InputError,
        "name line D2 and count the detuning from it",
    ),
    ({"field_G": math.nan, "pressure_torr": 0.0}, InputError, "pressure = 0 Torr"),
    ({"power_W": 1e-3}, InputError, "--beam-diameter"),
    ({"power_W": -1e-3, "beam_diameter_cm": 1.0}, InputError, "power = -0.001 W"),
    ({"line": "D1"}, InputError, "--line given without --power"),
    ({"line": "D2", "detuning_GHz": 1.0, "linewidth_GHz": 1.0}, InputError, "--line, --detuning, --linewidth"),
    ({"line": "D3", "power_W": 1e-3, "beam_diameter_cm": 1.0}, UnknownNameError, "D1, D2"),
    ({"beam_diameter_cm": 3.0}, InputError, "larger than the cell"),
    ({"beam_diameter_cm": 0.0}, InputError, "> 0"),
    ({"beam_diameter_cm": math.nan}, InputError, "finite"),
]


@pytest.mark.parametrize(("bad", "error", "words"), BAD, ids=[words for *_, words in BAD])
def test_bad_questions_name_field_and_rule(bad, error, words):
    with pytest.raises(error, match=words.replace("(", r"\(")):
        ask(**({"alkali": "Rb", "gas": "Ar"} | bad))


def test_bad_fields_are_listed_together():
    with pytest.raises(InputError) as caught:
        ask("Rb", "Ar", field_G=-1.0, pressure_torr=0.0, temperature_K=-3.0)
    assert all(word in str(caught.value) for word in ("pressure = 0", "temperature = -3", "field = -1"))


@pytest.mark.parametrize(("symbol", "T"), [("Rb", 200.0), ("Rb", 1500.0), ("Na", 200.0), ("Li", 250.0)])
def test_no_rate_is_computed_outside_the_vapour_pressure_formula(symbol, T, monkeypatch):
    def refuse(*_, **__):
        raise AssertionError("computed before the temperature was checked")

    monkeypatch.setattr(module, "collision_rates", refuse)
    with pytest.raises(OutOfRangeError, match=f"temperature of the {symbol} vapour = {T:g} K is outside"):
        of(symbol, "Ar", temperature_K=T)


# Excited levels -------------------------------------------------------------------------------------------------------

CELLS = [("Cs", "Ar", 20.0), ("Na", "He", 0.5), ("K", "Xe", 300.0), ("Li", "Ne", 20.0)]


@pytest.mark.parametrize(("symbol", "gas", "pressure"), CELLS)
@pytest.mark.parametrize("field", [0.0, 1e-6, 1.0, 1e3])
def test_every_rank_by_hand(symbol, gas, pressure, field):
    found = of(symbol, gas, pressure_torr=pressure, field_G=field)
    rates, n = fake_rates(symbol, gas, found.question.fill.temperature_K), found.question.gas_density_cm3
    record = alkali(symbol)
    for level, ranks in found.balances.items():
        g_J, F = record.levels[level].gJ.value, found.isotope.nuclear_spin + J[level]
        g = g_J if found.regimes[level].g_factor == "g_J" else g_J * J[level] / F
        assert set(ranks) == set(range(1, round(2 * J[level]) + 1))
        for K, one in ranks.items():
            loss, decay = n * float(rates.multipole_loss[level][K].values[0]), record.decay_rate(level)
            assert one.collisional.value == pytest.approx(loss, rel=1e-12)
            assert one.collisional.error == pytest.approx(loss * math.hypot(0.003, 0.2), rel=1e-12)
            assert one.larmor == pytest.approx(g * RAD_S_G * field, rel=1e-6)
            assert one.hanle_G == pytest.approx((decay + loss) / (g * RAD_S_G), rel=1e-6)
            assert one.hanle_free_G == pytest.approx(decay / (g * RAD_S_G), rel=1e-6)
            known = {DECAY: decay, COLLISIONS: loss, FIELD: one.larmor}
            assert one.dominant == max(known, key=known.get)
            second = sorted(known.values())[1]
            assert one.factor == pytest.approx(max(known.values()) / second)
            assert one.comparable == tuple(
                name for name, rate in sorted(known.items(), key=lambda e: -e[1]) if 2 * rate >= max(known.values())
            )


@pytest.mark.parametrize(("symbol", "gas", "pressure"), CELLS)
@pytest.mark.parametrize("field", [0.0, 0.5])
def test_collisions_equal_their_rival_at_the_crossover_pressure(symbol, gas, pressure, field):
    found = of(symbol, gas, pressure_torr=pressure, field_G=field)
    for level, ranks in found.balances.items():
        for K, one in ranks.items():
            p = one.crossover_pressure_torr
            there = of(symbol, gas, pressure_torr=p, field_G=field).balances[level][K]
            rival = max(there.radiative.value, there.larmor)
            assert there.collisional.value == pytest.approx(rival, rel=1e-9), (level, K)
            assert of(symbol, gas, pressure_torr=0.99 * p, field_G=field).balances[level][K].dominant != COLLISIONS
            assert of(symbol, gas, pressure_torr=1.01 * p, field_G=field).balances[level][K].dominant == COLLISIONS
            assert one.crossover_pressure_error == pytest.approx(math.hypot(0.003, 0.2))


@pytest.mark.parametrize(
    ("symbol", "gas", "pressure"), [*CELLS, ("Cs", "Xe", 100.0), ("Li", "He", 20.0), ("Rb", "Xe", 1e4)]
)
def test_the_field_takes_over_at_the_crossover_field(symbol, gas, pressure):
    """In several cells g steps from g_F to g_J on the way: the crossover belongs to the g in force there."""
    found = of(symbol, gas, pressure_torr=pressure, field_G=0.0)
    for level in ("P1/2", "P3/2"):
        one = found.balances[level][1]
        B = one.crossover_field_G
        below, above = (
            of(symbol, gas, pressure_torr=pressure, field_G=x * B).balances[level][1] for x in (0.999, 1.001)
        )
        assert (below.dominant == FIELD, above.dominant) == (False, FIELD)
        # The same answer whatever the field is now.
        assert above.crossover_field_G == pytest.approx(B, rel=1e-12)
        rate = max(one.radiative.value, one.collisional.value)
        assert below.larmor <= rate <= above.larmor
        if above.larmor < 1.01 * below.larmor:  # no step of g between them
            assert above.larmor == pytest.approx(rate, rel=2e-3)
        else:
            assert (found.regimes[level].structure, found.regimes[level].nucleus) == ("partly resolved", "coupled")


def test_one_of_those_cells_crosses_at_a_step_of_g():
    """Cs P3/2: decoupled at three times the hyperfine span; g_F there is too small to win, g_J more than enough."""
    found = of("Cs", "Xe", pressure_torr=100.0)
    one, where = found.balances["P3/2"][2], found.regimes["P3/2"]
    g_J = alkali("Cs").levels["P3/2"].gJ.value
    assert one.crossover_field_G == pytest.approx(3 * where.largest / (g_J * RAD_S_G), rel=1e-6)
    assert (
        one.collisional.value / (g_J * RAD_S_G) < one.crossover_field_G < one.collisional.value / (g_J * 0.3 * RAD_S_G)
    )


@pytest.mark.parametrize(
    ("symbol", "gas", "pressure"), [*CELLS, ("Cs", "Xe", 100.0), ("Rb", "none", None), ("Cs", "none", None)]
)
def test_the_crossover_field_lies_in_its_range_whichever_g_holds(symbol, gas, pressure):
    """Below the range the field loses with any g that may hold there, above it it wins with any."""
    found = of(symbol, gas, pressure_torr=pressure, field_G=0.0)
    for level in ("P1/2", "P3/2"):
        one, where = found.balances[level][1], found.regimes[level]
        g_J = alkali(symbol).levels[level].gJ.value
        g_F = g_J * J[level] / (found.isotope.nuclear_spin + J[level])
        rate, (low, high) = max(one.radiative.value, one.collisional.value), one.crossover_range_G
        assert 0 < low <= high == one.crossover_field_G
        for B in np.geomspace(0.01 * low, 100 * high, 200):
            held = regime(found.isotope, level, where.width, B).g_factor
            rates = {None: (g_F, g_J), "g_J": (g_J,), "g_F": (g_F,)}[held]
            if B < low * (1 - 1e-9):
                assert min(rates) * RAD_S_G * B < rate
            if B > high * (1 + 1e-9):
                assert max(rates) * RAD_S_G * B > rate
        if low < high:
            assert regime(found.isotope, level, where.width, 0.999 * high).g_factor is None


def test_hanle_fields_are_a_range_where_neither_g_holds():
    for field, given in ((0.5, None), (1e4, "g_J")):
        found = of("Cs", "Ar", field_G=field)
        assert found.regimes["P3/2"].g_factor == given
        for one in found.balances["P3/2"].values():
            low, high = one.hanle_range_G
            assert one.hanle_G == pytest.approx(high, rel=1e-12)
            # g_J/g_F = F/J = 5/1.5.
            assert high / low == pytest.approx(10 / 3 if given is None else 1.0, rel=1e-9)
            assert one.g_factor.value * RAD_S_G * field == pytest.approx(one.larmor, rel=1e-6)


def test_in_a_strong_field_the_gas_must_beat_the_field():
    found = of("Na", "He", field_G=3e3).balances["P3/2"][2]
    assert found.dominant == FIELD and found.ranking[1][0] == COLLISIONS
    p = found.crossover_pressure_torr
    at = of("Na", "He", field_G=3e3, pressure_torr=p).balances["P3/2"][2]
    assert at.collisional.value == pytest.approx(at.larmor, rel=1e-9)


def test_limits_of_no_gas_little_gas_and_much_gas():
    free = of("K", "none", field_G=0.0)
    little, much = (of("K", "Ar", pressure_torr=p, field_G=0.0) for p in (1e-6, 1e5))
    for level, ranks in free.balances.items():
        for K, one in ranks.items():
            assert (one.dominant, one.collisional.value, one.factor) == (DECAY, 0.0, math.inf)
            assert one.crossover_pressure_torr is None and one.collisional.source == "no buffer gas"
            assert one.hanle_G == one.hanle_free_G
            assert little.balances[level][K].hanle_G == pytest.approx(one.hanle_G, rel=1e-5)
            assert much.balances[level][K].dominant == COLLISIONS
    assert little.scattering["D2"].W2.value == pytest.approx(free.scattering["D2"].W2.value, rel=1e-5)
    assert free.rates is None and free.duration_s is None and free.overlap == {} and free.diffusion is None
    strong = of("K", "none", field_G=1e3)
    assert {ranks[1].dominant for ranks in strong.balances.values()} == {FIELD}


def naive_W2(symbol: str, label: str) -> float:
    """W2 of D2 without gas: 1/2 sum (2F+1)(2F'+1)/(2I+1) {F F' 2; J J I}^2 / (1 + (omega_FF'/Gamma)^2).

    The double sum over hyperfine levels of Omont, Prog. Quantum Electron. 5, 69 (1977), FROM MEMORY.
    """
    isotope = next(one for one in alkali(symbol).isotopes if one.label == label)
    I, decay = isotope.nuclear_spin, alkali(symbol).decay_rate("P3/2")
    A, B = (2e6 * math.pi * isotope.hyperfine["P3/2"][name].value for name in "AB")

    def energy(F: float) -> float:
        C = F * (F + 1) - I * (I + 1) - 3.75
        return A * C / 2 + B * (0.75 * C * (C + 1) - I * (I + 1) * 3.75) / (2 * I * (2 * I - 1) * 3)

    levels = [F for F in np.arange(abs(I - 1.5), I + 2)]
    return 0.5 * sum(
        (2 * F + 1) * (2 * G + 1) / (2 * I + 1)
        * float(wigner_6j(*map(Rational, (F, G, 2, 1.5, 1.5, I)))) ** 2
        / (1 + ((energy(F) - energy(G)) / decay) ** 2)
        for F in levels for G in levels
    )  # fmt: skip


@pytest.mark.parametrize("symbol", ["Na", "Cs", "Rb"])
def test_W2_without_gas_is_the_sum_over_hyperfine_levels(symbol):
    found = of(symbol, "none").scattering
    assert found["D1"].W2.value == 0
    for label, W2 in found["D2"].by_isotope.items():
        assert W2 == pytest.approx(naive_W2(symbol, label), rel=1e-9)


def test_W2_falls_with_pressure_and_D1_has_none():
    """D1 is exactly zero for an unpolarised ground level: common practice, no source."""
    W2 = []
    for p in (0.01, 0.1, 1.0, 10.0, 100.0, 1000.0):
        found = of("K", "Ar", pressure_torr=p).scattering
        W2.append(found["D2"].W2.value)
        assert found["D1"].W2.value == 0
    assert all(low < high for high, low in zip(W2, W2[1:], strict=False)) and W2[-1] < 1e-2 * W2[0]


def test_much_gas_scatters_like_an_atom_without_nuclear_spin():
    """Damping hides the hyperfine structure: W2 = 1/2 (Gamma + outflow)/(Gamma + loss_2), alignment per population."""
    found = of("K", "Ar", pressure_torr=1e5)
    one = found.balances["P3/2"][2]
    decay, outflow = one.radiative.value, found.models["D2"].gamma_I
    expected = 0.5 * (decay + outflow) / (decay + one.collisional.value)
    assert found.scattering["D2"].W2.value == pytest.approx(expected, rel=1e-3)


# Rates for a model, mixing --------------------------------------------------------------------------------------------


@pytest.mark.parametrize(("symbol", "gas", "pressure"), CELLS)
def test_elastic_and_inelastic_rates_make_the_collisional_width(symbol, gas, pressure):
    found = of(symbol, gas, pressure_torr=pressure)
    rates, n = fake_rates(symbol, gas, found.question.fill.temperature_K), found.question.gas_density_cm3
    for line, one in found.models.items():
        level = UPPER_LEVEL[line]
        assert one.gamma_E + one.gamma_I == pytest.approx(n * float(rates.fwhm[line].values[0]), rel=1e-12)
        assert one.gamma_I == pytest.approx(n * float(rates.transfer[level].values[0]), rel=1e-12)
        assert one.gamma_R == alkali(symbol).decay_rate(level)
        for K, D in one.depolarising.items():
            assert D + one.gamma_I == pytest.approx(found.balances[level][K].collisional.value, rel=1e-12)


def test_little_gas_repopulates_and_much_depopulates():
    """D1 of an atom with I = 3/2: (2I+1)/(1 - a/3) photons, 6 with all of the orientation returned and 4 with none."""
    kinds = {p: of("K", "Ar", pressure_torr=p).mixing["D1"] for p in (1e-3, 5.0, 1e5)}
    assert [one.pumping for one in kinds.values()] == ["repopulation", "mixed", "depopulation"]
    few, _, many = kinds.values()
    assert few.photons_per_atom == pytest.approx(6, rel=1e-3) and many.photons_per_atom == pytest.approx(4, rel=1e-3)
    for one in kinds.values():  # transfer is negligible in the invented rates
        assert one.surviving == pytest.approx(1 / (1 + one.ratio), rel=1e-5)
    assert of("K", "Ar").mixing["D2"].photons_per_atom is None


# Ground level ---------------------------------------------------------------------------------------------------------

GROUND_CELLS = [
    ("Cs", "Ar", {}),
    ("K", "Ne", {"beam_diameter_cm": 1.0}),
    ("Rb", "Xe", {"wall": "coated"}),
    ("Na", "He", {"cell": "cylinder 1 cm x 5 cm"}),
]


@pytest.mark.parametrize(("symbol", "gas", "given"), GROUND_CELLS)
def test_walls_relax_as_much_as_the_gas_at_the_crossover(symbol, gas, given):
    def sides(pressure: float) -> tuple[float, float]:
        rates = {p.name: p.rate for p in of(symbol, gas, pressure_torr=pressure, **given).ground.decays}
        return tuple(
            sum(rates[name].value for name in names if rates.get(name)) for names in ((WALL, TRANSIT), (BY_GAS, PAIRS))
        )

    found = of(symbol, gas, **given).ground
    p = found.crossover_pressure_torr
    walls, of_gas = sides(p)
    assert walls == pytest.approx(of_gas, rel=1e-6)
    below, above = sides(0.9 * p), sides(1.1 * p)
    assert below[0] > below[1] and above[0] < above[1]
    # Where diffusion rules, walls/gas ~ n^-2: half the relative error of the ratio.
    error = found.crossover_pressure_error
    assert error is not None
    at = {one.name: one.rate for one in decays_at(found, p / of(symbol, gas).question.fill.pressure_torr, None)}
    assert error > 0.4 * at[BY_GAS].error / at[BY_GAS].value
    assert of(symbol, gas, pressure_torr=3.0, **given).ground.crossover_pressure_torr == pytest.approx(p, rel=1e-6)


def test_a_step_of_the_rates_can_change_the_larger_of_walls_and_gas():
    """Spin exchange ceases to be fastest where G reaches it, and <F_z> under the gas falls from G/22 to G/32.

    With a wall of G/27 there, in a cell made for it (walls by diffusion go as 1/size^2), the gas is the larger just
    before the step and the walls just after.
    """

    def acting(pressure: float, cell: str) -> dict[str, float]:
        processes = of("Cs", "Ar", pressure_torr=pressure, cell=cell).ground.processes
        return {p.name: p.rate.value for p in processes if p.rate}

    here = acting(20.0, "sphere 25 mm")
    step = 20.0 * here[EXCHANGE] / here[BY_GAS]
    size = 25 * math.sqrt(acting(step, "sphere 25 mm")[WALL] * 27 / here[EXCHANGE])
    ground = of("Cs", "Ar", cell=f"sphere {size} mm").ground
    assert ground.crossover_pressure_torr == pytest.approx(step, rel=1e-6)
    assert ground.crossover_step == "spin exchange is fastest below it" and ground.crossover_pressure_error is None
    gas, walls = (
        [next(p.rate.value for p in decays_at(ground, x * step / 20.0, None) if p.name == name) for x in (0.999, 1.001)]
        for name in (BY_GAS, WALL)
    )
    assert gas[0] > walls[0] and gas[1] < walls[1]
    said = ground_sentence(ground)
    assert "the larger of walls and gas changes at" in said and "equally" not in said
    assert "where the rates step (spin exchange is fastest below it)" in said
    assert of("Cs", "Ar").ground.crossover_step is None


def test_an_unknown_process_is_named_and_never_counts():
    ground = of("Li", "Ne").ground
    assert set(ground.unknown) == {BY_GAS, PAIRS, BY_ALKALI}
    assert {p.name for p in ground.processes if p.rate is None and not p.reason} == set()
    assert ground.total.value == next(p.rate.value for p in ground.decays if p.name == WALL)
    assert ground.crossover_pressure_torr is None
    assert not {name for name, _ in ground.ranking} & set(ground.unknown)


def test_spin_exchange_destroys_no_orientation_but_damps_the_precession():
    ground = of("Cs", "Ar").ground
    assert EXCHANGE not in dict(ground.ranking)
    known = [p.rate.value for p in ground.decays if p.destroys and p.rate is not None]
    assert ground.total.value == pytest.approx(sum(known), rel=1e-12)
    alone, with_exchange = ground.hanle["relaxation"], ground.hanle["relaxation + spin exchange"]
    per_s = (2 * ground.isotope.nuclear_spin + 1) / (alkali("Cs").levels["S1/2"].gJ.value * RAD_S_G)
    assert alone.field_G == pytest.approx(ground.total.value * per_s, rel=1e-6)
    assert with_exchange.field_G - alone.field_G == pytest.approx(ground.exchange.value * per_s, rel=1e-6)


def test_the_pumping_light_widens_the_hanle_field_by_its_rate():
    light = {"power_W": 1e-3, "beam_diameter_cm": 1.0}
    dark = of("Cs", "Ar", beam_diameter_cm=1.0).ground
    # Too weak to break the spin temperature.
    lit, twice = (of("Cs", "Ar", **(light | {"power_W": P})).ground for P in (1e-6, 2e-6))
    assert dark.pumping is None and PUMPING not in dict(dark.ranking)
    assert lit.total.value == pytest.approx(dark.total.value, rel=1e-12)
    assert twice.pumping.value == pytest.approx(2 * lit.pumping.value, rel=1e-12)
    widened = lit.hanle["relaxation + pumping"].field_G - lit.hanle["relaxation"].field_G
    assert widened == pytest.approx(lit.pumping.value / (lit.g_F * RAD_S_G), rel=1e-6)
    assert lit.hanle["relaxation"].field_G == pytest.approx(dark.hanle["relaxation"].field_G, rel=1e-12)
    # R (1 - a/3) on the electron, a the orientation that survives in P1/2; 1/22 of it at a spin temperature, I = 7/2,
    # where 5 atm of gas hide the hyperfine structure of the ground level.
    found = of("Cs", "Ar", **(light | {"power_W": 1e-6, "pressure_torr": 3800.0, "temperature_K": 400.0}))
    assert found.lines["D1"].resolution("S1/2") == "unresolved" and found.ground.fast_exchange
    expected = found.pumping.rate.value * (1 - found.mixing["D1"].surviving / 3) / 22
    assert found.ground.pumping.value == pytest.approx(expected, rel=1e-9)
    assert "slowed by the nucleus: x 0.04545" in found.ground.pumping.source


def test_light_faster_than_spin_exchange_breaks_the_spin_temperature():
    """<F_z> under the gas: G/22 at a spin temperature of I = 7/2, 2G/64 without (closed forms)."""
    beam = {"beam_diameter_cm": 2.5}
    dark = {p.name: p.rate for p in of("Cs", "Ar", **beam).ground.processes if p.rate}
    per_W = of("Cs", "Ar", power_W=1e-6, **beam).pumping.spin.damping / 1e-6
    limit = dark[EXCHANGE].value / per_W
    for power, factor in ((0.9 * limit, 1 / 22), (1.1 * limit, 1 / 32)):
        ground = of("Cs", "Ar", power_W=power, **beam).ground
        assert ground.fast_exchange is (power < limit)
        decay = next(p.rate.value for p in ground.decays if p.name == BY_GAS)
        assert decay == pytest.approx(factor * dark[BY_GAS].value, rel=1e-9)


def test_light_that_resolves_the_ground_level_takes_whole_atoms():
    found = of("Cs", "Ar", power_W=1e-3, beam_diameter_cm=1.0)
    assert found.lines["D1"].resolution("S1/2") == "resolved"
    assert found.ground.pumping.value == found.pumping.spin.damping
    assert "takes whole atoms of one F" in found.ground.pumping.source
    # Broad light resolves nothing: slowed to 1/32 without spin exchange.
    broad = of("Cs", "Ar", power_W=1e-3, beam_diameter_cm=1.0, linewidth_GHz=50.0)
    assert not broad.ground.fast_exchange
    assert broad.ground.pumping.value == pytest.approx(broad.pumping.spin.damping / 32, rel=1e-9)
    # Whole atoms: spin exchange has no say.
    one = PumpLight(found.pumping, True)
    assert light_decay(one, found.isotope, True) == light_decay(one, found.isotope, False)


@pytest.mark.parametrize(
    ("symbol", "gas", "wall"), [("Cs", "none", "bare"), ("Rb", "none", "coated"), ("K", "He", "bare")]
)
def test_both_scales_of_field_in_one_answer(symbol, gas, wall):
    """Excited levels depolarise in gauss, a long-lived ground level near 0.01 G: common practice, no source."""
    found = of(symbol, gas, wall=wall)
    assert 1 < found.balances["P3/2"][2].hanle_free_G < 20 < 60
    assert found.ground.crossover_field_G < 0.01


def test_a_coated_wall_lets_the_orientation_live_longer():
    bare, coated = (of("Cs", "none", wall=wall).ground.total.value for wall in ("bare", "coated"))
    assert coated < 0.01 * bare


def test_zero_field_and_field_across_the_ground_level():
    still = of("Cs", "Ar", field_G=0.0).ground
    assert still.larmor == 0 and still.dominant != FIELD
    B = still.crossover_field_G
    for factor, rules in ((0.9, False), (1.1, True)):
        ground = of("Cs", "Ar", field_G=factor * B).ground
        assert (ground.larmor > ground.total.value) is rules
    assert of("Cs", "Ar", field_G=1.0).ground.dominant == FIELD


def test_hanle_curves_of_a_verdict_begin_at_its_W2_and_halve_at_its_ground_field():
    found = of("Cs", "Ar")
    curves, ground = hanle_of(found)
    at_zero = np.argmin(np.abs(curves.fields_G))
    for curve in curves.curves.values():
        assert curve.degree[at_zero] == pytest.approx(found.scattering["D2"].unpolarised, rel=1e-6)
    widest = max(one.field_G for one in found.ground.hanle.values())
    assert ground.field.field_G == pytest.approx(widest, rel=1e-9)
    # 1/(1 + (B/B_H)^2): a half at the Hanle field.
    forward = ground.fields_G >= 0
    assert np.interp(widest, ground.fields_G[forward], ground.remaining[forward]) == pytest.approx(0.5, abs=0.01)


# Warnings -------------------------------------------------------------------------------------------------------------


def words(found) -> str:
    return " ".join(found.warnings)


def test_a_field_beyond_the_treatment_names_the_criterion():
    assert "fine structure of Li" in words(of("Li", "none", field_G=2e3))
    assert "keep below 718 G" in words(of("Li", "none", field_G=2e3))
    assert "fine structure" not in words(of("Li", "none", field_G=500.0))
    assert "within a collision" in words(of("Cs", "Ar", field_G=5e5))


def test_thick_vapour_is_named_with_its_depth():
    hot = of("Cs", "none", temperature_K=400.0)
    depth = hot.trapping["D2"].optical_depth.value
    assert depth > 100 and f"D2: optical depth {depth:.3g} along the beam" in words(hot)
    assert "Radiation trapping" in words(hot) and "pumping on D2 needs a quenching gas" in words(hot)
    thin = of("Na", "none", temperature_K=350.0)
    assert "optical depth" not in words(thin) and not thin.trapping["D1"].matters
    small = of("Cs", "none", temperature_K=400.0, cell="sphere 2.5 mm")
    assert small.trapping["D2"].optical_depth.value == pytest.approx(depth / 10, rel=1e-9)


def test_too_much_gas_is_named_and_still_answered():
    found = of("Cs", "Xe", pressure_torr=5 * 760.0)
    assert found.overlap["D2"] > IMPACT_LIMIT and "impact and binary assumptions fail" in words(found)
    assert found.balances["P3/2"][2].dominant == COLLISIONS
    thin = of("Cs", "Xe", pressure_torr=0.5)
    assert thin.overlap["D2"] == pytest.approx(found.overlap["D2"] / 7600, rel=1e-9)
    assert "impact" not in words(thin)


def test_slow_collisions_make_the_nuclear_spin_no_spectator(monkeypatch):
    def heavy(*args, **named):
        return replace(fake_rates(*args, **named), reduced_mass=5e9)

    assert "spectator" not in words(of("Cs", "Ar"))
    monkeypatch.setattr(module, "collision_rates", heavy)
    assert "P3/2: the hyperfine structure turns the spins" in words(of("Cs", "Ar"))


def test_a_molten_coating_is_named():
    assert "An alkane coating melts" in words(of("Cs", "none", wall="coated", temperature_K=380.0))
    assert "coating" not in words(of("Cs", "none", wall="coated", temperature_K=310.0))
    assert "coating" not in words(of("Cs", "none", temperature_K=380.0))


def test_warnings_are_said_once():
    found = of("Cs", "Xe", pressure_torr=4e3, temperature_K=400.0, field_G=1e6, power_W=1.0, beam_diameter_cm=1.0)
    assert len(set(found.warnings)) == len(found.warnings) > 5


# A perturber of the user's own ----------------------------------------------------------------------------------------


def test_a_perturber_of_the_users_own_has_no_published_ground_rates(tmp_path):
    points = ", ".join(f"[{R}, {2000 * math.exp(-0.8 * (R - 5))}]" for R in range(5, 26))
    found = verdict(ask("Rb", "Zz", curves=curve_file(tmp_path, points, 1e-3)))
    assert found.question.gas == "Zz" and set(found.ground.unknown) >= {BY_GAS, PAIRS}
    assert found.diffusion.measured == () and found.ground.crossover_pressure_torr is None


# One real computation -------------------------------------------------------------------------------------------------


def test_real_sodium_in_helium(monkeypatch):
    """Detailed balance of the outflows (law), and a published disalignment cross section of 3P3/2."""
    monkeypatch.setattr(module, "collision_rates", REAL_RATES)
    T = 383.0
    found = of("Na", "He", temperature_K=T, pressure_torr=20.0)
    splitting = alkali("Na").fine_structure_cm1.value * 100 * codata.h * codata.c
    up, down = found.models["D1"].gamma_I, found.models["D2"].gamma_I
    assert up / down == pytest.approx(2 * math.exp(-splitting / (codata.k * T)), rel=1e-3)
    # Elbel, Kamke and Schneider, Physica 77, 137 (1974), 167 A^2, READ; the default curves are good to 20-30 %.
    published = measurements("Na", "He", "multipole_loss")[0]
    assert (published.value, published.rank, published.line_or_level) == (167, 2, "P3/2")
    expected = found.question.gas_density_cm3 * as_rate(published, found.rates.reduced_mass).value
    assert found.balances["P3/2"][2].collisional.value == pytest.approx(expected, rel=0.3)
    assert found.balances["P3/2"][2].dominant == COLLISIONS and found.scattering["D1"].W2.value == 0


@pytest.mark.slow
@pytest.mark.parametrize("symbol", ["Li", "Na", "K", "Rb", "Cs"])
@pytest.mark.parametrize("gas", ["He", "Xe"])
def test_real_rates_keep_the_laws(symbol, gas, monkeypatch):
    monkeypatch.setattr(module, "collision_rates", cache(REAL_RATES))
    thin, thick = (of(symbol, gas, pressure_torr=p) for p in (0.1, 100.0))
    assert thin.scattering["D2"].W2.value > thick.scattering["D2"].W2.value
    for line in ("D1", "D2"):
        assert thick.models[line].gamma_E > 0 and thick.models[line].gamma_I > 0
        assert all(D > 0 for D in thick.models[line].depolarising.values())
        assert thick.models[line].gamma_E == pytest.approx(1e3 * thin.models[line].gamma_E, rel=1e-9)
    for level, ranks in thick.balances.items():
        p = ranks[1].crossover_pressure_torr
        there = of(symbol, gas, pressure_torr=p).balances[level][1]
        assert there.collisional.value == pytest.approx(there.radiative.value, rel=1e-6)
