"""A filled cell: gas density, rates at that density, Larmor frequency, Hanle fields, and what dominates a level.

Everything here is arithmetic on a rate coefficient k [cm^3/s or rad s^-1 cm^3] and the conditions of one cell. The
nuclear spin is left out: fields use the electronic g_J, as if the nuclear spin were decoupled or absent. The return of
polarisation through the other fine-structure level is left out too. notes/report.md gives the reasons.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass

from pertcalc import constants
from pertcalc.errors import InputError
from pertcalc.names import DEFAULT_FILL_TEMPERATURE_K, DEFAULT_PRESSURE_TORR
from pertcalc.units import density_cm3

GAUSS_T = 1e-4
DEFAULT_FIELD_G = 0.5
# Cell temperature where a vapour is dense enough to be used and thin enough to be pumped through [K].
DEFAULT_TEMPERATURE_K = {"Li": 623.15, "Na": 393.15, "K": 353.15, "Rb": 333.15, "Cs": 313.15}
DEFAULTS_ORIGIN = "common practice, no source"

# Above this product of line width and collision duration the impact approximation is doubtful: collisions overlap.
IMPACT_LIMIT = 0.25
# Two effects closer than this factor are called comparable.
COMPARABLE = 2.0


@dataclass(frozen=True, slots=True)
class Fill:
    """The conditions of one cell.

    Parameters
    ----------
    pressure_torr : float
        Pressure of the gas when the cell was filled [Torr]; > 0.
    fill_temperature_K : float
        Temperature at which that pressure was read [K]; > 0.
    temperature_K : float
        Temperature of the cell in use [K]; > 0.
    field_G : float
        Magnetic field, its magnitude [G]; >= 0.

    Raises
    ------
    InputError
        Lists every value that is not finite or breaks its rule.
    """

    pressure_torr: float
    fill_temperature_K: float
    temperature_K: float
    field_G: float

    def __post_init__(self) -> None:
        rules = (
            ("pressure", self.pressure_torr, "Torr", self.pressure_torr > 0, "> 0"),
            ("fill temperature", self.fill_temperature_K, "K", self.fill_temperature_K > 0, "> 0"),
            ("temperature", self.temperature_K, "K", self.temperature_K > 0, "> 0"),
            ("field", self.field_G, "G", self.field_G >= 0, ">= 0 (a magnitude)"),
        )
        broken = [
            f"{name} = {value:g} {unit} must be finite and {rule}; give another value."
            for name, value, unit, obeyed, rule in rules
            if not (math.isfinite(value) and obeyed)
        ]
        if broken:
            raise InputError(broken)

    @property
    def density_cm3(self) -> float:
        """Number density of the gas [cm^-3]; a sealed cell keeps that of its fill."""
        return float(density_cm3(self.pressure_torr, self.fill_temperature_K))

    @property
    def pressure_in_use_torr(self) -> float:
        """Pressure of the gas at the temperature of the cell [Torr], ``p T / T_fill``."""
        return self.pressure_torr * self.temperature_K / self.fill_temperature_K


def fill_or_defaults(
    alkali: str,
    temperature_K: float | None = None,
    pressure_torr: float | None = None,
    fill_temperature_K: float | None = None,
    field_G: float | None = None,
) -> tuple[Fill, tuple[str, ...]]:
    """A Fill with the default of this module for every value not given (None), and the names of those defaults.

    Parameters: symbol ``alkali``; [K], [Torr], [K], [G]. Raises InputError as `Fill`.
    """
    conditions = {
        "temperature": (temperature_K, DEFAULT_TEMPERATURE_K[alkali]),
        "pressure": (pressure_torr, DEFAULT_PRESSURE_TORR),
        "fill temperature": (fill_temperature_K, DEFAULT_FILL_TEMPERATURE_K),
        "field": (field_G, DEFAULT_FIELD_G),
    }
    T, p, T_fill, B = (default if given is None else given for given, default in conditions.values())
    fill = Fill(pressure_torr=p, fill_temperature_K=T_fill, temperature_K=T, field_G=B)
    return fill, tuple(name for name, (given, _) in conditions.items() if given is None)


@dataclass(frozen=True, slots=True)
class LevelBalance:
    """What pulls at the polarisation of one excited level in one cell.

    ``decay`` radiative decay rate [s^-1]; ``losses`` rank K -> collisional loss at the fill [s^-1]; ``larmor`` [rad/s];
    ``hanle_free_G`` and ``hanle_G`` (by rank) fields at which Larmor frequency and decay are equal [G], without and
    with collisions; ``ranking`` names and rates [s^-1] of the three effects, largest first; ``rank`` the multipole that
    stands for the collisions.
    """

    level: str
    decay: float
    losses: Mapping[int, float]
    larmor: float
    hanle_free_G: float
    hanle_G: Mapping[int, float]
    rank: int | None
    ranking: tuple[tuple[str, float], ...]

    def hanle_relative_error(self, rank: int, loss_error: float) -> float:
        """Relative error [1] of ``hanle_G[rank]`` when that of the loss is ``loss_error`` [1]; decay taken as exact."""
        return loss_error * self.losses[rank] / (self.decay + self.losses[rank])

    @property
    def winner(self) -> str | None:
        """The largest effect: "radiative decay", "collisions" or "field"; None while the collisions are unknown."""
        return None if self.rank is None else self.ranking[0][0]

    @property
    def comparable(self) -> tuple[str, ...]:
        """The effects within a factor COMPARABLE of the largest, itself included; none while collisions are unknown."""
        if self.rank is None:
            return ()
        largest = self.ranking[0][1]
        return tuple(name for name, rate in self.ranking if rate * COMPARABLE >= largest)


def larmor_rad_s(g_factor: float, field_G: float) -> float:
    """Larmor frequency ``g mu_B B / hbar`` [rad/s] of a level with ``g_factor`` [1] in ``field_G`` [G]."""
    return g_factor * constants.BOHR_MAGNETON_J_T * field_G * GAUSS_T / constants.HBAR_J_S


def hanle_field_G(g_factor: float, decay_rate: float) -> float:
    """Field at which Larmor frequency and decay rate are equal, ``B = hbar G / (g mu_B)``.

    Parameters: ``g_factor`` [1], ``decay_rate`` G [s^-1], radiative or radiative plus collisional. Returns B [G]; the
    half width of a rank-2 signal is B/2. Source: any text on level crossing; the g_J form holds with the nuclear spin
    decoupled or absent.
    """
    return decay_rate / larmor_rad_s(g_factor, 1.0)


def level_balance(
    level: str, decay: float, g_factor: float, loss_cm3_s: Mapping[int, float | None], fill: Fill
) -> LevelBalance:
    """Set radiative decay, collisions and the field of one level side by side.

    ``B_K = hbar (G + n loss_K) / (g_J mu_B)``; collisions stand with rank 2 (alignment) where the level has it and
    it is known, else with the highest known rank.

    Parameters: ``level`` "P1/2" | "P3/2"; ``decay`` G [s^-1]; ``g_factor`` g_J [1]; ``loss_cm3_s`` rank -> total loss
    [cm^3/s], None where it is unknown; ``fill`` the cell. Returns a LevelBalance [s^-1, G].
    """
    n = fill.density_cm3
    losses = {K: n * k for K, k in loss_cm3_s.items() if k is not None}
    larmor = larmor_rad_s(g_factor, fill.field_G)
    effects = [("radiative decay", decay), ("field", larmor)]
    rank = 2 if 2 in losses else max(losses, default=None)
    if rank is not None:
        effects.append(("collisions", losses[rank]))
    return LevelBalance(
        level,
        decay,
        losses,
        larmor,
        hanle_field_G(g_factor, decay),
        {K: hanle_field_G(g_factor, decay + rate) for K, rate in losses.items()},
        rank,
        tuple(sorted(effects, key=lambda effect: -effect[1])),
    )


def impact_parameter(fwhm: float, temperature_K: float, reduced_mass_au: float, density: float) -> float:
    """Line width times collision duration, the small number of the impact approximation.

    With the radius ``b = sqrt(k / (2 pi vbar))`` of the half-width cross section and the duration ``b / vbar``, the
    full width times the duration is ``n k b / vbar = 2 pi n b^3``: the same number says how often a second
    perturber is inside the collision, so it judges binary collisions too. Doubtful above IMPACT_LIMIT (common
    practice, no source).

    Parameters: ``fwhm`` k [rad s^-1 cm^3], ``temperature_K`` [K], ``reduced_mass_au`` [electron masses], ``density`` n
    [cm^-3]. Returns the product [1].
    """
    kT = temperature_K * constants.KELVIN_HARTREE
    speed = math.sqrt(8 * kT / (math.pi * reduced_mass_au)) * constants.AU_VELOCITY_CM_S
    radius = math.sqrt(fwhm / (2 * math.pi * speed))
    return density * fwhm * radius / speed
