"""The one function that answers "what levels has this pair, and how many atoms are stuck"."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from os import PathLike

import numpy as np

from pertcalc import __version__, species
from pertcalc.constants import AMU_AU, AU_TIME_S, BOHR_CM
from pertcalc.curves.curveset import CurveSet
from pertcalc.curves.tabulated import Tabulated
from pertcalc.errors import InputError, OutOfRangeError, UnknownNameError
from pertcalc.molecules.counting import Counts, count_levels, node_counts
from pertcalc.molecules.equilibrium import (
    Equilibrium,
    Times,
    equilibrium,
    first_order_times,
    state_sum,
    thermal_volume,
)
from pertcalc.molecules.levels import Levels, bound_levels
from pertcalc.molecules.near_dissociation import NearDissociation, near_dissociation
from pertcalc.molecules.quasibound import QuasiLevels, quasibound_levels
from pertcalc.molecules.radial import (
    LIMITS,
    PARTS,
    WEIGHTS,
    Potential,
    RadialProblem,
    check_state,
    deformed_potentials,
    radial_problem,
    reduced_mass_of,
    state_problem,
)
from pertcalc.names import DEFAULT_FILL_TEMPERATURE_K, DEFAULT_PRESSURE_TORR
from pertcalc.rates import load_curves, temperatures_of
from pertcalc.units import density_cm3

DEFAULT_TEMPERATURE_K = 300.0
# An excited pair is near equilibrium when it meets this many gas atoms within the life of the free level.
COLLISIONS_FOR_EQUILIBRIUM = 10.0


@dataclass(frozen=True, slots=True)
class IsotopeCount:
    """Levels of one isotopic pair: ``alkali``, ``perturber`` labels; ``reduced_mass_u`` [u]; counts from nodes.

    ``N0`` levels of N = 0, ``total`` over all N, ``N_max`` highest N with a level (None without levels).
    """

    alkali: str
    perturber: str
    reduced_mass_u: float
    N0: int
    total: int
    N_max: int | None


@dataclass(frozen=True, slots=True)
class Molecule:
    """Everything known about one electronic state of one pair.

    ``isotopes`` named by the user; ``rotation`` N the user asked for, None for all; ``count_error`` change
    of the counts of N = 0 and of all N by the curves' stated errors [1]; ``law`` None where it does not
    apply; ``equilibrium`` None where it means nothing, with the reason in ``no_equilibrium``; ``density_cm3`` of the
    gas [cm^-3] at the fill; ``times`` None without levels; ``life`` of the free level [s], None for the ground level.
    """

    alkali: str
    noble_gas: str
    state: str
    isotopes: tuple[str, ...]
    rotation: int | None
    curves: CurveSet
    problem: RadialProblem
    levels: Levels
    quasi: QuasiLevels
    counts: Counts
    count_error: tuple[float, float] | None
    law: NearDissociation | None
    isotope_counts: tuple[IsotopeCount, ...]
    temperature_K: float
    pressure_torr: float
    fill_temperature_K: float
    equilibrium: Equilibrium | None
    no_equilibrium: str
    times: Times | None
    life: float | None
    warnings: tuple[str, ...]
    version: str = __version__

    @property
    def density_cm3(self) -> float:
        """Gas density of the fill [cm^-3]."""
        return float(density_cm3(self.pressure_torr, self.fill_temperature_K))

    @property
    def long_lived(self) -> float:
        """Constant of the metastable levels whose tunnelling life exceeds the break-up time at the fill [bohr^3]."""
        if self.equilibrium is None or self.times is None:
            return 0.0
        slow = ~(self.quasi.width * self.times.break_up > 1.0)
        volume = self.equilibrium.weight * thermal_volume(self.problem.reduced_mass, self.temperature_K)
        return volume * state_sum(self.quasi.N[slow], self.quasi.energy[slow], self.temperature_K)

    @property
    def fraction(self) -> float:
        """Part of the alkali atoms in bound or metastable pairs, n K/(1 + n K) [1]; 0 without equilibrium."""
        if self.equilibrium is None:
            return 0.0
        nK = self.density_cm3 * self.equilibrium.total * BOHR_CM**3
        return nK / (1 + nK)


def molecule(
    alkali: str,
    noble_gas: str,
    state: str = "X",
    *,
    isotopes: Sequence[str] = (),
    temperature: float = DEFAULT_TEMPERATURE_K,
    pressure_torr: float = DEFAULT_PRESSURE_TORR,
    fill_temperature_K: float = DEFAULT_FILL_TEMPERATURE_K,
    rotation: int | None = None,
    points: int | None = None,
    excited_equilibrium: bool = False,
    curves: CurveSet | str | PathLike[str] | None = None,
) -> Molecule:
    """Levels, counts and equilibrium of one electronic state of a pair.

    Parameters
    ----------
    alkali, noble_gas : str
        Symbols; with ``curves`` the perturber may be any label of the set.
    state : str
        "X", "A1/2", "A3/2" or "B".
    isotopes : sequence of str
        "87Rb", "3He": masses in place of the natural means; at most one per partner.
    temperature : float
        Of the equilibrium [K].
    pressure_torr, fill_temperature_K : float
        Of the fill, for bound fraction and times [Torr], [K].
    rotation : int, optional
        The N the user wants to see; checked against the barrier.
    points : int, optional
        Grid points of the spectral method.
    excited_equilibrium : bool
        Give the numbers of an excited state even where equilibrium means little.
    curves : CurveSet, path or None
        A set or file in place of the default.

    Returns
    -------
    Molecule

    Raises
    ------
    UnknownNameError, InputError, OutOfRangeError, DataFileError, NotConvergedError
        As their messages say.
    """
    check_state(state)
    (T,) = temperatures_of(temperature)
    loaded = load_curves(alkali, noble_gas, curves)
    masses = _isotope_masses(loaded, isotopes)
    problem = state_problem(loaded, state, reduced_mass_of(loaded, *masses))
    deformed = deformed_potentials(loaded, state)
    levels = bound_levels(problem, points, deformed)
    quasi = quasibound_levels(problem, levels, deformed)
    _check_rotation(rotation, levels, quasi)
    balance = equilibrium(problem, levels, quasi, float(T), WEIGHTS[state], deformed)
    times = _times(loaded, problem, balance, masses, float(density_cm3(pressure_torr, fill_temperature_K)))
    life = species.alkali(loaded.alkali).levels[LIMITS[state]].lifetime_ns
    life_s = None if life is None else life.value * 1e-9
    reason = "" if excited_equilibrium else _no_equilibrium(state, times, life_s)
    return Molecule(
        alkali=loaded.alkali,
        noble_gas=loaded.noble_gas,
        state=state,
        isotopes=tuple(isotopes),
        rotation=rotation,
        curves=loaded,
        problem=problem,
        levels=levels,
        quasi=quasi,
        counts=count_levels(problem, levels),
        count_error=_count_error(problem, deformed, levels),
        law=near_dissociation(problem, levels),
        isotope_counts=_isotope_counts(loaded, problem),
        temperature_K=float(T),
        pressure_torr=pressure_torr,
        fill_temperature_K=fill_temperature_K,
        equilibrium=None if reason else balance,
        no_equilibrium=reason,
        times=times,
        life=life_s,
        warnings=_warnings(loaded, state, levels, quasi),
    )


def _count_error(
    problem: RadialProblem, deformed: Mapping[str, tuple[Potential, float]], levels: Levels
) -> tuple[float, float] | None:
    """Change of the counts (N = 0, all N) by the curves' stated errors, added in quadrature; None without any."""
    if not deformed or not problem.has_well:
        return None
    first, total = [], []
    for potential, C6 in deformed.values():
        moved = radial_problem(potential, problem.reduced_mass, C6)
        counts = node_counts(moved)[0] if moved.has_well else np.zeros(1, dtype=np.int64)
        first.append(float(counts[0]) - np.count_nonzero(levels.N == 0))
        total.append(float(counts.sum()) - len(levels.N))
    return float(np.linalg.norm(first)), float(np.linalg.norm(total))


