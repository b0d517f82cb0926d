"""Records of alkalis and gases: complete birth certificates, inner consistency, lookup and its errors."""

from __future__ import annotations

import dataclasses
import math
import pickle

import pytest

from pertcalc import species
from pertcalc.errors import DataFileError, InputError, UnknownNameError
from pertcalc.species import ALKALIS, ISOTOPES, LEVELS, MARKS, SPECIES_GASES, UPPER_LEVEL, Sourced

RECORDS = [species.alkali(symbol) for symbol in ALKALIS] + [species.noble_gas(symbol) for symbol in SPECIES_GASES]
ALKALI_RECORDS = RECORDS[: len(ALKALIS)]
by_symbol = pytest.mark.parametrize("atom", ALKALI_RECORDS, ids=ALKALIS)


def walk(node: object, where: str):
    """Yield (path, leaf) of everything in a record; a Sourced is a leaf."""
    if dataclasses.is_dataclass(node) and not isinstance(node, Sourced):
        for field in dataclasses.fields(node):
            yield from walk(getattr(node, field.name), f"{where}.{field.name}")
    elif isinstance(node, dict):
        for key, child in node.items():
            yield from walk(child, f"{where}.{key}")
    elif isinstance(node, tuple):
        for index, child in enumerate(node):
            yield from walk(child, f"{where}[{index}]")
    else:
        yield where, node


@pytest.mark.parametrize("record", RECORDS, ids=[r.symbol for r in RECORDS])
def test_every_number_of_every_record_has_unit_source_and_mark(record):
    numbers = 0
    for where, leaf in walk(record, record.symbol):
        if isinstance(leaf, Sourced):
            numbers += 1
            assert math.isfinite(leaf.value), where
            assert leaf.unit.strip() and leaf.source.strip(), where
            assert leaf.mark in MARKS, where
            assert leaf.mark != "READ" or "http" in leaf.source, f"{where}: READ without an address"
            assert leaf.error is None or leaf.error > 0, where
        else:  # names only: a bare number would be one without a birth certificate
            assert leaf is None or isinstance(leaf, str), f"{where} = {leaf!r} is not a Sourced"
    assert numbers >= (30 if record.symbol in ALKALIS else 9)


def test_only_what_symmetry_forbids_is_missing():
    for atom in ALKALI_RECORDS:
        missing = {where for where, leaf in walk(atom, "") if leaf is None}
        assert missing == {
            ".levels.S1/2.lifetime_ns",
            ".levels.S1/2.linewidth_MHz",
            ".levels.S1/2.tensor_polarizability_au",
            ".levels.P1/2.tensor_polarizability_au",
        }


@by_symbol
def test_polarizabilities_of_ground_levels_are_read(atom):
    assert atom.polarizability_au.mark == "READ"
    assert atom.polarizability_au is atom.levels["S1/2"].polarizability_au


def test_polarizabilities_of_gases_are_read():
    assert {species.noble_gas(symbol).polarizability_au.mark for symbol in SPECIES_GASES} == {"READ"}


@by_symbol
def test_abundances_sum_to_one_within_their_printed_digits(atom):
    # 0.01 % is the last printed digit of the least precise abundances that are not exact (K: 93.26 and 6.73 %).
    assert sum(one.abundance.value for one in atom.isotopes) == pytest.approx(1, abs=1e-4)
    assert all(0 < one.abundance.value <= 1 for one in atom.isotopes)


@by_symbol
def test_splitting_is_the_difference_of_the_levels(atom):
    difference = atom.levels["P3/2"].term_cm1.value - atom.levels["P1/2"].term_cm1.value
    assert atom.fine_structure_cm1.value == pytest.approx(difference, abs=6e-4)  # printed to 0.001 cm^-1


@by_symbol
@pytest.mark.parametrize("level", ["P1/2", "P3/2"])
def test_linewidth_is_that_of_the_lifetime(atom, level):
    record = atom.levels[level]
    width = 1e3 / (2 * math.pi * record.lifetime_ns.value)
    assert record.linewidth_MHz.value == pytest.approx(width, abs=6e-4)  # printed to 0.001 MHz
    assert atom.decay_rate(level) * record.lifetime_ns.value == pytest.approx(1e9)


