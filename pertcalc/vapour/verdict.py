"""What rules the polarisation of every level of one cell: all rates side by side, and who wins.

This module only assembles: every rate comes from a room of its own. notes/verdict.md says how the comparison is made.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace
from functools import partial

from pertcalc import __version__
from pertcalc.rates import collision_rates
from pertcalc.results import CollisionRates
from pertcalc.species import COMPUTED, SPECIES_GASES, UPPER_LEVEL, Alkali, Isotope, Sourced, alkali
from pertcalc.vapour.absorption import AbsorptionLine
from pertcalc.vapour.cell import coating_warning
from pertcalc.vapour.density import VapourDensity, alkali_density
from pertcalc.vapour.diffusion import Diffusion, diffusion
from pertcalc.vapour.excited import ModelRates, RankBalance, coefficient, coefficient_error, model_rates, rank_balance
from pertcalc.vapour.fill import IMPACT_LIMIT, impact_parameter
from pertcalc.vapour.g_in_force import crossover_field_G, g_in_force, hanle_range_G, visible_regimes
from pertcalc.vapour.ground_balance import GroundBalance, ground_balance
from pertcalc.vapour.ground_spin import slowing_down
from pertcalc.vapour.hanle import GroundHanle, HanleCurves, field_grid, ground_hanle, hanle_curves
from pertcalc.vapour.hanle_fields import HanleField, Regime, field_limits, hanle_fields
from pertcalc.vapour.level_rates import J_OF, P_LEVELS, LevelRates, free_rates, level_rates
from pertcalc.vapour.pairs import sticking
from pertcalc.vapour.pump_light import line_in_gas, pump_light
from pertcalc.vapour.pumping import Pumping, pumping_kind, spin_coefficients, surviving_orientation
from pertcalc.vapour.question import Question
from pertcalc.vapour.scattering import Polarisability, scattering_polarisability
from pertcalc.vapour.spin_destruction import bound_pair
from pertcalc.vapour.trapping import INVALIDATES, Trapping, trapping

Progress = Callable[[int, int], None]


@dataclass(frozen=True, slots=True)
class Mixing:
    """Whether collisions mix the upper level of a line before it decays.

    ``ratio`` loss of orientation over decay [1] with its absolute ``error``; ``surviving`` part of the excited
    orientation that emission returns to the ground level [1]; ``pumping`` what circular light on the line then does;
    ``photons_per_atom`` absorbed on D1 by an atom until it is polarised, nuclear spin included [1], None on D2.
    """

    line: str
    level: str
    ratio: float
    error: float | None
    surviving: float
    pumping: str
    photons_per_atom: float | None


@dataclass(frozen=True, slots=True)
class Verdict:
    """Everything `pertcalc verdict` found about one cell.

    ``rates`` None without a gas; ``isotope`` the most abundant one, whose hyperfine structure stands for the vapour in
    ``balances`` (level -> rank -> RankBalance), ``regimes`` and ``ground``; ``fields`` all Hanle fields of a P level;
    ``mixing``, ``scattering``, ``models``, ``lines``, ``trapping`` by line; ``duration_s`` of a collision [s] and
    ``overlap`` width times duration [1] by line, None and empty without a gas; ``pumping`` None without light.
    """

    question: Question
    isotope: Isotope
    rates: CollisionRates | None
    level_rates: LevelRates
    balances: Mapping[str, Mapping[int, RankBalance]]
    regimes: Mapping[str, Regime]
    fields: Mapping[str, tuple[HanleField, ...]]
    mixing: Mapping[str, Mixing]
    scattering: Mapping[str, Polarisability]
    models: Mapping[str, ModelRates]
    vapour: VapourDensity
    diffusion: Diffusion | None
    lines: Mapping[str, AbsorptionLine]
    trapping: Mapping[str, Trapping]
    pumping: Pumping | None
    ground: GroundBalance
    duration_s: float | None
    overlap: Mapping[str, float]
    warnings: tuple[str, ...]
    version: str = __version__


def verdict(question: Question, progress: Progress | None = None) -> Verdict:
    """Set radiative, collisional, field, wall and pumping rates of every level of one cell side by side.

    Parameters
    ----------
    question : Question
        From `pertcalc.vapour.question.ask`.
    progress : callable or None
        ``progress(done, total)`` of the collision rates.

    Returns
    -------
    Verdict

    Raises
    ------
    OutOfRangeError
        Temperature outside the vapour-pressure formula or the curves.
    InputError, DataFileError, NotConvergedError
        As the rooms it calls.
    """
    atom, fill, n = alkali(question.alkali), question.fill, question.gas_density_cm3
    T = fill.temperature_K
    vapour = alkali_density(atom.symbol, T)  # first: it refuses temperatures before the long computation
    rates = None
    if question.gas is not None:
        rates = collision_rates(
            atom.symbol, question.gas, T, method=question.method, curves=question.curves, progress=progress
        )
    electronic = free_rates(atom) if rates is None else level_rates(atom, rates, n)
    isotope = max(atom.isotopes, key=lambda one: one.abundance.value)
    regimes = visible_regimes(isotope, electronic, fill.field_G)
    lines = {line: line_in_gas(atom, line, question, rates) for line in UPPER_LEVEL}
    duration = None if rates is None else _duration_s(rates, T)
    overlap = {}
    if rates is not None and duration is not None:
        overlap = {line: n * coefficient(rates, "fwhm", line) * duration for line in UPPER_LEVEL}
    spread = _diffusion(question)
    light_at = partial(pump_light, question, isotope, lines, rates)
    here = light_at()
    beam = None if here is None else here.beam
    trapped = _trapping(question, lines, vapour)
    ground = ground_balance(
        question,
        atom,
        isotope,
        vapour.density_cm3,
        None if spread is None else spread.chosen,
        _sticking(question),
        light_at,
    )
    return Verdict(
        question,
        isotope,
        rates,
        electronic,
        _balances(question, atom, isotope, electronic, rates, regimes),
        regimes,
        {level: hanle_fields(atom, level, electronic) for level in P_LEVELS},
        {line: _mixing(line, isotope, electronic, rates) for line in UPPER_LEVEL},
        {line: _scattering(atom, line, electronic, rates) for line in UPPER_LEVEL},
        {line: _model(atom, line, electronic, rates, n) for line in UPPER_LEVEL},
        vapour,
        spread,
        lines,
        trapped,
        beam,
        ground,
        duration,
        overlap,
        _warnings(atom, question, electronic, rates, vapour, trapped, beam, duration, overlap, regimes),
    )


def _duration_s(rates: CollisionRates, temperature_K: float) -> float:
    """Duration of the collisions that make the width of D2 [s], b/vbar (see fill.impact_parameter)."""
    width = coefficient(rates, "fwhm", "D2")
    return impact_parameter(width, temperature_K, rates.reduced_mass, 1.0) / width


def _balances(
    question: Question,
    atom: Alkali,
    isotope: Isotope,
    electronic: LevelRates,
    rates: CollisionRates | None,
    regimes: Mapping[str, Regime],
) -> dict[str, dict[int, RankBalance]]:
    found: dict[str, dict[int, RankBalance]] = {}
    for level in P_LEVELS:
        g, words = g_in_force(atom, isotope, regimes[level])
        found[level] = {}
        for K in range(1, round(2 * J_OF[level]) + 1):
            one = rank_balance(
                atom,
                level,
                K,
                electronic,
                None if rates is None else coefficient_error(rates, "multipole_loss", level, K),
                g,
                words,
                question.fill,
                rates is not None,
            )
            field, reach = crossover_field_G(atom, isotope, regimes[level], one)
            found[level][K] = replace(
                one,
                crossover_field_G=field,
                crossover_range_G=reach,
                hanle_range_G=hanle_range_G(atom, isotope, regimes[level], one),
            )
    return found


def impact_pressure(found: Verdict) -> tuple[str, float] | None:
    """Line whose width times collision duration first reaches IMPACT_LIMIT, and the fill pressure of that [Torr].

    Width and density are proportional, the duration is a property of the pair. None without a gas.
    """
    if not found.overlap:
        return None
    line = max(found.overlap, key=lambda one: found.overlap[one])
    worst = found.overlap[line]
    return line, found.question.fill.pressure_torr * IMPACT_LIMIT / worst if worst > 0 else math.inf


def _mixing(line: str, isotope: Isotope, electronic: LevelRates, rates: CollisionRates | None) -> Mixing:
    level = UPPER_LEVEL[line]
    ratio = electronic.loss[level][1] / electronic.decay[level]
    relative = None if rates is None else coefficient_error(rates, "multipole_loss", level, 1)
    surviving = surviving_orientation(line, None if rates is None else electronic)
    photons = None
    if line == "D1":
        photons = float(slowing_down(isotope.nuclear_spin, 1.0)) / spin_coefficients(line, surviving)[1]
    error = None if relative is None else relative * ratio
    return Mixing(line, level, ratio, error, surviving, pumping_kind(surviving), photons)


def _scattering(atom: Alkali, line: str, electronic: LevelRates, rates: CollisionRates | None) -> Polarisability:
    if rates is None:
        return scattering_polarisability(atom, line, electronic)
    level = UPPER_LEVEL[line]
    visible = max(electronic.loss[level]) if level == "P1/2" else 2
    return scattering_polarisability(
        atom,
        line,
        electronic,
        loss_error=coefficient_error(rates, "multipole_loss", level, visible),
        transfer_error=coefficient_error(rates, "transfer", level),
    )


def _model(atom: Alkali, line: str, electronic: LevelRates, rates: CollisionRates | None, n: float) -> ModelRates:
    if rates is None:
        return model_rates(atom, line, electronic, 0.0, {})
    level = UPPER_LEVEL[line]
    errors = {
        "width": coefficient_error(rates, "fwhm", line),
        "gamma_I": coefficient_error(rates, "transfer", level),
    } | {f"loss_{K}": coefficient_error(rates, "multipole_loss", level, K) for K in electronic.loss[level] if K}
    return model_rates(atom, line, electronic, n * coefficient(rates, "fwhm", line), errors)


def _diffusion(question: Question) -> Diffusion | None:
    """Diffusion in the gas of the cell; None without a gas, or for a perturber of the user's own."""
    if question.gas is None:
        return None
    return diffusion(question.alkali, question.gas, question.fill.temperature_K, question.curves)