def _isotope_masses(curves: CurveSet, labels: Sequence[str]) -> tuple[float | None, float | None]:
    """Masses [u] of the named isotopes, alkali first; None where none is named."""
    own = {one.label.lower(): one.mass_u.value for one in species.alkali(curves.alkali).isotopes}
    gas = {"3he": species.noble_gas("3He").mass_u.value} if curves.noble_gas in ("He", "3He") else {}
    known = [one.label for one in species.alkali(curves.alkali).isotopes] + ["3He"] * bool(gas)
    found: dict[str, float] = {}
    for label in labels:
        wanted = label.strip().lower()
        if wanted not in own | gas:
            raise UnknownNameError(f"isotope of {curves.alkali}-{curves.noble_gas}", label.strip(), known)
        partner = "alkali" if wanted in own else "gas"
        if partner in found:
            raise InputError(f"--isotope = {', '.join(labels)}: at most one per partner; name one of them.")
        found[partner] = (own | gas)[wanted]
    return found.get("alkali"), found.get("gas")


def _isotope_counts(curves: CurveSet, problem: RadialProblem) -> tuple[IsotopeCount, ...]:
    """The counts of every natural isotope of the alkali with the gas, and with helium-3 beside helium."""
    gases: dict[str, float | None] = {curves.noble_gas: None}
    if curves.noble_gas in ("He", "3He"):
        gases = {name: species.noble_gas(name).mass_u.value for name in ("He", "3He")}
    rows = []
    for one in species.alkali(curves.alkali).isotopes:
        for gas, mass in gases.items():
            mu = reduced_mass_of(curves, one.mass_u.value, mass)
            counts = node_counts(problem.with_mass(mu))[0] if problem.has_well else np.zeros(1, dtype=np.int64)
            highest = int(np.flatnonzero(counts)[-1]) if counts.any() else None
            rows.append(IsotopeCount(one.label, gas, mu / AMU_AU, int(counts[0]), int(counts.sum()), highest))
    return tuple(rows)