@by_symbol
@pytest.mark.parametrize("line", ["D1", "D2"])
def test_f_lifetime_and_wavelength_agree(atom, line):
    # Independent form of the same law: A = 6.670e15 s^-1 f g_l/g_u / (lambda/angstrom)^2 (printed in atomic tables).
    weights = {"D1": 1.0, "D2": 0.5}[line]
    rate = 6.6702e15 * atom.oscillator_strength[line].value * weights / (10 * atom.line_wavelength_nm(line)) ** 2
    assert rate == pytest.approx(atom.decay_rate(UPPER_LEVEL[line]), rel=1e-4)
    assert atom.oscillator_strength[line].mark == "COMPUTED"


@by_symbol
def test_resonance_lines_give_the_static_polarizability(atom):
    # Sum rule: alpha = sum f/omega^2 + core; the D lines hold nearly all of it. Uses lifetimes, terms, alpha, core.
    omega = {line: atom.levels[UPPER_LEVEL[line]].term_cm1.value / 219474.63 for line in UPPER_LEVEL}
    valence = sum(atom.oscillator_strength[line].value / omega[line] ** 2 for line in UPPER_LEVEL)
    assert valence + atom.core_polarizability_au.value == pytest.approx(atom.polarizability_au.value, rel=0.02)


@by_symbol
def test_model_polarizability_agrees_with_the_read_one(atom):
    assert atom.one_electron_model["alpha_d_s"].value == pytest.approx(atom.polarizability_au.value, rel=0.006)
    assert {value.mark for value in atom.one_electron_model.values()} == {"COMPUTED"}


@by_symbol
def test_model_and_published_p_polarizabilities_agree(atom):
    p12, p32 = (atom.levels[level].polarizability_au.value for level in ("P1/2", "P3/2"))
    assert atom.one_electron_model["alpha_d_p"].value == pytest.approx((p12 + 2 * p32) / 3, rel=0.02)


@by_symbol
def test_natural_mean_mass_lies_between_the_isotopes(atom):
    masses = [one.mass_u.value for one in atom.isotopes]
    assert min(masses) <= atom.mass_u.value <= max(masses)
    assert atom.mass_u.mark == "COMPUTED"
    assert all(abs(one.mass_u.value - int(one.label.rstrip("LiNaKRbCs"))) < 0.1 for one in atom.isotopes)


@by_symbol
def test_hyperfine_constants_follow_the_nuclear_moment(atom):
    # A(J)/A(S1/2) is electronic, so isotopes share it up to the hyperfine anomaly (< 1 %).
    for level in ("P1/2", "P3/2"):
        ratios = [one.hyperfine[level]["A"].value / one.hyperfine["S1/2"]["A"].value for one in atom.isotopes]
        assert max(ratios) == pytest.approx(min(ratios), rel=0.01)


@by_symbol
def test_quadrupole_constant_is_zero_where_forbidden_and_only_there(atom):
    for one in atom.isotopes:
        assert set(one.hyperfine) == set(LEVELS)
        assert [one.hyperfine[level]["B"].value == 0 for level in LEVELS] == [True, True, False]


@by_symbol
def test_levels_know_their_j_and_lande_factor(atom):
    # Lande with g_S = 2.002319: gJ(P1/2) = (4 - g_S)/3, gJ(P3/2) = (2 + g_S)/3; ground level within 1.2e-4 of g_S.
    g_s = 2.00231930436
    assert [atom.levels[name].J for name in LEVELS] == [0.5, 0.5, 1.5]
    assert atom.levels["P1/2"].gJ.value == pytest.approx((4 - g_s) / 3, abs=6e-5)
    assert atom.levels["P3/2"].gJ.value == pytest.approx((2 + g_s) / 3, abs=6e-5)
    assert atom.levels["S1/2"].gJ.value == pytest.approx(g_s, rel=1.2e-4)
    assert [atom.levels[name].term[1:] for name in LEVELS] == list(LEVELS)


