"""A verdict as one JSON object, ``pertcalc.verdict/1``, and as CSV rows for a model of polarised lines."""

from __future__ import annotations

import math
from dataclasses import asdict
from typing import Any

from pertcalc.report.rows import as_csv
from pertcalc.report.verdict_words import caveats, impact_limit_torr, sentences
from pertcalc.report.words import CAUTIONS
from pertcalc.species import COMPUTED, UPPER_LEVEL, Sourced
from pertcalc.vapour.excited import ModelRates, RankBalance
from pertcalc.vapour.fill import DEFAULTS_ORIGIN
from pertcalc.vapour.ground import GroundProcess
from pertcalc.vapour.ground_balance import GroundBalance
from pertcalc.vapour.hanle_fields import HanleField
from pertcalc.vapour.process import weakest_mark
from pertcalc.vapour.pumping import Pumping
from pertcalc.vapour.verdict import Verdict


def verdict_json(found: Verdict) -> dict[str, Any]:
    """The object of ``pertcalc verdict --json``: plain types, units in the names, no nan."""
    question, rates = found.question, found.rates
    levels: dict[str, Any] = {"S1/2": _ground(found.ground)}
    for level, ranks in found.balances.items():
        levels[level] = {str(K): _rank(balance, impact_limit_torr(found)) for K, balance in ranks.items()}
    return {
        "schema": "pertcalc.verdict/1",
        "alkali": question.alkali,
        "noble_gas": question.gas,
        "method": question.method if rates is not None else None,
        "curves": None if rates is None else {"id": rates.curves_id, "sha256": rates.curves_sha256},
        "conditions": _conditions(found),
        "levels": levels,
        "hyperfine": {level: _hyperfine(found, level) for level in found.balances},
        "W2": {line: one.W2.value for line, one in found.scattering.items()},
        "scattering": {
            line: {
                "W2": asdict(one.W2),
                "by_isotope": dict(one.by_isotope),
                "weights": dict(one.weights),
                "degree_90_unpolarised": one.unpolarised,
                "degree_90_linear": one.linear,
            }
            for line, one in found.scattering.items()
        },
        "model_rates": {line: asdict(one) for line, one in found.models.items()},
        "mixing": {level: asdict(one) for level, one in found.mixing.items()},
        "vapour": {
            "density_cm3": asdict(found.vapour.density_cm3),
            "pressure_torr": asdict(found.vapour.pressure_torr),
            "phase": found.vapour.phase,
        },
        "diffusion": _diffusion(found),
        "absorption": {line: _absorption(found, line) for line in found.lines},
        "pumping": None if found.pumping is None else _pumping(found.pumping),
        "width_times_collision_duration": dict(found.overlap),
        "collision_duration_s": found.duration_s,
        "sentences": sentences(found),
        "warnings": list(found.warnings),
        "cautions": list(CAUTIONS),
        "version": found.version,
    }


def _conditions(found: Verdict) -> dict[str, Any]:
    question, fill = found.question, found.question.fill
    has_gas = question.gas is not None
    light = question.light
    return {
        "temperature_K": fill.temperature_K,
        "pressure_torr": fill.pressure_torr if has_gas else None,
        "fill_temperature_K": fill.fill_temperature_K if has_gas else None,
        "gas_density_cm3": question.gas_density_cm3,
        "field_G": fill.field_G,
        "cell": question.cell.words,
        "wall": question.wall,
        "beam_diameter_cm": question.beam_diameter_cm,
        "light": None if light is None else {"line": light.line, **asdict(light.beam)},
        "isotope_of_the_ground_level": found.isotope.label,
        "defaults": list(question.defaults),
        "defaults_origin": DEFAULTS_ORIGIN,
    }


def _finite(value: float) -> float | None:
    return value if math.isfinite(value) else None


def _rank(balance: RankBalance, limit_torr: float) -> dict[str, Any]:
    (hanle_low, hanle_high), (crossover_low, crossover_high) = balance.hanle_range_G, balance.crossover_range_G
    return {
        "radiative_s": balance.radiative.value,
        "radiative_error_s": balance.radiative.error,
        "radiative_mark": balance.radiative.mark,
        "collisional_s": balance.collisional.value,
        "collisional_error_s": balance.collisional.error,
        "collisional_mark": balance.collisional.mark,
        "larmor_rad_s": balance.larmor,
        "larmor_with": balance.field_with,
        "larmor_mark": balance.g_factor.mark,
        "g_factor": asdict(balance.g_factor),
        "hanle_free_field_G": balance.hanle_free_G,
        "hanle_field_G": balance.hanle_G,
        "hanle_field_low_G": hanle_low,
        "hanle_field_high_G": hanle_high,
        "hanle_field_error_G": balance.hanle_error_G,
        "dominant": balance.dominant,
        "factor": _finite(balance.factor),
        "comparable": list(balance.comparable),
        "crossover_pressure_Torr": balance.crossover_pressure_torr,
        "crossover_pressure_error_relative": balance.crossover_pressure_error,
        "crossover_pressure_caveats": caveats(
            balance.crossover_pressure_torr, balance.crossover_pressure_error, limit_torr
        ),
        "crossover_field_G": balance.crossover_field_G,
        "crossover_field_low_G": crossover_low,
        "crossover_field_high_G": crossover_high,
    }


