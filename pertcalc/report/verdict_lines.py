"""Decay of the ground level against the fill pressure, as the figure of a verdict draws it."""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass
from functools import lru_cache, partial

import numpy as np
from numpy.typing import NDArray

from pertcalc.species import Sourced
from pertcalc.vapour.ground import TRANSIT, WALL, GroundProcess
from pertcalc.vapour.ground_balance import (
    FAST_EXCHANGE,
    PUMPING,
    GroundBalance,
    decays_at,
    forms_at,
    light_decay,
    limit_steps,
)
from pertcalc.vapour.pairs import PAIRS
from pertcalc.vapour.pump_light import PumpLight, pump_light
from pertcalc.vapour.spin_destruction import BY_GAS
from pertcalc.vapour.verdict import Verdict

Array = NDArray[np.float64]

PER_DECADE = 60
SUM, WALLS, GAS = "sum", "wall + transit", "gas + pairs"
_MEMBERS = {WALLS: (WALL, TRANSIT), GAS: (BY_GAS, PAIRS)}


@dataclass(frozen=True, slots=True)
class GroundLines:
    """Decay of <F_z> against the fill pressure: ``pressures`` [Torr], shape (n,); all rates [s^-1], nan where unknown.

    ``rates`` by name: every process, SUM of the known ones that destroy orientation, PUMPING with light, WALLS and GAS
    where they meet and have two known members; ``sum_error`` of SUM, absolute, nan once a part states none; ``steps``
    where one limit of the treatment takes over: pressure [Torr], the side on which it holds, and what holds.
    """

    pressures: Array
    rates: dict[str, Array]
    sum_error: Array
    steps: tuple[tuple[float, str, str], ...]


def ground_lines(found: Verdict, low: float, high: float) -> GroundLines:
    """Every decay of <F_z> from fill pressure ``low`` to ``high`` [Torr]; steps have a point on either side."""
    ground, p = found.ground, found.question.fill.pressure_torr
    grid = np.geomspace(low, high, round(PER_DECADE * math.log10(high / low)) + 1)
    question = found.question
    light_at = lru_cache(maxsize=None)(partial(pump_light, question, found.isotope, found.lines, found.rates))
    steps = tuple((p * factor, side, what) for factor, side, what in limit_steps(ground, grid / p, light_at))
    extra = [p, *(x * (1 + side) for x, *_ in steps for side in (-1e-9, 1e-9))]
    meet = ground.crossover_pressure_torr
    met = [meet] if meet is not None and low <= meet <= high else []
    pressures = np.unique(np.concatenate([grid, extra, met]))
    decays = [{one.name: one for one in decays_at(ground, x / p, light_at(x / p))} for x in pressures]
    rates = {name: np.array([_rate(at[name]) for at in decays]) for name in decays[0]}
    acting = [[one.rate for one in at.values() if one.destroys and one.rate is not None] for at in decays]
    rates[SUM] = np.array([sum(one.value for one in parts) if parts else math.nan for parts in acting])
    error = np.array([_quadrature(parts) for parts in acting])
    for name, members in _MEMBERS.items() if met else ():
        known = [rates[one] for one in members if one in rates and np.isfinite(rates[one]).any()]
        if len(known) > 1:
            rates[name] = np.nansum(known, axis=0)
    if found.pumping is not None:
        rates[PUMPING] = np.array([_pumping(ground, x / p, light_at(x / p)) for x in pressures])
    return GroundLines(pressures, rates, error, steps)


def _pumping(ground: GroundBalance, factor: float, light: PumpLight | None) -> float:
    assert light is not None  # the caller looked
    return light_decay(light, ground.isotope, forms_at(ground, factor, light)[FAST_EXCHANGE]).value


def _rate(process: GroundProcess) -> float:
    return math.nan if process.rate is None else process.rate.value


def _quadrature(parts: Iterable[Sourced]) -> float:
    """Error of a sum of independent rates; nan as soon as one states none, or there is none."""
    errors = [math.nan if one.error is None else one.error for one in parts]
    return math.hypot(*errors) if errors else math.nan