def test_masses_charges_and_sizes_rise_along_the_columns():
    for records, quantities in (
        (ALKALI_RECORDS, ("mass_u", "polarizability_au", "core_polarizability_au", "fine_structure_cm1")),
        (RECORDS[5:6] + RECORDS[7:], ("mass_u", "polarizability_au", "C6_homonuclear_au", "C8_homonuclear_au")),
    ):
        for quantity in quantities:
            values = [getattr(record, quantity).value for record in records]
            nearly = [value * 1.01 for value in values]  # alpha(Na) = 163(1) is just below alpha(Li) = 164
            assert all(low < high for low, high in zip(values, nearly[1:], strict=False)), quantity
    assert [species.noble_gas(symbol).Z for symbol in SPECIES_GASES] == [2, 2, 10, 18, 36, 54]


def test_helium_3_shares_the_electrons_of_helium_but_not_its_mass():
    light, heavy = species.noble_gas("3He"), species.noble_gas("He")
    assert light.mass_u.value / heavy.mass_u.value == pytest.approx(0.7535, abs=1e-4)
    assert light.polarizability_au.value == heavy.polarizability_au.value
    assert "4He" in light.C6_homonuclear_au.source


def test_names_are_found_in_any_case_and_records_are_shared():
    assert species.alkali(" rb ") is species.alkali("RB") is species.alkali("Rb")
    assert species.noble_gas("3HE") is species.noble_gas("3he")
    assert species.isotope("87RB").label == "87Rb"
    assert "".join(species.isotope(label).symbol for label in ISOTOPES) == "LiLiNaKKKRbRbCs"
    assert {one.label for atom in ALKALI_RECORDS for one in atom.isotopes} == set(ISOTOPES)


@pytest.mark.parametrize("record", [species.alkali("K"), species.noble_gas("3He"), species.isotope("40K")])
def test_records_can_be_sent_to_other_processes(record):
    assert pickle.loads(pickle.dumps(record)) == record


def test_ground_level_does_not_decay():
    assert species.alkali("K").decay_rate("S1/2") == 0.0


@pytest.mark.parametrize(
    "call, name, near",
    [
        (species.alkali, "Rbb", "Did you mean Rb"),
        (species.alkali, "rubidium", "Did you mean Rb"),
        (species.noble_gas, "Xi", "Did you mean Xe"),
        (species.noble_gas, "4He", "He"),
        (species.isotope, "rb87", "Did you mean 87Rb"),
        (species.noble_gas, "N2", "Known: He, 3He, Ne, Ar, Kr, Xe"),
        (species.alkali, "", "Known: Li, Na, K, Rb, Cs"),
        (species.alkali("K").line_wavelength_nm, "D3", "Did you mean D"),
        (species.alkali("K").decay_rate, "P5/2", "Did you mean P"),
    ],
)
def test_unknown_names_get_one_error_with_the_nearest_name(call, name, near):
    with pytest.raises(UnknownNameError) as caught:
        call(name)
    assert near in str(caught.value) and caught.value.exit_code == 2


@pytest.mark.parametrize("call", [species.alkali, species.noble_gas, species.isotope])
@pytest.mark.parametrize("name", [None, 87, ["Rb"]])
def test_names_that_are_not_text_get_an_input_error(call, name):
    with pytest.raises(InputError, match="must be text"):
        call(name)


@pytest.mark.parametrize(
    "node",
    [
        {"value": 1.0, "unit": "u", "source": "s"},
        {"value": 1.0, "unit": "u", "source": "s", "mark": "GUESSED"},
        {"value": 1.0, "unit": "u", "source": "", "mark": "READ"},
        {"value": 1.0, "unit": "", "source": "s", "mark": "READ"},
        {"value": math.nan, "unit": "u", "source": "s", "mark": "READ"},
    ],
)
def test_a_value_without_a_full_birth_certificate_is_refused(node):
    with pytest.raises(DataFileError, match="Xx: mass_u"):
        species._sourced(node, "Xx: mass_u", "xx.toml")
