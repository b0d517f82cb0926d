"""Scattering polarisability W2 of the D lines and the 90-degree degree of polarisation, with gas at any density.

``W2 = W_J G`` at zero field: W_J is what the electron alone can do (6j symbols), G <= 1 what hyperfine structure and
collisions leave of it in the excited level (`liouville.responses`). Broad-band weak light, unpolarised ground level,
fluorescence in the line of the excitation. notes/scattering-polarisability.md.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from pertcalc.angular import six_j
from pertcalc.errors import InputError, UnknownNameError
from pertcalc.species import COMPUTED, UPPER_LEVEL, Alkali, Isotope, Sourced
from pertcalc.vapour.level_rates import J_OF, LevelRates
from pertcalc.vapour.liouville import Response, responses
from pertcalc.vapour.process import weakest_mark

NATURAL = "natural"


def electronic_polarisability(J: float, J_lower: float = 0.5) -> float:
    """W2 of a line without nuclear spin and collisions, ``({1 1 2; J J J_l} / {1 1 0; J J J_l})^2`` [1].

    Parameters: ``J`` of the upper, ``J_lower`` of the lower level [hbar]. Returns 0 for J = 1/2, which has no rank 2,
    1/2 for 3/2 - 1/2, 1 for 1 - 0. InputError when they are no angular momenta or no dipole line joins them. Source:
    Omont, Prog. Quantum Electron. 5, 69 (1977), excitation and detection of state multipoles.
    """
    isotropic = six_j(1, 1, 0, J, J, J_lower)
    if not isotropic:
        raise InputError(f"J = {J:g}, J_lower = {J_lower:g}: no dipole line joins them; give J within 1 of J_lower")
    return (six_j(1, 1, 2, J, J, J_lower) / isotropic) ** 2


def degree_unpolarised(W2: float) -> float:
    """Degree of linear polarisation at 90 degrees from an unpolarised beam, ``3 W2/(4 - W2)`` [1]."""
    return 3 * W2 / (4 - W2)


def degree_linear(W2: float) -> float:
    """Degree of linear polarisation normal to the electric vector of a polarised beam, ``3 W2/(2 + W2)`` [1]."""
    return 3 * W2 / (2 + W2)


@dataclass(frozen=True, slots=True)
class Mixture:
    """Responses of the isotopes that scatter together; ``weights`` their parts of the light, sum 1 [1]."""

    responses: tuple[Response, ...]
    weights: tuple[float, ...]

    @property
    def G(self) -> NDArray[np.complex128]:
        """Response of the mixture [1], shape (len(components), nB): intensities add, so the responses do, weighted."""
        return np.asarray(sum(w * one.G for w, one in zip(self.weights, self.responses, strict=True)))

    @property
    def work(self) -> dict[str, int]:
        """Linear solves of all isotopes, and the size of the largest."""
        solves = sum(one.work["solves"] for one in self.responses)
        return {"solves": solves, "largest": max(one.work["largest"] for one in self.responses)}


def chosen_isotopes(alkali: Alkali, isotope: str | None) -> tuple[Isotope, ...]:
    """All natural isotopes, or the one with the label ``isotope``; UnknownNameError when the alkali has none such."""
    found = tuple(one for one in alkali.isotopes if isotope in (None, one.label))
    if not found:
        raise UnknownNameError(f"isotope of {alkali.symbol}", str(isotope), [one.label for one in alkali.isotopes])
    return found


def mixture(
    alkali: Alkali,
    line: str,
    rates: LevelRates,
    fields_G: ArrayLike,
    isotope: str | None = None,
    components: Sequence[int] | None = None,
) -> Mixture:
    """Rank-2 responses of the natural mixture, or of one isotope, weighted by abundance x population of the level.

    Parameters
    ----------
    alkali : Alkali
    line : str
        "D1" or "D2"; the light covers the line of every isotope.
    rates : LevelRates
        Decay, losses and gains [s^-1], the same for every isotope.
    fields_G : array, shape (nB,)
        Fields [G].
    isotope : str or None
        Label; None means the natural mixture.
    components : sequence of int, or None
        The Q wanted.

    Returns
    -------
    Mixture

    Raises
    ------
    InputError, UnknownNameError
        As `responses`; an isotope the alkali does not have.
    """
    isotopes = chosen_isotopes(alkali, isotope)
    found = tuple(responses(one, line, rates, fields_G, components=components) for one in isotopes)
    parts = [one.abundance.value * answer.population_s for one, answer in zip(isotopes, found, strict=True)]
    return Mixture(found, tuple(part / sum(parts) for part in parts))


@dataclass(frozen=True, slots=True)
class Polarisability:
    """W2 of one line.

    ``isotope`` label or "natural"; ``W2`` [1] with mark, source and, where the error of the losses was given, its
    absolute error; ``electronic`` W_J without nuclear spin and collisions [1]; ``by_isotope`` W2 of each isotope [1]
    and ``weights`` their parts of the light [1]; ``work`` of the solver.
    """

    alkali: str
    line: str
    isotope: str
    W2: Sourced
    electronic: float
    by_isotope: Mapping[str, float]
    weights: Mapping[str, float]
    work: Mapping[str, int]

    @property
    def unpolarised(self) -> float:
        """Degree of polarisation at 90 degrees, unpolarised beam [1]."""
        return degree_unpolarised(self.W2.value)

    @property
    def linear(self) -> float:
        """Degree of polarisation at 90 degrees to beam and electric vector, linearly polarised beam [1]."""
        return degree_linear(self.W2.value)


def scattering_polarisability(
    alkali: Alkali,
    line: str,
    rates: LevelRates,
    isotope: str | None = None,
    loss_error: float | None = None,
    transfer_error: float | None = None,
) -> Polarisability:
    """W2 of "D1" or "D2" at zero field, of one isotope or of the natural mixture.

    Parameters
    ----------
    alkali : Alkali
    line : str
        "D1" or "D2".
    rates : LevelRates
        Of both P levels at the density of the gas [s^-1]; `level_rates.free_rates` without gas.
    isotope : str or None
        Label; None means the natural mixture.
    loss_error, transfer_error : float or None
        Relative errors of the depolarising losses and of the transfer [1]; both None: W2 without an error.

    Returns
    -------
    Polarisability
        W2 [1]; its error covers the collision rates only (None without any): those of A, B, lifetimes are not stated.

    Raises
    ------
    InputError, UnknownNameError
        As `mixture` and `polarisability_error`.
    """
    found = mixture(alkali, line, rates, [0.0], isotope, components=(0,))
    level = UPPER_LEVEL[line]
    electronic = electronic_polarisability(J_OF[level], J_OF["S1/2"])
    by_isotope = {one.isotope: electronic * float(one.G[0, 0].real) for one in found.responses}
    weights = dict(zip(by_isotope, found.weights, strict=True))
    error = None
    collisions = any(value for ranks in rates.loss.values() for value in ranks.values())
    if collisions and (loss_error is not None or transfer_error is not None):
        error = polarisability_error(alkali, line, rates, loss_error or 0.0, transfer_error or 0.0, isotope)
    source = "steady state with hyperfine structure and collisions (notes/scattering-polarisability.md)"
    value = sum(weights[label] * W2 for label, W2 in by_isotope.items())
    W2 = Sourced(value, "1", source, _mark(alkali, level, isotope), error)
    return Polarisability(alkali.symbol, line, isotope or NATURAL, W2, electronic, by_isotope, weights, found.work)


def scaled_rates(rates: LevelRates, depolarisation: float = 1.0, transfer: float = 1.0) -> LevelRates:
    """Level rates with changed collisions: ``loss_K = t loss_0 + d (loss_K - loss_0)``, gains times t.

    Parameters: factors d ``depolarisation`` and t ``transfer`` [1], >= 0. Returns LevelRates [s^-1]. Transfer up and
    down stay in detailed balance, and the trace is conserved.
    """
    loss = {
        level: {K: transfer * ranks[0] + depolarisation * (value - ranks[0]) for K, value in ranks.items()}
        for level, ranks in rates.loss.items()
    }
    gain = {level: {K: transfer * value for K, value in ranks.items()} for level, ranks in rates.gain.items()}
    return LevelRates(rates.decay, loss, gain)


def polarisability_error(
    alkali: Alkali,
    line: str,
    rates: LevelRates,
    loss_error: float,
    transfer_error: float,
    isotope: str | None = None,
) -> float:
    """Absolute error of W2 from relative errors of the collision rates.

    Half the change of W2 between rates times 1 + e and 1 - e (not below 0), once for the depolarising part
    ``loss_K - loss_0`` of every rank, once for outflow and gains; the two add in quadrature.

    Parameters
    ----------
    alkali : Alkali
    line : str
        "D1" or "D2".
    rates : LevelRates
        [s^-1].
    loss_error, transfer_error : float
        Relative errors [1]; >= 0.
    isotope : str or None
        Label; None means the natural mixture.

    Returns
    -------
    error : float
        Absolute error of W2 [1].

    Raises
    ------
    InputError
        An error is negative or not finite.
    """
    given = {"loss_error": loss_error, "transfer_error": transfer_error}
    bad = [
        f"{name} = {value:g} must be finite and >= 0; give a relative error"
        for name, value in given.items()
        if not (math.isfinite(value) and value >= 0)
    ]
    if bad:
        raise InputError(bad)
    electronic = electronic_polarisability(J_OF[UPPER_LEVEL[line]], J_OF["S1/2"])

    def W2(depolarisation: float, transfer: float) -> float:
        changed = scaled_rates(rates, depolarisation, transfer)
        return electronic * float(mixture(alkali, line, changed, [0.0], isotope, components=(0,)).G[0, 0].real)

    halves = (
        (W2(1 + loss_error, 1.0) - W2(max(1 - loss_error, 0.0), 1.0)) / 2,
        (W2(1.0, 1 + transfer_error) - W2(1.0, max(1 - transfer_error, 0.0))) / 2,
    )
    return math.hypot(*halves)


def _mark(alkali: Alkali, level: str, isotope: str | None) -> str:
    """Mark of W2, which is computed: the weakest among it, lifetime, hyperfine constants and abundances."""
    isotopes = chosen_isotopes(alkali, isotope)
    inputs = [one.abundance for one in isotopes] + [c for one in isotopes for c in one.hyperfine[level].values()]
    lifetime = alkali.levels[level].lifetime_ns
    return weakest_mark([COMPUTED, *(one.mark for one in inputs), *([] if lifetime is None else [lifetime.mark])])
