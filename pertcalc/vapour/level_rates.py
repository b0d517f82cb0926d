"""Rates of the P levels in one cell, as every solver of the vapour takes them: decay, multipole losses and gains."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass

from pertcalc.errors import InputError
from pertcalc.results import CollisionRates
from pertcalc.species import Alkali

P_LEVELS = ("P1/2", "P3/2")
OTHER_LEVEL = {"P1/2": "P3/2", "P3/2": "P1/2"}
J_OF = {"S1/2": 0.5, "P1/2": 0.5, "P3/2": 1.5}


@dataclass(frozen=True, slots=True)
class LevelRates:
    """Decay and electronic relaxation of P1/2 and P3/2 at one gas density [s^-1].

    ``decay`` level -> radiative rate; ``loss`` level -> rank K (0 to 2J) -> total collisional loss, outflow included,
    ``loss[level][0]`` being the outflow; ``gain`` level of origin -> rank K (0 and 1) -> gain of the orthonormal
    multipole K in the other level, signed for K = 1. Nuclear spin plays no part in any of them.
    """

    decay: Mapping[str, float]
    loss: Mapping[str, Mapping[int, float]]
    gain: Mapping[str, Mapping[int, float]]


def population_gain(level: str, outflow: float) -> float:
    """Gain of orthonormal rank 0 in the other level, ``outflow sqrt((2J+1)/(2J'+1))`` [s^-1]; conserves the trace."""
    return outflow * math.sqrt((2 * J_OF[level] + 1) / (2 * J_OF[OTHER_LEVEL[level]] + 1))


def free_rates(alkali: Alkali) -> LevelRates:
    """Level rates without any gas."""
    decay = {level: alkali.decay_rate(level) for level in P_LEVELS}
    loss = {level: dict.fromkeys(range(int(2 * J_OF[level]) + 1), 0.0) for level in P_LEVELS}
    return LevelRates(decay, loss, {level: {0: 0.0, 1: 0.0} for level in P_LEVELS})


def level_rates(alkali: Alkali, rates: CollisionRates, density_cm3: float, index: int = 0) -> LevelRates:
    """Level rates of ``alkali`` at a gas density [cm^-3], at temperature number ``index`` of ``rates``.

    Raises
    ------
    InputError
        The method behind ``rates`` does not know every loss and transfer (the closed form).
    """

    def at(coefficient: object, what: str) -> float:
        values = getattr(coefficient, "values", None)
        if values is None:
            raise InputError(
                f"method {rates.method!r} does not know {what}, which the relaxation of the levels needs. "
                "Take --method semiclassical or quantum."
            )
        return density_cm3 * float(values[index])

    loss, gain = {}, {}
    for level in P_LEVELS:
        outflow = at(rates.transfer[level], f"the transfer from {level}")
        loss[level] = {0: outflow} | {
            K: at(c, f"the loss of rank {K} of {level}") for K, c in rates.multipole_loss[level].items()
        }
        gain[level] = {
            0: population_gain(level, outflow),
            1: at(rates.multipole_transfer[level][1], f"the transfer of rank 1 from {level}"),
        }
    return LevelRates({level: alkali.decay_rate(level) for level in P_LEVELS}, loss, gain)
