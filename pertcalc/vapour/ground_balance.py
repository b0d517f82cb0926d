"""The ground level in a cell: what relaxes its orientation, beside pumping light and field, and where that changes."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from pertcalc.species import COMPUTED, Alkali, Isotope, Sourced
from pertcalc.vapour.excited import FIELD
from pertcalc.vapour.fill import COMPARABLE
from pertcalc.vapour.ground import (
    TRANSIT,
    WALL,
    GroundProcess,
    Surroundings,
    exchange_is_fast,
    ground_processes,
    observable,
    orientation_decay,
)
from pertcalc.vapour.ground_spin import exchange_broadening
from pertcalc.vapour.hanle_fields import HanleField, ground_hanle_field
from pertcalc.vapour.pairs import PAIRS
from pertcalc.vapour.process import weakest_mark
from pertcalc.vapour.pump_light import PumpLight
from pertcalc.vapour.question import Question
from pertcalc.vapour.spin_destruction import BY_GAS, EXCHANGE

PUMPING = "pumping light"
_OF_THE_GAS = (BY_GAS, PAIRS)
# Densities searched for the crossover of walls and gas lie within this factor of that of the cell.
_REACH = 1e6
# Step in ln n of the slope there.
_STEP = 1e-3
# Switches of a limit are looked for within the factor _NEAR of the density where walls and gas meet; both are compared
# _AT_STEP before and after a switch (in ln n).
_NEAR, _AT_STEP = 10.0, 1e-6
# The limits of the treatment that switch with the gas density, as `forms_at` names them.
FAST_EXCHANGE = "spin exchange is fastest"
FREE_PAIRS = "bound pairs act on the electron alone"
RESOLVING = "the light resolves the ground hyperfine structure"

# The pumping light at the gas density of the cell times a factor [1]; None in the dark.
LightAt = Callable[[float], PumpLight | None]


@dataclass(frozen=True, slots=True)
class GroundBalance:
    """What pulls at the orientation of the ground level of one isotope.

    ``around`` what it is surrounded by; ``processes`` as they act and ``decays`` as decay rates of <F_z> [s^-1];
    ``fast_exchange`` whether a spin temperature holds; ``total`` sum of the known decays [s^-1], None if none is known;
    ``unknown`` names of processes without a rate; ``pumping`` decay of <F_z> by absorption of the light [s^-1] or
    None; ``larmor`` [rad/s] of F = I + 1/2; ``exchange`` damping of the precession by spin exchange [s^-1] or None;
    ``hanle`` words for the damping -> Hanle field; ``ranking`` effects and rates, largest first;
    ``crossover_pressure_torr`` where walls and transit equal the gas, at the fill temperature [Torr], or None, with its
    relative error [1]; ``crossover_step`` None, or what switches where the larger of them changes by a step of the
    rates (no error is estimated then).
    """

    atom: Alkali
    isotope: Isotope
    around: Surroundings
    processes: tuple[GroundProcess, ...]
    decays: tuple[GroundProcess, ...]
    fast_exchange: bool
    total: Sourced | None
    unknown: tuple[str, ...]
    pumping: Sourced | None
    larmor: float
    g_F: float
    exchange: Sourced | None
    hanle: dict[str, HanleField]
    ranking: tuple[tuple[str, float], ...]
    crossover_pressure_torr: float | None
    crossover_pressure_error: float | None  # relative [1]
    crossover_step: str | None

    @property
    def dominant(self) -> str:
        """The largest of relaxation processes, pumping light and field."""
        return self.ranking[0][0]

    @property
    def factor(self) -> float:
        """By how much the largest exceeds the next [1]; inf when nothing else is known."""
        return self.ranking[0][1] / self.ranking[1][1] if len(self.ranking) > 1 and self.ranking[1][1] > 0 else math.inf

    @property
    def strongest(self) -> GroundProcess | None:
        """The process that relaxes the orientation most, None if no rate is known."""
        known = [p for p in self.decays if p.destroys and p.rate is not None]
        return max(known, key=_rate, default=None)

    @property
    def comparable(self) -> tuple[str, ...]:
        """Names of the relaxation processes within a factor COMPARABLE of the strongest."""
        top = self.strongest
        if top is None:
            return ()
        return tuple(p.name for p in self.decays if p.destroys and p.rate and _rate(p) * COMPARABLE >= _rate(top))

    @property
    def crossover_field_G(self) -> float | None:
        """Field at which the Larmor frequency equals all damping along the beam, pumping included [G]."""
        widest = [field.field_G for words, field in self.hanle.items() if "exchange" not in words]
        return max(widest, default=None)


def ground_balance(
    question: Question,
    atom: Alkali,
    isotope: Isotope,
    density: Sourced,
    diffusion_nD: Sourced | None,
    sticking: tuple[Sourced, Sourced] | None,
    light_at: LightAt,
) -> GroundBalance:
    """Every process of the ground level of an isotope, its Hanle fields and crossovers.

    Parameters
    ----------
    question : Question
    atom, isotope : Alkali, Isotope
    density : Sourced
        Of the alkali [cm^-3].
    diffusion_nD : Sourced or None
        Diffusion coefficient times gas density [cm^-1 s^-1].
    sticking : tuple of Sourced or None
        Equilibrium constant [cm^3] and rotation N [1] of the weakly bound pairs; `pertcalc.vapour.pairs.sticking`.
    light_at : callable
        ``light_at(factor)`` is the pumping light with the gas density times ``factor`` [1], None in the dark.

    Returns
    -------
    GroundBalance

    Raises
    ------
    InputError
        As `pertcalc.vapour.ground.Surroundings`.
    """
    around = Surroundings(
        question.fill.temperature_K,
        question.cell,
        question.wall,
        question.gas,
        question.gas_density_cm3 if question.gas is not None else None,
        density,
        diffusion_nD,
        question.beam_diameter_cm,
        *(sticking or (None, None)),
    )
    processes = ground_processes(atom, isotope, around)
    beam = light_at(1.0)
    decays = orientation_decay(processes, isotope.nuclear_spin, _damping(beam))
    total = _total(decays)
    fast = exchange_is_fast(processes, _damping(beam))
    light = None if beam is None else light_decay(beam, isotope, fast)
    hanle = _hanle(isotope, total, light, exchange := _exchange(processes, isotope))
    one_gauss = ground_hanle_field(isotope, 1.0)
    effects = [(p.name, _rate(p)) for p in decays if p.destroys and p.rate is not None]
    if light is not None:
        effects.append((PUMPING, light.value))
    larmor = question.fill.field_G / one_gauss.field_G  # a damping of 1 s^-1 has its Hanle field at 1 rad/s
    effects.append((FIELD, larmor))
    found = GroundBalance(
        atom,
        isotope,
        around,
        processes,
        decays,
        fast,
        total,
        tuple(p.name for p in decays if p.destroys and p.rate is None),
        light,
        larmor,
        one_gauss.g,
        exchange,
        hanle,
        tuple(sorted(effects, key=lambda effect: -effect[1])),
        None,
        None,
        None,
    )
    factor, error, step = _crossover(found, light_at)
    if factor is None:
        return found
    meet = factor * question.fill.pressure_torr
    return replace(found, crossover_pressure_torr=meet, crossover_pressure_error=error, crossover_step=step)


def light_decay(light: PumpLight, isotope: Isotope, fast_exchange: bool) -> Sourced:
    """Rate at which absorption takes <F_z> away [s^-1]: the damping of the electron spin, slowed by the nucleus.

    Absorption and the mixing of a short-lived level leave the nucleus alone, like a collision: see `ground.observable`.
    Light that resolves the hyperfine structure of the ground level takes whole atoms of one F: not slowed.
    """
    rate = light.beam.rate
    if light.resolves:
        damping, words = light.damping, "it resolves the ground hyperfine structure and takes whole atoms of one F"
        words += ": not slowed by the nucleus, mean over both F"
    else:
        damping = observable(light.damping, isotope.nuclear_spin, fast_exchange)
        words = f"damping of the electron spin, slowed by the nucleus: x {damping / light.damping:.4g}"
    source = f"absorption of the pumping light; {words}; {rate.source}"
    return Sourced(damping, "s^-1", source, weakest_mark((COMPUTED, rate.mark)), _scaled(rate, damping))


def _damping(light: PumpLight | None) -> float:
    return 0.0 if light is None else light.damping


def _rate(process: GroundProcess) -> float:
    return 0.0 if process.rate is None else process.rate.value


def _scaled(of: Sourced, value: float) -> float | None:
    return None if of.error is None or of.value == 0 else abs(value) * of.error / of.value


def _sum(parts: Iterable[Sourced], what: str) -> Sourced | None:
    """Sum of rates; the error is None as soon as one part has none."""
    rates = list(parts)
    if not rates:
        return None
    errors = [one.error for one in rates if one.error is not None]
    error = math.hypot(*errors) if len(errors) == len(rates) else None
    return Sourced(
        sum(one.value for one in rates), "s^-1", what, weakest_mark([COMPUTED, *(one.mark for one in rates)]), error
    )


def _total(decays: Iterable[GroundProcess]) -> Sourced | None:
    known = {p.name: p.rate for p in decays if p.destroys and p.rate is not None}
    return _sum(known.values(), f"sum of {', '.join(known)}")


def _exchange(processes: Iterable[GroundProcess], isotope: Isotope) -> Sourced | None:
    """Damping of the precession by spin exchange, for a Larmor frequency above the exchange rate."""
    rate = next((p.rate for p in processes if p.name == EXCHANGE), None)
    if rate is None:
        return None
    factor = exchange_broadening(isotope.nuclear_spin)
    error = None if rate.error is None else rate.error * factor
    return replace(
        rate, value=rate.value * factor, error=error, source=f"{factor:.4g} times the exchange rate; {rate.source}"
    )


def _hanle(
    isotope: Isotope, total: Sourced | None, light: Sourced | None, exchange: Sourced | None
) -> dict[str, HanleField]:
    """Hanle fields of F = I + 1/2 for relaxation alone, then with light, then with spin exchange."""
    found, damping, words = {}, 0.0, []
    for name, part in (("relaxation", total), ("pumping", light), ("spin exchange", exchange)):
        if part is None:
            continue
        damping += part.value
        words.append(name)
        found[" + ".join(words)] = ground_hanle_field(isotope, damping)
    return found


def _processes_at(balance: GroundBalance, factor: float) -> tuple[GroundProcess, ...]:
    around = balance.around
    if around.gas_density_cm3 is None:
        return balance.processes
    thinner = replace(around, gas_density_cm3=factor * around.gas_density_cm3)
    return ground_processes(balance.atom, balance.isotope, thinner)


def decays_at(balance: GroundBalance, factor: float, light: PumpLight | None) -> tuple[GroundProcess, ...]:
    """The decays of <F_z> [s^-1] with the gas density of the cell times ``factor`` [1], all else unchanged.

    ``light`` the pumping light at that density, None in the dark: it can break a spin temperature.
    """
    return orientation_decay(_processes_at(balance, factor), balance.isotope.nuclear_spin, _damping(light))


def forms_at(balance: GroundBalance, factor: float, light: PumpLight | None) -> dict[str, bool]:
    """Which limits hold at a gas density: FAST_EXCHANGE, FREE_PAIRS, RESOLVING; arguments as `decays_at`."""
    found = _processes_at(balance, factor)
    return {
        FAST_EXCHANGE: exchange_is_fast(found, _damping(light)),
        FREE_PAIRS: any(one.name == PAIRS and one.on_electron for one in found),
        RESOLVING: light is not None and light.resolves,
    }


def limit_steps(
    balance: GroundBalance, factors: NDArray[np.float64], light_at: LightAt
) -> tuple[tuple[float, str, str], ...]:
    """Where the limits of `forms_at` switch as the gas density grows.

    Parameters
    ----------
    balance : GroundBalance
    factors : array, shape (n,)
        Rising multiples of the gas density of the cell [1]; of two switches between neighbours none is seen.
    light_at : callable
        As `ground_balance`.

    Returns
    -------
    steps : tuple
        (factor [1] good to 1e-9, "below" or "above": the side on which it holds, the limit).
    """

    def forms(factor: float) -> dict[str, bool]:
        return forms_at(balance, factor, light_at(factor))

    on_grid = [forms(float(factor)) for factor in factors]
    steps = []
    for i in range(len(factors) - 1):
        for what, holds in on_grid[i].items():
            if holds == on_grid[i + 1][what]:
                continue
            below, above = float(factors[i]), float(factors[i + 1])
            while above / below - 1 > 1e-9:
                middle = math.sqrt(below * above)
                below, above = (middle, above) if forms(middle)[what] == holds else (below, middle)
            steps.append((math.sqrt(below * above), "below" if holds else "above", what))
    return tuple(steps)


def _crossover(balance: GroundBalance, light_at: LightAt) -> tuple[float | None, float | None, str | None]:
    """Factor of the gas density at which wall and transit relax as much as the gas does, its relative error, its step.

    None if they never meet. The error: those of both sides over the slope d ln(walls/gas)/d ln n. Where the larger side
    changes because a limit of the treatment switches (there and back again within the step, if the rates fall): no
    error, but what switches.
    """
    if balance.around.gas is None:
        return None, None, None
    from scipy.optimize import brentq

    def sides(log_factor: float) -> list[Sourced | None]:
        factor = math.exp(log_factor)
        decays = decays_at(balance, factor, light_at(factor))
        known = {p.name: p.rate for p in decays if p.destroys and p.rate is not None}
        return [_sum((known[n] for n in names if n in known), "") for names in ((WALL, TRANSIT), _OF_THE_GAS)]

    def gap(log_factor: float) -> float:
        walls, gas = (0.0 if one is None else one.value for one in sides(log_factor))
        return math.log(walls / gas) if walls > 0 and gas > 0 else math.nan

    span = math.log(_REACH)
    if not gap(-span) > 0 > gap(span):
        return None, None, None
    root = brentq(gap, -span, span, xtol=1e-9)
    near = np.geomspace(1 / _NEAR, _NEAR, 33) * math.exp(root)
    for factor, side, what in limit_steps(balance, near, light_at):
        place = math.log(factor)
        if (gap(place - _AT_STEP) > 0) != (gap(place + _AT_STEP) > 0):
            return factor, None, f"{what} {side} it"
    slope = (gap(root + _STEP) - gap(root - _STEP)) / (2 * _STEP)
    errors = [None if one is None or one.error is None else one.error / one.value for one in sides(root)]
    known = [one for one in errors if one is not None]
    return math.exp(root), math.hypot(*known) / abs(slope) if len(known) == len(errors) else None, None
