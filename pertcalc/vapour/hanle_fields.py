"""Hanle fields of every level and rank, the criterion which of them to use, and the fields the treatment stops at.

A Hanle field needs a g factor, and there are two. g_J stands where the nuclear spin is decoupled by the field, or
where hyperfine structure is not resolved within the damping; g_F where each F precesses on its own. `regime` tells
which applies; between the two only the curve of `hanle.hanle_curves` is right. notes/hanle.md.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from itertools import combinations, pairwise

from scipy.constants import c

from pertcalc import constants
from pertcalc.angular import nine_j
from pertcalc.errors import InputError, UnknownNameError
from pertcalc.species import Alkali, Isotope, alkali
from pertcalc.vapour.fill import hanle_field_G, larmor_rad_s
from pertcalc.vapour.level_rates import J_OF, P_LEVELS, LevelRates
from pertcalc.vapour.liouville import level_structure
from pertcalc.vapour.process import weakest_mark

ELECTRONIC = "g_J: nuclear spin decoupled, unresolved or absent"
RESOLVED = "g_F: hyperfine structure resolved, field below decoupling"
# Two frequencies are told apart by this factor: a coherence at 3 times the width keeps 1/(1 + 3^2) = 10 %.
CLEAR = 3.0
# Above this part of the fine structure, or of a radian within a collision, a dropped term is no longer small.
SMALL = 0.1


@dataclass(frozen=True, slots=True)
class HanleField:
    """Field at which one multipole turns by one radian in its lifetime, ``B = hbar (Gamma + loss) / (g mu_B)``.

    ``F`` and ``isotope`` None for the electronic multipole, whose field uses g_J; ``basis`` says in words which g
    factor ``g`` [1] is; ``decay`` radiative or other damping and ``loss`` collisional [s^-1]; ``mark`` of the inputs.
    """

    level: str
    rank: int
    isotope: str | None
    F: float | None
    basis: str
    g: float
    decay: float
    loss: float
    mark: str

    @property
    def free_G(self) -> float:
        """Hanle field without collisions [G]."""
        return hanle_field_G(abs(self.g), self.decay)

    @property
    def field_G(self) -> float:
        """Hanle field with collisions [G]."""
        return hanle_field_G(abs(self.g), self.decay + self.loss)

    def half_width_G(self, Q: int) -> float:
        """Half width of the signal of component Q [G], ``B/Q``: B/2 for linear polarisation across the field."""
        if not 1 <= Q <= self.rank:
            raise InputError(f"Q = {Q} must be 1 ... {self.rank}: other components do not precess; give another Q")
        return self.field_G / Q

    def relative_error(self, loss_error: float) -> float:
        """Relative error of ``field_G`` [1] for that of the loss [1]; the decay is taken as exact."""
        return loss_error * self.loss / (self.decay + self.loss)


def g_factor_F(g_J: float, J: float, I: float, F: float) -> float | None:
    """g factor of a hyperfine level, ``g_J [F(F+1) + J(J+1) - I(I+1)] / [2F(F+1)]`` [1]; None for F = 0.

    Parameters: ``g_J`` [1]; ``J``, ``I``, ``F`` [hbar]. g_I is neglected. Source: any text on hyperfine structure.
    """
    if F == 0:
        return None
    return g_J * (F * (F + 1) + J * (J + 1) - I * (I + 1)) / (2 * F * (F + 1))


def loss_of_F(J: float, I: float, F: float, rank: int, loss: Mapping[int, float]) -> float:
    """Collisional loss of the multipole ``rank`` of one hyperfine level [s^-1], return from the other F left out.

    ``sum_{k kappa} (2F+1)^2 (2k+1)(2kappa+1) {J I F; J I F; k kappa K}^2 loss_k``: a mean of the electronic losses.

    Parameters: ``J``, ``I``, ``F`` [hbar]; ``rank`` K <= 2F; ``loss`` k = 0 ... 2J -> total loss [s^-1]. Source: Omont,
    Prog. Quantum Electron. 5, 69 (1977), spectator nuclear spin.
    """
    return sum(
        (2 * F + 1) ** 2 * (2 * k + 1) * (2 * kappa + 1) * nine_j(J, I, F, J, I, F, k, kappa, rank) ** 2 * loss[k]
        for k in range(round(2 * J) + 1)
        for kappa in range(round(2 * I) + 1)
    )


def hanle_fields(element: Alkali, level: str, rates: LevelRates, isotope: str | None = None) -> tuple[HanleField, ...]:
    """Hanle fields of "P1/2" or "P3/2": electronic of every rank, then ranks 1 and 2 of every F of the isotopes.

    Parameters
    ----------
    element : Alkali
    level : str
        "P1/2" or "P3/2".
    rates : LevelRates
        Decay and losses [s^-1].
    isotope : str or None
        Only the F levels of this isotope; None means of all.

    Returns
    -------
    tuple of HanleField
        Levels with F = 0 or g_F = 0 do not precess and are left out.

    Raises
    ------
    UnknownNameError
        Another level, or an isotope the alkali does not have.
    """
    if level not in P_LEVELS:
        raise UnknownNameError("level", str(level), P_LEVELS)
    isotopes = [one for one in element.isotopes if isotope in (None, one.label)]
    if not isotopes:
        raise UnknownNameError(f"isotope of {element.symbol}", str(isotope), [one.label for one in element.isotopes])
    J, record = J_OF[level], element.levels[level]
    decay, loss = rates.decay[level], rates.loss[level]
    mark = weakest_mark([record.gJ.mark] + ([] if record.lifetime_ns is None else [record.lifetime_ns.mark]))
    found = [
        HanleField(level, K, None, None, ELECTRONIC, record.gJ.value, decay, loss[K], mark)
        for K in range(1, round(2 * J) + 1)
    ]
    for one in isotopes:
        for F in level_structure(one, level).energies():
            g = g_factor_F(record.gJ.value, J, one.nuclear_spin, F)
            if g:
                found += [
                    HanleField(
                        level, K, one.label, F, RESOLVED, g, decay, loss_of_F(J, one.nuclear_spin, F, K, loss), mark
                    )
                    for K in range(1, min(2, round(2 * F)) + 1)
                ]
    return tuple(found)


def ground_hanle_field(isotope: Isotope, damping_s: float) -> HanleField:
    """Hanle field of the ground-level orientation, ``hbar gamma (2I+1) / (g_J mu_B)``.

    Parameters
    ----------
    isotope : Isotope
    damping_s : float
        Damping rate gamma of the orientation by whatever damps it [s^-1]; > 0.

    Returns
    -------
    HanleField
        Of F = I + 1/2 with g_F = g_J/(2I+1), which is 2/(2I+1) within 0.2 %; F = I - 1/2 turns the other way.

    Raises
    ------
    InputError
        The damping is not finite or not positive.
    """
    if not (math.isfinite(damping_s) and damping_s > 0):
        raise InputError(f"damping = {damping_s:g} s^-1 must be finite and > 0; give the ground-level relaxation rate")
    gJ = alkali(isotope.symbol).levels["S1/2"].gJ
    F = isotope.nuclear_spin + 0.5
    return HanleField("S1/2", 1, isotope.label, F, RESOLVED, gJ.value / (2 * F), damping_s, 0.0, gJ.mark)


@dataclass(frozen=True, slots=True)
class Regime:
    """Hyperfine structure of one level against damping and field.

    ``smallest``, ``largest`` hyperfine splitting [rad/s]; ``width`` decay plus loss [s^-1]; ``larmor`` electronic
    Larmor frequency [rad/s].
    """

    level: str
    isotope: str
    smallest: float
    largest: float
    width: float
    larmor: float

    @property
    def structure(self) -> str:
        """ "resolved", "partly resolved" or "unresolved" within the width, each by the factor CLEAR."""
        if self.largest * CLEAR <= self.width:
            return "unresolved"
        return "resolved" if self.smallest >= CLEAR * self.width else "partly resolved"

    @property
    def nucleus(self) -> str:
        """ "coupled", "intermediate" or "decoupled" by the field, each by the factor CLEAR."""
        if self.larmor >= CLEAR * self.largest:
            return "decoupled"
        return "coupled" if self.larmor * CLEAR <= self.smallest else "intermediate"

    @property
    def g_factor(self) -> str | None:
        """Which Hanle field holds: "g_J", "g_F", or None when neither does and only the full curve is right."""
        if self.structure == "unresolved" or self.nucleus == "decoupled":
            return "g_J"
        return "g_F" if self.structure == "resolved" and self.nucleus == "coupled" else None


def regime(isotope: Isotope, level: str, width_s: float, field_G: float) -> Regime:
    """Set the hyperfine splittings of a level beside its damping and the field.

    Parameters
    ----------
    isotope : Isotope
    level : str
        "S1/2", "P1/2" or "P3/2".
    width_s : float
        Decay plus collisional loss of the multipole in question [s^-1]; >= 0.
    field_G : float
        Field, its magnitude [G]; >= 0.

    Returns
    -------
    Regime

    Raises
    ------
    InputError
        Width or field are negative or not finite.
    UnknownNameError
        Another level.
    """
    given = {"width [s^-1]": width_s, "field [G]": field_G}
    bad = [f"{name} = {v:g} must be finite and >= 0" for name, v in given.items() if not (math.isfinite(v) and v >= 0)]
    if bad:
        raise InputError([f"{one}; give another value" for one in bad])
    structure = level_structure(isotope, level)
    energies = sorted(structure.energies().values())
    smallest = min((high - low for low, high in pairwise(energies)), default=0.0)
    largest = max((high - low for low, high in combinations(energies, 2)), default=0.0)
    return Regime(level, isotope.label, smallest, largest, width_s, larmor_rad_s(structure.g, field_G))


@dataclass(frozen=True, slots=True)
class FieldLimits:
    """How far the dropped terms are from mattering.

    ``zeeman`` and ``damping``: mu_B B/hbar and the largest damping, as parts of the fine structure [1];
    ``turn`` mu_B B/hbar times the collision duration [rad], None without a duration; ``warnings`` for the user.
    """

    zeeman: float
    damping: float
    turn: float | None
    warnings: tuple[str, ...]


def field_limits(
    element: Alkali, field_G: float, rates: LevelRates, collision_duration_s: float | None = None
) -> FieldLimits:
    """Zeeman splitting and damping against fine structure, Larmor period against collision duration.

    Coherences between P1/2 and P3/2 are dropped: the field must not mix the two (``mu_B B << hbar omega_fs``) and the
    damping must not blur them. Collision rates are those without field: no turn within a collision. Each is doubtful
    above SMALL (common practice, no source).

    Parameters
    ----------
    element : Alkali
    field_G : float
        Largest field in use, its magnitude [G].
    rates : LevelRates
        Decay and losses [s^-1].
    collision_duration_s : float or None
        Duration of a collision [s]; ``fill.impact_parameter(k, T, mu, 1.0) / k`` with the line width k gives it.

    Returns
    -------
    FieldLimits
    """
    fine = 2 * math.pi * c * 100 * element.fine_structure_cm1.value
    electron = larmor_rad_s(1.0, abs(field_G))
    zeeman = electron / fine
    damping = max(rates.decay[level] + loss for level in P_LEVELS for loss in rates.loss[level].values()) / fine
    turn = None if collision_duration_s is None else electron * collision_duration_s
    warnings = []
    if zeeman > SMALL:
        limit = SMALL * fine / larmor_rad_s(1.0, 1.0)
        warnings.append(
            f"field {abs(field_G):.3g} G: the Zeeman energy is {zeeman:.2g} of the fine structure of {element.symbol} "
            f"({element.fine_structure_cm1.value:g} cm^-1), but mixing of P1/2 and P3/2 is left out; "
            f"keep below {limit:.3g} G."
        )
    if damping > SMALL:
        warnings.append(
            f"the largest damping is {damping:.2g} of the fine structure of {element.symbol} ("
            f"{fine / constants.MHZ_RAD_S / 1e3:.3g} GHz), but coherences of P1/2 with P3/2 are left out; "
            "lower the pressure."
        )
    if turn is not None and turn > SMALL:
        warnings.append(
            f"field {abs(field_G):.3g} G turns a moment by {turn:.2g} rad within a collision of "
            f"{collision_duration_s:.2g} s; collision rates without field no longer hold."
        )
    return FieldLimits(zeeman, damping, turn, tuple(warnings))
