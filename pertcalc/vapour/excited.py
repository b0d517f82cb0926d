"""One rank of one P level in a cell: decay, collisions and field side by side, who wins, and where that changes.

The collisional rate is the total loss of the electronic multipole (outflow to the other fine-structure level included).
Two crossovers follow from it: the pressure at which collisions equal the larger of decay and Larmor frequency, and the
field at which the Larmor frequency equals the larger of decay and collisions. notes/verdict.md.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

from pertcalc.results import CollisionRates
from pertcalc.species import COMPUTED, UPPER_LEVEL, Alkali, Sourced
from pertcalc.vapour.fill import COMPARABLE, Fill, hanle_field_G, larmor_rad_s
from pertcalc.vapour.level_rates import LevelRates

DECAY, COLLISIONS, FIELD = "radiative decay", "collisions", "field"


@dataclass(frozen=True, slots=True)
class RankBalance:
    """What pulls at rank K of one P level.

    ``radiative`` and ``collisional`` [s^-1]; ``larmor`` [rad/s] with ``g_factor`` [1] that ``field_with`` names;
    ``hanle_free_G`` and ``hanle_G`` fields of equal Larmor frequency and decay [G], without and with collisions, and
    ``hanle_error_G`` of the latter; ``ranking`` names and rates, largest first; ``crossover_pressure_torr`` at the fill
    temperature [Torr], None without a gas; ``crossover_field_G`` [G]; ``hanle_range_G`` and ``crossover_range_G`` from
    both g factors where neither holds, else the field twice [G].
    """

    level: str
    rank: int
    radiative: Sourced
    collisional: Sourced
    larmor: float
    g_factor: Sourced
    field_with: str
    hanle_free_G: float
    hanle_G: float
    hanle_error_G: float
    ranking: tuple[tuple[str, float], ...]
    crossover_pressure_torr: float | None
    crossover_pressure_error: float | None  # relative [1]
    crossover_field_G: float
    hanle_range_G: tuple[float, float]
    crossover_range_G: tuple[float, float]

    @property
    def dominant(self) -> str:
        """The largest of decay, collisions and field."""
        return self.ranking[0][0]

    @property
    def factor(self) -> float:
        """By how much the largest exceeds the next [1]; inf beside zero."""
        second = self.ranking[1][1]
        return self.ranking[0][1] / second if second > 0 else math.inf

    @property
    def comparable(self) -> tuple[str, ...]:
        """The effects within a factor COMPARABLE of the largest, itself included."""
        return tuple(name for name, rate in self.ranking if rate * COMPARABLE >= self.ranking[0][1])


def radiative(alkali: Alkali, level: str) -> Sourced:
    """Radiative decay rate of a P level [s^-1] with the mark and error of its lifetime."""
    lifetime = alkali.levels[level].lifetime_ns
    assert lifetime is not None  # only the ground level has none
    rate = alkali.decay_rate(level)
    error = None if lifetime.error is None else rate * lifetime.error / lifetime.value
    return Sourced(rate, "s^-1", f"1/lifetime; {lifetime.source}", lifetime.mark, error)


def rank_balance(
    alkali: Alkali,
    level: str,
    rank: int,
    rates: LevelRates,
    error: float | None,
    g_factor: Sourced,
    field_with: str,
    fill: Fill,
    has_gas: bool = True,
) -> RankBalance:
    """Set radiative decay, collisional loss of rank K and Larmor frequency side by side, ``g_factor`` in every field.

    Parameters
    ----------
    alkali : Alkali
    level, rank : str, int
        "P1/2" or "P3/2"; K = 1 to 2J [1].
    rates : LevelRates
        At the density of ``fill`` [s^-1].
    error : float or None
        Relative error of the collisional loss [1].
    g_factor, field_with : Sourced, str
        g of the Larmor frequency [1] and what it belongs to.
    fill : Fill
    has_gas : bool
        False in a cell without buffer gas: no pressure to cross over at.

    Returns
    -------
    RankBalance
    """
    decay, loss = rates.decay[level], rates.loss[level][rank]
    g = g_factor.value
    larmor = larmor_rad_s(g, fill.field_G)
    here, crossed = hanle_field_G(g, decay + loss), hanle_field_G(g, max(decay, loss))
    effects = ((DECAY, decay), (COLLISIONS, loss), (FIELD, larmor))
    origin = "n times the total loss of this rank" if has_gas else "no buffer gas"
    absolute = None if error is None else error * loss
    meet = fill.pressure_torr * max(decay, larmor) / loss if has_gas and loss > 0 else None
    return RankBalance(
        level,
        rank,
        radiative(alkali, level),
        Sourced(loss, "s^-1", origin, COMPUTED, absolute),
        larmor,
        g_factor,
        field_with,
        hanle_field_G(g, decay),
        here,
        hanle_field_G(g, absolute or 0.0),
        tuple(sorted(effects, key=lambda effect: -effect[1])),
        meet,
        error if meet is not None else None,
        crossed,
        (here, here),
        (crossed, crossed),
    )


@dataclass(frozen=True, slots=True)
class ModelRates:
    """The rates of one line as models of polarised line formation define them [s^-1]; notes/verdict.md.

    ``gamma_R`` radiative decay of the upper level; ``gamma_I`` inelastic collisions (outflow to the other
    fine-structure level); ``gamma_E`` elastic collisions, defined by gamma_E + gamma_I = collisional full width;
    ``depolarising`` rank K -> D_K = n (loss_K - loss_0), so that D_0 = 0. ``errors`` the same names -> relative error
    [1], None where not estimated.
    """

    line: str
    gamma_R: float
    gamma_I: float
    gamma_E: float
    depolarising: dict[int, float]
    errors: dict[str, float | None]


def model_rates(
    alkali: Alkali, line: str, rates: LevelRates, width_rad_s: float, errors: dict[str, float | None]
) -> ModelRates:
    """Gamma_R, Gamma_I, Gamma_E and D_K of a line.

    Parameters: ``rates`` at the gas density [s^-1]; ``width_rad_s`` collisional full width [rad/s]; ``errors`` relative
    [1] of "width", "gamma_I" and "loss_K" for each K. D_K is the difference of two losses that share most of their
    error; it is given that of loss_K, absolute. Returns ModelRates [s^-1]; D2 of the upper level of D1 does not exist.
    """
    level = UPPER_LEVEL[line]
    outflow = rates.loss[level][0]
    D = {K: loss - outflow for K, loss in rates.loss[level].items() if K > 0}
    elastic = width_rad_s - outflow
    found: dict[str, float | None] = {"gamma_I": errors.get("gamma_I")}
    found["gamma_E"] = _scaled(errors.get("width"), width_rad_s, elastic)
    for K, value in D.items():
        found[f"D{K}"] = _scaled(errors.get(f"loss_{K}"), rates.loss[level][K], value)
    lifetime = alkali.levels[level].lifetime_ns
    assert lifetime is not None
    found["gamma_R"] = None if lifetime.error is None else lifetime.error / lifetime.value
    return ModelRates(line, rates.decay[level], outflow, elastic, D, found)


def _scaled(error: float | None, of: float, value: float) -> float | None:
    """Relative error of ``value`` when ``of`` has the relative ``error`` and they differ by something exact."""
    return None if error is None or value == 0 else abs(error * of / value)


def coefficient(rates: CollisionRates, quantity: str, where: str) -> float:
    """Width ("fwhm") or shift of a line per unit gas density, at its first temperature [rad s^-1 cm^3]."""
    values = getattr(rates, quantity)[where].values
    assert values is not None  # the two close-coupling methods know every one
    return float(values[0])


def coefficient_error(rates: CollisionRates, quantity: str, where: str, rank: int | None = None) -> float | None:
    """Numerical and model error of one coefficient together, relative [1], at its first temperature.

    ``quantity`` a field of CollisionRates; ``where`` line or level; ``rank`` for multipoles. None if neither is known.
    """
    found = getattr(rates, quantity)[where]
    coefficient = found if rank is None else found[rank]
    parts = [one[0] for one in (coefficient.numerical_error, coefficient.model_error) if one is not None]
    return math.hypot(*map(float, parts)) if parts else None