def _ground(ground: GroundBalance) -> dict[str, Any]:
    return {
        "isotope": ground.isotope.label,
        "processes": [_process(p, d) for p, d in zip(ground.processes, ground.decays, strict=True)],
        "relaxation_s": _sourced(ground.total),
        "unknown": list(ground.unknown),
        "spin_temperature": ground.fast_exchange,
        "pumping_s": _sourced(ground.pumping),
        "precession_damping_by_spin_exchange_s": _sourced(ground.exchange),
        "larmor_rad_s": ground.larmor,
        "larmor_mark": weakest_mark((COMPUTED, ground.atom.levels["S1/2"].gJ.mark)),
        "g_F": ground.g_F,
        "hanle_field_G": ground.crossover_field_G,
        "hanle_fields_G": {words: field.field_G for words, field in ground.hanle.items()},
        "dominant": ground.dominant,
        "factor": _finite(ground.factor),
        "strongest_relaxation": None if ground.strongest is None else ground.strongest.name,
        "crossover_pressure_Torr": ground.crossover_pressure_torr,
        "crossover_pressure_error_relative": ground.crossover_pressure_error,
        "crossover_pressure_caveats": caveats(ground.crossover_pressure_torr, ground.crossover_pressure_error),
        "crossover_step": ground.crossover_step,
        "crossover_field_G": ground.crossover_field_G,
    }


def _process(acts: GroundProcess, decays: GroundProcess) -> dict[str, Any]:
    return {
        "name": acts.name,
        "rate_s": _sourced(acts.rate),
        "orientation_decay_s": _sourced(decays.rate) if decays.destroys else None,
        "on": "electron spin" if acts.on_electron else "whole atom",
        "destroys_orientation": acts.destroys,
        "reason": acts.reason,
        "note": acts.note,
    }


def _hyperfine(found: Verdict, level: str) -> dict[str, Any]:
    where = found.regimes[level]
    return {
        "isotope": where.isotope,
        "splittings_rad_s": [where.smallest, where.largest],
        "structure": where.structure,
        "nucleus": where.nucleus,
        "g_factor": where.g_factor,
        "hanle_fields": [_field(one) for one in found.fields[level]],
    }


def _field(one: HanleField) -> dict[str, Any]:
    return {
        "rank": one.rank,
        "isotope": one.isotope,
        "F": one.F,
        "basis": one.basis,
        "g": one.g,
        "loss_s": one.loss,
        "free_field_G": one.free_G,
        "field_G": one.field_G,
        "mark": one.mark,
    }


def _diffusion(found: Verdict) -> dict[str, Any] | None:
    spread = found.diffusion
    if spread is None:
        return None
    n = found.question.gas_density_cm3
    return {
        "D_cm2_s": spread.chosen.value / n,
        "product_nD": asdict(spread.chosen),
        "choice": spread.reason,
        "computed_nD": asdict(spread.computed),
        "measured": [asdict(one) for one in spread.measured],
    }


def _absorption(found: Verdict, line: str) -> dict[str, Any]:
    profile, trapped = found.lines[line], found.trapping[line]
    at, peak = profile.peak()
    return {
        "natural_fwhm_GHz": profile.natural_fwhm_GHz,
        "doppler_fwhm_GHz": profile.doppler_fwhm_GHz,
        "lorentz_fwhm_GHz": profile.lorentz_fwhm_GHz,
        "shift_GHz": profile.shift_GHz,
        "peak_detuning_GHz": at,
        "peak_cross_section_cm2": peak,
        "ground_hyperfine": profile.resolution("S1/2"),
        "upper_hyperfine": profile.resolution(UPPER_LEVEL[line]),
        "trapping": {
            "optical_depth": asdict(trapped.optical_depth),
            "depth_to_wall": trapped.depth_to_wall,
            "reabsorbed_per_excitation": trapped.reabsorbed,
            "quenching_gas_needed": trapped.matters,
        },
    }


def _pumping(light: Pumping) -> dict[str, Any]:
    found = asdict(light)
    found["spin"]["time_s"] = _finite(light.spin.time_s)
    return found


def _sourced(value: Sourced | None) -> dict[str, Any] | None:
    return None if value is None else asdict(value)


def verdict_csv(found: Verdict) -> str:
    """One row per line: Gamma_R, Gamma_I, Gamma_E, D1, D2 (and D3) in ``unit`` s^-1, relative errors, conditions."""
    return as_csv(_model_row(found, one) for one in found.models.values())


def _model_row(found: Verdict, one: ModelRates) -> dict[str, Any]:
    question, fill, W2 = found.question, found.question.fill, found.scattering[one.line].W2
    D = {f"D{K}": one.depolarising.get(K) for K in (1, 2, 3)}
    values = {"Gamma_R": one.gamma_R, "Gamma_I": one.gamma_I, "Gamma_E": one.gamma_E} | D
    keys = {"Gamma_R": "gamma_R", "Gamma_I": "gamma_I", "Gamma_E": "gamma_E"}
    errors = {name: one.errors.get(keys.get(name, name)) for name in values}
    return (
        {"alkali": question.alkali, "noble_gas": question.gas or "none", "line": one.line}
        | {"upper_level": UPPER_LEVEL[one.line]}
        | values
        | {"unit": "s^-1"}
        | {f"{name}_error_relative": error for name, error in errors.items()}
        | {"W2": W2.value, "W2_error": W2.error, "W2_mark": W2.mark}
        | {"temperature_K": fill.temperature_K, "gas_density_cm3": question.gas_density_cm3, "field_G": fill.field_G}
        | {"method": None if found.rates is None else question.method, "mark": COMPUTED}
        | {"Gamma_R_mark": found.balances[UPPER_LEVEL[one.line]][1].radiative.mark, "version": found.version}
    )