def _sticking(question: Question) -> tuple[Sourced, Sourced] | None:
    """Equilibrium constant [cm^3] and rotation [1] of the pairs, where a published coupling lets them become a rate."""
    if question.gas not in SPECIES_GASES:
        return None
    pair = bound_pair(question.alkali, question.gas)
    if pair is None or pair.coupling_MHz is None:
        return None
    from pertcalc.molecules.molecule import molecule

    return sticking(
        molecule(question.alkali, question.gas, temperature=question.fill.temperature_K, curves=question.curves)
    )


def _trapping(question: Question, lines: Mapping[str, AbsorptionLine], vapour: VapourDensity) -> dict[str, Trapping]:
    sizes, density = question.cell.sizes_cm, vapour.density_cm3
    relative = None if density.error is None else density.error / density.value
    return {
        line: trapping(one, density.value, sizes[-1], min(sizes) / 2, density_error=relative)
        for line, one in lines.items()
    }


def _warnings(
    atom: Alkali,
    question: Question,
    electronic: LevelRates,
    rates: CollisionRates | None,
    vapour: VapourDensity,
    trapped: Mapping[str, Trapping],
    beam: Pumping | None,
    duration: float | None,
    overlap: Mapping[str, float],
    regimes: Mapping[str, Regime],
) -> tuple[str, ...]:
    found = [*vapour.warnings, *field_limits(atom, question.fill.field_G, electronic, duration).warnings]
    if rates is not None:
        found += rates.warnings
    found += [
        f"{line}: width times collision duration is {value:.2g}, above {IMPACT_LIMIT:g}: collisions overlap, the "
        "impact and binary assumptions fail and every collision rate is doubtful; lower the pressure."
        for line, value in overlap.items()
        if value > IMPACT_LIMIT
    ]
    if duration is not None:
        found += [
            f"{level}: the hyperfine structure turns the spins by {where.largest * duration:.2g} rad within a "
            f"collision of {duration:.2g} s: the nuclear spin is no spectator (limit {IMPACT_LIMIT:g} rad, common "
            "practice, no source)."
            for level, where in regimes.items()
            if where.largest * duration > IMPACT_LIMIT
        ]
    by_line = [warning for one in trapped.values() for warning in one.warnings]
    found += sorted(by_line, key=lambda warning: warning == INVALIDATES)  # the explanation after all lines
    if beam is not None:
        found += beam.warnings
    if coating := coating_warning(question.wall, question.fill.temperature_K):
        found.append(coating)
    return tuple(dict.fromkeys(found))


def hanle_of(found: Verdict, beam: str = "unpolarised") -> tuple[HanleCurves, GroundHanle | None]:
    """Hanle curves of D2 and of the ground level in the cell of a verdict, on one grid of fields.

    Parameters: ``beam`` "unpolarised" or "linear". The ground level is None where no damping is known.
    """
    ground, atom = found.ground, alkali(found.question.alkali)
    words, widest = max(ground.hanle.items(), key=lambda item: item[1].field_G, default=("", None))
    fields = field_grid(found.balances["P3/2"][2].hanle_G, None if widest is None else widest.field_G)
    curves = hanle_curves(atom, "D2", found.level_rates, fields, beam, collision_duration_s=found.duration_s)
    if widest is None:
        return curves, None
    damping = Sourced(widest.decay, "s^-1", words, COMPUTED)
    return curves, ground_hanle(found.isotope, damping, fields, words)
