"""How many atoms are stuck: equilibrium constants, quantum and classical, and first-order times of making and breaking.

K(T) = [pairs]/([alkali][gas]) = (2 pi hbar^2/(mu k T))^{3/2} sum (2N+1) e^{-E/kT}. Nuclear spins and, in the ground
state, the electron spin multiply pairs and free atoms alike and cancel (the partners are different atoms: no exchange
statistics); an excited curve holds ``WEIGHTS[state]`` of the states of its level. notes/pair-equilibrium.md.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from math import pi, sqrt

import numpy as np
from scipy.special import erf, gammainc

from pertcalc.constants import KELVIN_HARTREE
from pertcalc.molecules.levels import Ints, Levels, well_and_barrier
from pertcalc.molecules.quasibound import QuasiLevels
from pertcalc.molecules.radial import R_FAR, Array, Potential, RadialProblem

_POINTS = 20_000
_MOMENTA, _RADII = 240, 2400
# The least angular momentum of the classical metastable pairs, in units of the largest: below, barriers are far out
# and no higher than a thousandth of the highest.
_LEAST_MOMENTUM = 0.01


@dataclass(frozen=True, slots=True)
class Equilibrium:
    """Equilibrium constants [bohr^3] of one state at ``temperature`` [K], electronic ``weight`` [1] included.

    ``bound``, ``metastable`` from the levels; ``classical``, ``classical_metastable`` from phase space;
    ``model_error`` relative [1], from the curves' stated errors by way of the classical constant (bound), None where
    none is stated; ``numerical_error`` relative [1] of the bound constant.
    """

    temperature: float
    bound: float
    metastable: float
    classical: float
    classical_metastable: float
    weight: float
    numerical_error: float
    model_error: float | None

    @property
    def total(self) -> float:
        """Bound plus metastable [bohr^3]: what measured equilibrium constants count."""
        return self.bound + self.metastable


@dataclass(frozen=True, slots=True)
class Times:
    """First-order times of a cell, each an estimate good to about a factor two.

    ``cross_section`` pi R_e^2 [bohr^2]; ``speed`` mean speed of a pair against a gas atom [au]; ``break_up`` life of a
    pair 1/(n sigma v) [au of time]; ``formation`` mean time of a free alkali atom between two sticks, break_up/(n K)
    [au of time].
    """

    cross_section: float
    speed: float
    break_up: float
    formation: float


def thermal_volume(reduced_mass: float, temperature: float) -> float:
    """Cube of the thermal wavelength of the relative motion, (2 pi hbar^2/(mu k T))^{3/2} [bohr^3].

    Parameters: ``reduced_mass`` [electron masses], ``temperature`` [K].
    """
    return float((2 * pi / (reduced_mass * temperature * KELVIN_HARTREE)) ** 1.5)


def state_sum(N: Ints, energy: Array, temperature: float) -> float:
    """``sum (2N+1) exp(-E/kT)`` [1] over levels of rotation N [1] and energy [hartree] at ``temperature`` [K]."""
    return float(np.sum((2 * N + 1) * np.exp(-energy / (temperature * KELVIN_HARTREE))))


def classical_bound(potential: Potential, r_in: float, temperature: float) -> float:
    """Classical constant of pairs with negative energy, ``4 pi Int R^2 e^{-V/kT} P(3/2, -V/kT) dR`` over V < 0.

    Parameters
    ----------
    potential : callable
        V(R) [hartree] of R [bohr].
    r_in : float
        Where the integral starts [bohr]; in the wall.
    temperature : float
        [K]

    Returns
    -------
    float
        [bohr^3]
    """
    R = np.geomspace(r_in, 10 * R_FAR, _POINTS)
    x = np.clip(-potential(R) / (temperature * KELVIN_HARTREE), 0, None)
    return float(4 * pi * np.trapezoid(R**2 * np.exp(x) * gammainc(1.5, x), R))


def classical_metastable(problem: RadialProblem, temperature: float) -> float:
    """Classical constant of pairs with positive energy held by their centrifugal barrier.

    ``8 pi^2/(2 pi mu k T)^{3/2} Int L dL Int dR Int dp_r e^{-E/kT}`` over 0 < E < barrier(L), R inside its top.

    Parameters
    ----------
    problem : RadialProblem
    temperature : float
        [K]

    Returns
    -------
    float
        [bohr^3]
    """
    if not problem.has_well:
        return 0.0
    kT = temperature * KELVIN_HARTREE
    mu = problem.reduced_mass
    R = np.geomspace(problem.r_in, R_FAR, _RADII)
    potential = problem.potential(R)
    largest = 1.5 * sqrt(max(float(np.max(-2 * mu * potential * R * R)), 0.0)) + 1
    momenta = np.linspace(_LEAST_MOMENTUM, 1, _MOMENTA) * largest
    inner = np.zeros(_MOMENTA)
    for i, L in enumerate(momenta):
        V = potential + L * L / (2 * mu * R * R)
        bottom, top = well_and_barrier(R, V)
        if not bottom < top < len(R) - 1:
            continue
        V, barrier = V[: top + 1], V[top]
        held = erf(np.sqrt(np.clip(barrier - V, 0, None) / kT)) - erf(np.sqrt(np.clip(-V, 0, None) / kT))
        inner[i] = np.trapezoid(np.exp(-V / kT) * held, R[: top + 1])
    # Int dp_r over both directions is sqrt(2 pi mu kT) times the difference of error functions.
    return float(8 * pi**2 / (2 * pi * mu * kT) * np.trapezoid(momenta * inner, momenta))


def phase_space_count(problem: RadialProblem) -> float:
    """Classical number of bound states, ``(2/(3 pi)) Int R^2 (2 mu |V|)^{3/2} dR`` over V < 0 [1].

    It stands beside sum (2N+1) over the bound levels. Source: phase-space volume over (2 pi hbar)^3, any text.
    """
    R = np.geomspace(problem.r_in, 10 * R_FAR, _POINTS)
    k2 = np.clip(-2 * problem.reduced_mass * problem.potential(R), 0, None)
    return float(2 / (3 * pi) * np.trapezoid(R**2 * k2**1.5, R))


def equilibrium(
    problem: RadialProblem,
    levels: Levels,
    quasi: QuasiLevels,
    temperature: float,
    weight: float = 1.0,
    deformed: Mapping[str, tuple[Potential, float]] | None = None,
) -> Equilibrium:
    """Equilibrium constants of one state at one temperature.

    Parameters
    ----------
    problem : RadialProblem
    levels : Levels
        All bound levels.
    quasi : QuasiLevels
        All quasi-bound levels.
    temperature : float
        [K]; > 0.
    weight : float
        Electronic states of the curve per state of the free atom's level [1].
    deformed : mapping, optional
        Name -> (V(R) changed by one standard deviation, its C6); gives the model error.

    Returns
    -------
    Equilibrium
    """
    volume = weight * thermal_volume(problem.reduced_mass, temperature)
    classical = weight * classical_bound(problem.potential, problem.r_in, temperature) if problem.has_well else 0.0
    model = None
    if deformed and classical > 0:
        moved = (weight * classical_bound(changed, problem.r_in, temperature) for changed, _ in deformed.values())
        model = float(np.sqrt(sum((one / classical - 1) ** 2 for one in moved)))
    return Equilibrium(
        temperature,
        volume * state_sum(levels.N, levels.energy, temperature),
        volume * state_sum(quasi.N, quasi.energy, temperature),
        classical,
        weight * classical_metastable(problem, temperature),
        weight,
        # Every level moved by its largest numerical error at once.
        float(np.expm1(levels.numerical_error / (temperature * KELVIN_HARTREE))),
        model,
    )


def first_order_times(
    problem: RadialProblem, constant: float, temperature: float, density: float, pair_mass: float, gas_mass: float
) -> Times:
    """Life of a pair and time between two sticks, by the strong-collision assumption.

    Every collision of a pair with a gas atom within the pair's own size, sigma = pi R_e^2, breaks it; in equilibrium
    pairs are then made at the same rate by three-body collisions, k_3 = K sigma v.

    Parameters
    ----------
    problem : RadialProblem
        With a well.
    constant : float
        K, bound plus metastable [bohr^3].
    temperature : float
        [K]
    density : float
        Gas atoms [bohr^-3]; > 0.
    pair_mass, gas_mass : float
        [electron masses]

    Returns
    -------
    Times
    """
    mass = pair_mass * gas_mass / (pair_mass + gas_mass)
    speed = sqrt(8 * temperature * KELVIN_HARTREE / (pi * mass))
    cross_section = pi * problem.position**2
    break_up = 1 / (density * cross_section * speed)
    return Times(cross_section, speed, break_up, break_up / (density * constant) if constant > 0 else np.inf)
