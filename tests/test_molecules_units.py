"""The rooms of molecules/: surveys, states, isotopes, limits of what is accepted."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from pertcalc.constants import AMU_AU, HARTREE_CM1
from pertcalc.curves import fine_structure
from pertcalc.curves.curveset import Source, StateCurve
from pertcalc.curves.files import load_default
from pertcalc.curves.forms import LennardJones
from pertcalc.curves.tabulated import Tabulated
from pertcalc.errors import DataFileError, InputError, NotConvergedError, OutOfRangeError, UnknownNameError
from pertcalc.molecules import radial
from pertcalc.molecules.counting import count_levels
from pertcalc.molecules.grid import Envelope
from pertcalc.molecules.levels import MAX_POINTS, bound_levels, well_and_barrier
from pertcalc.molecules.molecule import molecule
from pertcalc.molecules.near_dissociation import near_dissociation
from pertcalc.molecules.quasibound import quasibound_levels
from pertcalc.molecules.radial import deformed_potentials, radial_problem, reduced_mass_of, state_problem
from pertcalc.species import ALKALIS
from tests.well_cases import through_well


def with_x(curve, **changes):
    """The Rb-Ar set with another ground curve."""
    base = load_default("Rb", "Ar")
    states = dict(base.states) | {"X": StateCurve(curve, Source("invented", "model"))}
    return replace(base, states=states, **changes)


def test_a_purely_repulsive_curve_has_no_level_and_is_no_error():
    problem = radial_problem(lambda R: 0.1 * np.exp(-R), 20_000.0, 0.0)
    assert not problem.has_well and problem.largest_rotation == -1
    levels = bound_levels(problem)
    assert levels.v.size == 0 and levels.count_by_rotation.size == 0
    assert quasibound_levels(problem, levels).N.size == 0
    counts = count_levels(problem, levels)
    assert counts.nodes.sum() == 0 and "nowhere attractive" in counts.remarks[0]
    assert near_dissociation(problem, levels) is None


def test_a_wall_that_turns_over_is_refused():
    # 12 cm^-1 of wall before the curve falls inwards: no bound wave function stays in the well.
    def thin(R):
        return 12 / HARTREE_CM1 * (np.exp(-((R - 7) ** 2)) - np.exp(-((R - 9.5) ** 2)))

    with pytest.raises(InputError, match="does not hold a wave function; extend the curve inwards"):
        radial_problem(thin, 2_000.0, 0.0)


@pytest.mark.parametrize("state", ["A1/2", "A3/2", "B"])
def test_excited_potentials_are_the_adiabatic_curves_from_their_own_limit(state):
    curves = load_default("Rb", "Ne")
    s = fine_structure.splitting_of(curves)
    R = np.geomspace(5.0, 60.0, 200)
    wanted = {
        "A1/2": fine_structure.lower(curves.B(R), curves.A(R), s) + 2 * s / 3,
        "A3/2": curves.A(R),
        "B": fine_structure.upper(curves.B(R), curves.A(R), s) - s / 3,
    }[state]
    problem = state_problem(curves, state)
    assert np.abs(problem.potential(R) - wanted).max() < 1e-15
    # -R^6 V tends to the mixed C6 where V is far below the splitting, without losing digits.
    far = np.array([2000.0])
    assert -problem.potential(far)[0] * 2000.0**6 == pytest.approx(problem.C6, rel=1e-3)


def test_deformed_potentials_move_one_parameter_each():
    curves = load_default("Rb", "Ar")
    moved = deformed_potentials(curves, "X")
    assert set(moved) == {"X De", "X Re", "X C6"}
    well = curves.X.well()
    deeper = moved["X De"][0](np.array([well.position]))[0]
    size = curves.states["X"].uncertainty
    # 1/(1 + (1/1.5)^8) of the change arrives at the minimum (text of deform).
    assert -deeper / well.depth == pytest.approx(1 + size["De"] / (1 + 1.5**-8), rel=1e-6)
    assert moved["X C6"][1] == pytest.approx((1 + size["C6"]) * curves.X.C6)
    assert set(deformed_potentials(curves, "A1/2")) >= {"A De", "B C6"}


def test_model_errors_are_first_order_changes_of_the_energies():
    curves = load_default("Rb", "Kr")
    problem = state_problem(curves, "X")
    moved = deformed_potentials(curves, "X")
    small = {"De": (lambda R: problem.potential(R) * (1 + 1e-4), problem.C6)}
    levels = bound_levels(problem, deformed=small)
    other = bound_levels(radial_problem(small["De"][0], problem.reduced_mass, problem.C6 * (1 + 1e-4)))
    here, there = levels.N == 0, other.N == 0
    assert np.abs(levels.energy[here] - other.energy[there]) == pytest.approx(levels.model_error[here], rel=0.01)
    assert bound_levels(problem, deformed=moved).model_error[0] > 5 / HARTREE_CM1


def test_the_envelope_is_above_the_well_everywhere():
    for pair, state in ((("Rb", "Ar"), "X"), (("Cs", "Xe"), "A1/2"), (("Li", "Kr"), "B")):
        problem = state_problem(load_default(*pair), state)
        R = np.geomspace(problem.r_in, 400, 3000)
        wave_number = np.sqrt(2 * problem.reduced_mass * np.clip(-problem.potential(R), 0, None))
        assert np.all(Envelope.around(problem).wave_number(R)[0] >= wave_number)


def test_derivatives_of_the_envelope():
    envelope, R, h = Envelope(3000.0, 5e5), np.linspace(6, 60, 40), 1e-4
    g, first, second = envelope.wave_number(R)
    up, down = envelope.wave_number(R + h)[0], envelope.wave_number(R - h)[0]
    assert first == pytest.approx((up - down) / (2 * h), rel=1e-5)
    assert second == pytest.approx((up - 2 * g + down) / h**2, rel=1e-3)


def test_well_and_barrier_take_the_highest_point_outside_the_deepest():
    R = np.linspace(1, 20, 2000)
    V = 50 / R**6 - 5 * np.exp(-((R - 3) ** 2)) + 1.0 * np.exp(-((R - 7) ** 2)) + 0.4 * np.exp(-((R - 12) ** 2))
    bottom, top = well_and_barrier(R, V)
    assert R[bottom] == pytest.approx(3.0, abs=0.1) and R[top] == pytest.approx(7.0, abs=0.1)
    assert well_and_barrier(R, 1 / R) == (1999, 1999)


def test_two_wells_with_a_hump_hold_quasi_bound_levels_without_rotation():
    # The A1/2 curve of Rb-He has a barrier of its own: levels between limit and hump, v counted inside it.
    problem = state_problem(load_default("Rb", "He"), "A1/2")
    quasi = quasibound_levels(problem, bound_levels(problem))
    here = quasi.N == 0
    assert here.sum() >= 1 and np.all(quasi.energy[here] < quasi.barrier[here])


def test_reduced_masses_and_isotopes():
    curves = through_well("Li", "He")
    m6, m3 = 6.0151228874, 3.0160293201  # atomic masses [u], FROM MEMORY (AME)
    assert reduced_mass_of(curves, m6, m3) == pytest.approx(m6 * m3 / (m6 + m3) * AMU_AU)
    heavy, light = (molecule("Li", "He", curves=curves, isotopes=i) for i in ((), ("6Li", "3He")))
    assert light.problem.reduced_mass < heavy.problem.reduced_mass
    assert light.problem.reduced_mass == pytest.approx(reduced_mass_of(curves, m6, m3), rel=1e-6)
    # Helium-3 is too light: no level; helium-4 holds one.
    assert {(one.alkali, one.perturber): one.total for one in heavy.isotope_counts} == {
        ("6Li", "He"): 1,
        ("6Li", "3He"): 0,
        ("7Li", "He"): 1,
        ("7Li", "3He"): 0,
    }
    assert len(light.levels.v) == 0 and len(heavy.levels.v) == 1


def test_heavier_isotopes_hold_at_least_as_many_levels():
    for pair in (("Rb", "Kr"), ("Li", "Ar"), ("K", "Xe")):
        rows = molecule(*pair).isotope_counts
        totals = [row.total for row in sorted(rows, key=lambda row: row.reduced_mass_u)]
        assert totals == sorted(totals)


@pytest.mark.parametrize(
    ("isotopes", "error", "message"),
    [
        (["40Ar"], UnknownNameError, "Known: 85Rb, 87Rb"),
        (["3He"], UnknownNameError, "isotope of Rb-Ar '3He' is not known"),
        (["85Rb", "87Rb"], InputError, "at most one per partner"),
    ],
)
def test_isotopes_that_are_refused(isotopes, error, message):
    with pytest.raises(error, match=message):
        molecule("Rb", "Ar", isotopes=isotopes)


def test_unknown_states_and_rotations_beyond_the_barrier():
    with pytest.raises(UnknownNameError, match="Known: X, A1/2, A3/2, B"):
        molecule("Rb", "Ar", "C")
    with pytest.raises(OutOfRangeError, match="rotation N = 400 .*ask for a smaller N"):
        molecule("Rb", "Ar", rotation=400)
    with pytest.raises(InputError, match="must be >= 0"):
        molecule("Rb", "Ar", rotation=-2)


def test_wells_too_deep_for_the_grid():
    curve = LennardJones(0.5, 10.0)
    with pytest.raises(OutOfRangeError, match=f"outside 1 .. {MAX_POINTS} points.*check the units"):
        bound_levels(radial_problem(curve, 60_000.0, curve.C6))
    with pytest.raises(InputError, match="the well is too deep for fewer"):
        molecule("Rb", "Ar", points=30)


def test_a_grid_that_does_not_converge_says_so():
    # A step in the potential: exponential convergence is lost, the chosen number of points cannot give the tolerance.
    def step(R):
        return np.where(R < 8, 0.05 * np.exp(-(R - 8)), np.where(R < 9.03, -2e-4, 0.0))

    with pytest.raises(NotConvergedError, match="the lowest level .* did not converge"):
        bound_levels(radial_problem(step, 20_000.0, 0.0), points=60)


def test_tables_that_end_inside_the_well_are_refused():
    De, Re = 40 / HARTREE_CM1, 10.6

    def table(end: float) -> Tabulated:
        R = np.linspace(7.5, end, 60)
        V = De * ((Re / R) ** 12 - 2 * (Re / R) ** 6)
        return Tabulated(R, V, C6=2 * De * Re**6)

    with pytest.raises(DataFileError, match="states.X.points end at R = 11.5 bohr inside the classically allowed"):
        state_problem(with_x(table(11.5)), "X")
    whole = state_problem(with_x(table(25.0)), "X")
    # The table's tail is the curve itself: as many levels as the analytic curve holds.
    analytic = LennardJones(De, Re)
    direct = radial_problem(analytic, whole.reduced_mass, analytic.C6)
    assert len(bound_levels(whole).v) == len(bound_levels(direct).v)


def test_levels_beyond_the_end_of_a_table_are_counted_in_a_warning():
    found = molecule("Rb", "Ar", "B")
    assert any("rest on its C_n tail" in warning for warning in found.warnings)
    found = molecule("Rb", "Ar")
    beyond = int(np.sum(found.levels.outer > found.curves.X.R[-1]))
    assert beyond > 0 and any(f"{beyond} of {len(found.levels.v)} bound levels" in one for one in found.warnings)
    # An analytic curve has no end.
    assert molecule("Rb", "Ar", curves=through_well("Rb", "Ar")).warnings == ()


def test_excited_pairs_get_an_equilibrium_only_where_it_means_something():
    thin = molecule("Rb", "He", "A1/2")
    assert thin.equilibrium is None and "--equilibrium" in thin.no_equilibrium
    assert molecule("Rb", "He", "A1/2", excited_equilibrium=True).equilibrium is not None
    dense = molecule("Rb", "He", "A1/2", pressure_torr=3000.0)
    assert dense.equilibrium is not None and dense.no_equilibrium == ""
    # Two of the four states of P3/2 lead to the A3/2 curve.
    assert molecule("Rb", "He", "A3/2", pressure_torr=3000.0).equilibrium.weight == 0.5


def test_fraction_and_times_follow_the_density():
    one, ten = (molecule("Rb", "Ar", pressure_torr=p) for p in (10.0, 100.0))
    assert ten.fraction == pytest.approx(10 * one.fraction, rel=1e-3)
    assert one.times.break_up == pytest.approx(10 * ten.times.break_up, rel=1e-12)
    assert one.times.formation == pytest.approx(100 * ten.times.formation, rel=1e-12)
    assert 0 < one.long_lived < one.equilibrium.metastable
    # Where collisions break a pair sooner, broader levels still outlast them.
    assert ten.long_lived >= one.long_lived


def test_default_curves_pass_the_check_of_tables():
    for alkali in ALKALIS:
        for gas in ("He", "Ne", "Ar", "Kr", "Xe"):
            for state in radial.STATES:
                assert state_problem(load_default(alkali, gas), state).reduced_mass > 0


def test_a_table_may_end_deep_in_its_well_where_its_tail_goes_on():
    # A well of 0.8 cm^-1 far out: more than 30 % of it is left at the last point, but C6 alone gives that within 10 %.
    De, Re = 0.8 / HARTREE_CM1, 16.0

    def table(end: float) -> Tabulated:
        R = np.linspace(11.0, end, 60)
        return Tabulated(R, De * ((Re / R) ** 12 - 2 * (Re / R) ** 6), C6=2 * De * Re**6)

    whole = state_problem(with_x(table(21.6)), "X")
    analytic = LennardJones(De, Re)
    assert -float(analytic(21.6)) > radial.DEEP_END * De
    direct = radial_problem(analytic, whole.reduced_mass, analytic.C6)
    found, wanted = bound_levels(whole), bound_levels(direct)
    assert np.array_equal(found.N, wanted.N) and len(found.v) > 1
    assert found.energy[0] == pytest.approx(wanted.energy[0], rel=0.01)
    with pytest.raises(DataFileError, match="end at R = 18 bohr inside"):
        state_problem(with_x(table(18.0)), "X")


@pytest.mark.slow
@pytest.mark.parametrize("alkali", ["Li", "Na", "K", "Rb", "Cs"])
def test_spectrum_and_nodes_agree_for_every_default_curve(alkali):
    for gas in ("He", "Ne", "Ar", "Kr", "Xe"):
        for state in radial.STATES:
            problem = state_problem(load_default(alkali, gas), state)
            levels = bound_levels(problem)
            counts = count_levels(problem, levels)
            # They may differ by a level that the grid does not tell from the limit (Li-Ar A1/2: a crossing of A and B
            # hardly avoided); then the output names the N.
            for N in np.flatnonzero(counts.spectral != counts.nodes):
                assert abs(counts.spectral[N] - counts.nodes[N]) == 1, f"{alkali}-{gas} {state}"
                assert levels.energy[levels.N == N].max() > -3 * levels.numerical_error, f"{alkali}-{gas} {state}"
                assert any(f"N = {N}:" in remark for remark in counts.remarks)
            assert np.sum(counts.spectral != counts.nodes) <= 1
            assert counts.agree or counts.remarks


def test_an_inner_well_shallower_than_the_outer_one_is_not_cut_off():
    # Issue 4: the wall was once sought inside the deepest well, so the hump before it was taken for the wall.
    def two_wells(R):
        wall = np.exp(-8 * (R - 5.5))
        wells = 60 * np.exp(-((R - 7) ** 2)) + 90 * np.exp(-((R - 13) ** 2) / 4)
        return wall - (wells - 50 * np.exp(-((R - 10) ** 2))) / HARTREE_CM1

    problem = radial_problem(two_wells, 40_000.0, 0.0)
    assert problem.r_in < 6.5 and problem.position == pytest.approx(13.0, abs=0.1)
    levels = bound_levels(problem)
    counts = count_levels(problem, levels)
    assert np.array_equal(counts.spectral, counts.nodes)
    inner = levels.extent < 9.0
    assert inner.any() and not inner.all()
