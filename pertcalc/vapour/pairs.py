"""Relaxation of the ground level by weakly bound pairs: the spin turns about N for as long as a pair lives.

H = gamma N.S; a pair forms at the rate K n/tau and turns the spin by a random angle of mean phi = gamma N tau/hbar.
notes/ground-level.md. Units: s, s^-1, cm^3, cm^-3, K.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from pertcalc.constants import BOHR_CM, KELVIN_HARTREE, MHZ_RAD_S
from pertcalc.species import COMPUTED, Isotope, Sourced
from pertcalc.units import density_cm3
from pertcalc.vapour.process import weakest_mark
from pertcalc.vapour.spin_destruction import BoundPair, bound_pair

if TYPE_CHECKING:
    from pertcalc.molecules.molecule import Molecule

PAIRS = "weakly bound pairs"
# Published pair constants state no errors: about their spread against computed constants and lifetimes (no source).
PAIR_ERROR = 0.2
# A pair with less than this part of the Rb-Ar equilibrium constant binds too little to matter.
HARDLY_BOUND = 0.01
# Where omega_hf tau is within this factor of 1, neither damping form is right; they differ by a factor 2 in <F_z>.
BETWEEN, BETWEEN_ERROR = 10.0, 0.5


@dataclass(frozen=True, slots=True)
class PairLoss:
    """Loss rate by weakly bound pairs [s^-1], or None and ``reason``; ``on_electron``: S-damping, else F-damping."""

    rate: Sourced | None
    reason: str | None = None
    note: str = ""
    on_electron: bool = False


def sticking(molecule: Molecule) -> tuple[Sourced, Sourced]:
    """Equilibrium constant and rms rotation of the ground-level pairs, bound plus metastable, from their levels.

    ``K`` as in `molecules.equilibrium`; ``N_rms^2 = sum w N(N+1)/sum w``, w = (2N+1) e^(-E/kT).

    Parameters
    ----------
    molecule : Molecule
        State X at the temperature of the cell.

    Returns
    -------
    K, N : Sourced
        [cm^3], [1]. Error of K: the curves'. Of N: its difference from that of the bound pairs alone.
    """
    levels, quasi, kT = molecule.levels, molecule.quasi, molecule.temperature_K * KELVIN_HARTREE
    N = np.concatenate([levels.N, quasi.N]).astype(float)
    weight = (2 * N + 1) * np.exp(-np.concatenate([levels.energy, quasi.energy]) / kT)
    bound = np.arange(N.size) < levels.N.size

    def rms(part: np.ndarray) -> float:
        total = weight[part].sum()
        return math.sqrt(float((weight * N * (N + 1))[part].sum() / total)) if total > 0 else 0.0

    assert molecule.equilibrium is not None  # always there for the ground level
    K = molecule.equilibrium.total * BOHR_CM**3
    model = molecule.equilibrium.model_error
    source = f"levels of X, curves {molecule.curves.id}, {molecule.temperature_K:g} K"
    mean = rms(np.full(N.size, True))
    return (
        Sourced(K, "cm^3", f"bound and metastable {source}", COMPUTED, None if model is None else K * model),
        Sourced(mean, "1", f"rms N of bound and metastable {source}", COMPUTED, abs(mean - rms(bound))),
    )


def pair_rate(K_cm3: float, density: float, lifetime_s: float, coupling_rad_s: float) -> float:
    """Loss rate by weakly bound pairs, ``(K n/tau)(2/3) phi^2/(1 + phi^2), phi = (gamma N/hbar) tau`` [s^-1].

    Formation rate times the mean of 1 - cos over an exponential life, 2/3 from all directions of N.

    Parameters: ``K_cm3`` equilibrium constant [cm^3], ``density`` n of the gas [cm^-3], ``lifetime_s`` tau [s],
    ``coupling_rad_s`` gamma N/hbar [rad/s], divided by 2I+1 for F-damping. Source: Bouchiat, Brossel & Pottier, J.
    Chem. Phys. 56, 3703 (1972), FROM MEMORY.
    """
    phi = coupling_rad_s * lifetime_s
    return K_cm3 * density / lifetime_s * (2 / 3) * phi**2 / (1 + phi**2)


def pair_lifetime_s(lifetime_torr_s: float, published_K: float, density: float, temperature_K: float) -> float:
    """Life of a pair [s] in gas of ``density`` [cm^-3] at ``temperature_K`` [K].

    tau1 [s Torr] at ``published_K`` [K] carried over with a constant break-up cross section, tau = 1/(n sigma v):
    ``tau1 (n1/n) sqrt(published_K/T)``, n1 the density of 1 Torr at ``published_K``; tau1/p at that temperature.
    """
    n1 = float(density_cm3(1.0, published_K))
    return lifetime_torr_s * n1 / density * math.sqrt(published_K / temperature_K)


def pair_loss(
    alkali: str,
    gas: str,
    isotope: Isotope,
    density: float,
    temperature_K: float,
    K: Sourced | None,
    rotation: Sourced | None,
) -> PairLoss:
    """Loss rate of one isotope by weakly bound pairs with the gas, in the damping form that holds.

    omega_hf tau > 1: the atom turns as a whole (F-damping, gamma/[I], [I] = 2I+1); else the electron spin alone.

    Parameters: ``density`` of the gas [cm^-3] > 0, ``temperature_K`` [K] > 0, ``K`` equilibrium constant [cm^3] and
    ``rotation`` rms N [1], see `sticking`; without K the published one is taken.

    Returns PairLoss, its rate [s^-1]; None with the reason where gamma, tau, K or N is not known.
    """
    pair = bound_pair(alkali, gas)
    if pair is None or pair.coupling_MHz is None or pair.lifetime_torr_s is None:
        return PairLoss(None, _no_coupling(f"{alkali}-{gas}", density, K))
    K = K or _published_equilibrium(pair, temperature_K)
    if K is None or rotation is None:
        return PairLoss(
            None, f"the {'equilibrium constant' if K is None else 'rotation'} of {alkali}-{gas} is not known"
        )
    tau = pair_lifetime_s(pair.lifetime_torr_s, pair.temperature_K, density, temperature_K)
    width = 2 * isotope.nuclear_spin + 1
    turns = abs(isotope.hyperfine["S1/2"]["A"].value) * MHZ_RAD_S * width / 2 * tau  # omega_hf tau, A (I + 1/2) apart
    as_whole = turns > 1
    coupling = pair.coupling_MHz * MHZ_RAD_S * rotation.value / (width if as_whole else 1.0)
    rate = pair_rate(K.value, density, tau, coupling)
    phi, between = coupling * tau, 1 / BETWEEN < turns < BETWEEN
    form = f"whole atom: F-damping, phi = gamma N tau/(hbar {width:g})"
    note = (
        f"on the {form if as_whole else 'electron spin: S-damping, phi = gamma N tau/hbar'} = {phi:.2g}, "
        f"N = {rotation.value:.0f}, gamma/h = {pair.coupling_MHz:g} MHz, tau = {tau:.2g} s, K = {K.value:.2g} cm^3; "
        f"errors of gamma and tau taken as {PAIR_ERROR:.0%}"
        + (f"; omega_hf tau = {turns:.2g} lies between the two forms" if between else "")
    )
    relative = _relative_error(phi, K, rotation, between)
    source = f"{pair.source}; K: {K.source}; N: {rotation.source}"
    mark = weakest_mark((pair.mark, K.mark, rotation.mark, COMPUTED))
    error = None if relative is None else rate * relative
    return PairLoss(Sourced(rate, "s^-1", source, mark, error), None, note, not as_whole)


def _relative_error(phi: float, K: Sourced, rotation: Sourced, between: bool) -> float | None:
    """Relative error of the rate; d ln/d ln tau = (1 - phi^2)/(1 + phi^2), d ln/d ln(gamma N) = 2/(1 + phi^2)."""
    if K.error is None or rotation.error is None:
        return None
    tau = PAIR_ERROR * (1 - phi**2) / (1 + phi**2)
    turning = math.hypot(PAIR_ERROR, rotation.error / rotation.value) * 2 / (1 + phi**2)
    return math.hypot(K.error / K.value, tau, turning, BETWEEN_ERROR if between else 0.0)


def _published_equilibrium(pair: BoundPair, temperature_K: float) -> Sourced | None:
    """K [cm^3] carried to a temperature as T^-3/2, the law of a well far shallower than kT."""
    if pair.equilibrium_cm3 is None:
        return None
    change = (pair.temperature_K / temperature_K) ** 1.5
    error = math.hypot(PAIR_ERROR, change - 1) * pair.equilibrium_cm3 * change
    source = f"{pair.source}, {pair.equilibrium_cm3:g} cm^3 at {pair.temperature_K:g} K times T^-3/2"
    return Sourced(pair.equilibrium_cm3 * change, "cm^3", source, pair.mark, error)


def _no_coupling(name: str, density: float, K: Sourced | None) -> str:
    """Why the pairs have no rate, and how many there are."""
    reason = f"no published spin-rotation constant of {name} pairs in the tables"
    if K is None:
        return reason
    reference = bound_pair("Rb", "Ar")
    assert reference is not None and reference.equilibrium_cm3 is not None  # a row of the shipped table
    stuck = f"K = {K.value:.2g} cm^3, {K.value * density:.1e} of the atoms are bound at any time"
    if K.value < HARDLY_BOUND * reference.equilibrium_cm3:
        return f"{name} binds too little: {stuck}, under a hundredth of what Rb-Ar would hold; {reason}"
    return f"{reason}; {stuck}"