def _check_rotation(rotation: int | None, levels: Levels, quasi: QuasiLevels) -> None:
    if rotation is None:
        return
    if rotation < 0:
        raise InputError(f"rotation N = {rotation} must be >= 0; give another value.")
    highest = max(int(levels.N.max(initial=0)), int(quasi.N.max(initial=0)))
    if rotation > highest:
        raise OutOfRangeError(
            "rotation N",
            rotation,
            0,
            highest,
            "(a quantum number)",
            "Beyond it the centrifugal barrier leaves neither a bound nor a quasi-bound level; ask for a smaller N.",
        )


def _times(
    curves: CurveSet,
    problem: RadialProblem,
    balance: Equilibrium,
    masses: tuple[float | None, float | None],
    density: float,
) -> Times | None:
    if balance.total == 0:
        return None  # nothing to break
    gas_u = masses[1] or curves.mass_perturber_u or species.noble_gas(curves.noble_gas).mass_u.value
    alkali_u = masses[0] or curves.mass_alkali_u or species.alkali(curves.alkali).mass_u.value
    pair = (alkali_u + gas_u) * AMU_AU
    return first_order_times(problem, balance.total, balance.temperature, density * BOHR_CM**3, pair, gas_u * AMU_AU)


def _no_equilibrium(state: str, times: Times | None, life: float | None) -> str:
    """Why no equilibrium is given for an excited state; "" where it means something."""
    if life is None or times is None:
        return ""
    met = life / (times.break_up * AU_TIME_S)
    if met >= COLLISIONS_FOR_EQUILIBRIUM:
        return ""
    return (
        f"the free {LIMITS[state]} level lives {life * 1e9:.3g} ns and a pair meets about {met:.2g} gas atoms in that "
        f"time at this fill: fewer than {COLLISIONS_FOR_EQUILIBRIUM:g} make no thermal equilibrium. "
        "--equilibrium gives the numbers all the same"
    )


def _warnings(curves: CurveSet, state: str, levels: Levels, quasi: QuasiLevels) -> tuple[str, ...]:
    found = []
    ends = [
        (name, float(curve.R[-1])) for name in PARTS[state] if isinstance(curve := curves.states[name].curve, Tabulated)
    ]
    for name, end in ends:
        beyond = int(np.count_nonzero(levels.outer > end))
        if beyond:
            found.append(
                f"{beyond} of {len(levels.v)} bound levels turn beyond R = {end:.4g} bohr, where the table of curve "
                f"{name} ends: they rest on its C_n tail"
            )
    lost = [int(N) for N in np.unique(quasi.N) if np.any(np.diff(np.sort(quasi.v[quasi.N == N])) > 1)]
    if lost:
        found.append(
            f"N = {', '.join(map(str, lost))}: quasi-bound levels near a hump between two wells were not found; sums "
            "over metastable levels miss them"
        )
    return tuple(found)
