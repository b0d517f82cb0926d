"""A verdict as text of at most 100 columns: one sentence per level, the table of all rates, and what they rest on."""

from __future__ import annotations

import re
from dataclasses import replace

from pertcalc.report.report_text import Citations
from pertcalc.report.tables import UNKNOWN, WIDTH, number, percent, table, wrapped
from pertcalc.report.verdict_words import (
    BEYOND,
    MARKS,
    READING,
    ROUGH,
    VISIBLE,
    caveats,
    field_range,
    impact_limit_torr,
    mixing_sentence,
    sentences,
)
from pertcalc.report.words import CAUTIONS
from pertcalc.species import COMPUTED, Sourced
from pertcalc.vapour.excited import RankBalance
from pertcalc.vapour.fill import DEFAULTS_ORIGIN
from pertcalc.vapour.ground import GroundProcess
from pertcalc.vapour.ground_balance import PUMPING
from pertcalc.vapour.level_rates import J_OF
from pertcalc.vapour.process import weakest_mark
from pertcalc.vapour.verdict import Verdict

CELSIUS_ZERO_K = 273.15


def verdict_text(found: Verdict) -> str:
    """The whole verdict."""
    cite = Citations()
    lines = _head(found, cite)
    lines += ["", _title("What rules each level")]
    for sentence in sentences(found).values():
        lines += wrapped(sentence, "    ", "  ")
    lines += ["", *_excited(found, cite)]
    lines += ["", *_ground(found, cite)]
    lines += ["", *_scattering(found)]
    lines += ["", *_light(found)]
    lines += ["", *_models(found)]
    if found.warnings:
        lines += ["", _title("Warnings"), *(line for one in found.warnings for line in wrapped(one, "    ", "  - "))]
    lines += ["", _title("Sources"), *cite.lines()]
    lines += ["", _title("How to read the numbers"), *(line for note in READING for line in wrapped(note))]
    lines += ["", _title("Cautions"), *(line for note in CAUTIONS for line in wrapped(note, "    ", "  - "))]
    return "\n".join(lines)


def _title(words: str) -> str:
    return f"== {words} ".ljust(WIDTH, "=")


def _head(found: Verdict, cite: Citations) -> list[str]:
    question, fill, n = found.question, found.question.fill, found.question.gas_density_cm3
    gas = "without buffer gas" if question.gas is None else f"in {question.gas}"
    method = "" if found.rates is None else f", method {question.method}, curves {found.rates.curves_id}"
    rows = [
        ("temperature", "temperature", f"{fill.temperature_K:.6g} K ({fill.temperature_K - CELSIUS_ZERO_K:.4g} degC)")
    ]
    if question.gas is not None:
        rows += [
            ("pressure", "fill", f"{fill.pressure_torr:.6g} Torr"),
            ("fill temperature", "fill at", f"{fill.fill_temperature_K:.6g} K; n = {n:.4e} cm^-3"),
        ]
    rows.append(("field", "field", f"{fill.field_G:.6g} G"))
    rows.append(("cell", "cell", f"{question.cell.words}, {question.wall} wall"))
    lines = [f"{question.alkali} {gas}{method}: what rules the polarisation", ""]
    for name, words, value in rows:
        given = f"  default ({DEFAULTS_ORIGIN})" if name in question.defaults else ""
        lines.append(f"  {words:14}{value:42}{given}".rstrip())
    if question.light is not None:
        beam = question.light.beam
        tuned = "the peak" if beam.detuning_GHz is None else f"{beam.detuning_GHz:g} GHz"
        lines.append(
            f"  {'light':14}{question.light.line}, {beam.power_W * 1e3:g} mW in {beam.diameter_cm:g} cm, circular, at "
            f"{tuned}"
        )
    density = found.vapour.density_cm3
    lines.append(
        f"  {question.alkali + ' density':14}{_value(density, 'cm^-3')} over the {found.vapour.phase} "
        f"{cite(_origin(density))}; hyperfine structure of {found.isotope.label}"
    )
    return lines


def _origin(value: Sourced) -> str:
    return f"{value.mark}: {value.source}"


def _value(value: Sourced | None, unit: str = "") -> str:
    """``value +- error unit``: in per cent, or absolute where it is as large as the value."""
    if value is None:
        return UNKNOWN
    if value.value == 0:
        return "0"
    if value.error is not None and _rough(value):
        error = number(value.error, 2)
    else:
        error = percent(None if value.error is None else abs(value.error / value.value))
    return f"{number(value.value, 3)} +- {error} {unit}".rstrip()


def _narrow(cells: list[str]) -> list[str]:
    """Cells of a wide table with 3.61e7 for 3.61e+07."""
    return [re.sub(r"e([+-])0*(\d)", lambda m: f"e{m[1].strip('+')}{m[2]}", cell) for cell in cells]


def _excited(found: Verdict, cite: Citations) -> list[str]:
    headers = ["level", "K", "decay\ns^-1", "collisions\ns^-1", "Larmor\nrad/s", "Hanle\nfield, G",
               "who wins,\nby a factor", "cross,\nTorr", "cross,\nG"]  # fmt: skip
    limit = impact_limit_torr(found)
    rows = [
        _narrow(_rank_row(balance, K == VISIBLE[level], limit))
        for level, ranks in found.balances.items()
        for K, balance in ranks.items()
    ]
    lines = [_title("Excited levels: every rank"), *table(headers, rows)]
    meanings = {
        ROUGH: f"{MARKS[ROUGH]} {ROUGH}: the error is larger than the crossover pressure",
        BEYOND: f"{MARKS[BEYOND]} {BEYOND}: collisions overlap above {number(limit, 2)} Torr",
    }
    marked = "".join(row[7] for row in rows)
    lines += [line for doubt, words in meanings.items() if MARKS[doubt] in marked for line in wrapped(words + ".")]
    for level in found.regimes:
        balance = found.balances[level][VISIBLE[level]]
        decay, free = balance.radiative, number(balance.hanle_free_G, 3)
        words = f"radiative decay {_value(decay, 's^-1')} {cite(_origin(decay))}, alone a Hanle field of {free} G"
        lines += wrapped(f"{level}: {words}.", "    ", "  ")
        lines += wrapped(f"{level}: {_whose_rank(found, level, cite)}.", "    ", "  ")
    return lines


def _whose_rank(found: Verdict, level: str, cite: Citations) -> str:
    """Whether rank K is electronic or of each F, and with which g factor."""
    where, g = found.regimes[level], found.balances[level][VISIBLE[level]].g_factor
    structure = f"hyperfine structure of {where.isotope} {where.structure} within decay and collisions"
    if where.g_factor == "g_J":
        if where.structure != "unresolved":
            structure = f"nuclear spin of {where.isotope} decoupled in this field"
        even = " even in this weak field" if where.nucleus == "coupled" else ""
        return f"{structure}, so rank K is electronic{even}, with g_J = {number(g.value, 4)} {cite(_origin(g))}"
    F = J_OF[level] + found.isotope.nuclear_spin
    g_F = f"g_F = {number(g.value, 4)} of F={F:g} {cite(_origin(g))}"
    coupled = f"{structure}, nuclear spin {where.nucleus} in this field"
    if where.g_factor == "g_F":
        return f"{coupled}: rank K belongs to each F; the table has {g_F}"
    g_J = number(found.ground.atom.levels[level].gJ.value, 4)
    return (
        f"{coupled}: neither g_J = {g_J} nor {g_F} holds, only the full curve does (--plot-hanle); fields are given "
        "from g_J to g_F, the Larmor frequency with g_F"
    )


def _rank_row(balance: RankBalance, visible: bool, limit_torr: float) -> list[str]:
    doubts = caveats(balance.crossover_pressure_torr, balance.crossover_pressure_error, limit_torr)
    meet = number(balance.crossover_pressure_torr, 1 if ROUGH in doubts else 3)
    return [
        f"{balance.level}{'*' if visible else ''}",
        str(balance.rank),
        number(balance.radiative.value, 3),
        _value(balance.collisional),
        number(balance.larmor, 3),
        field_range(*balance.hanle_range_G),
        balance.dominant.replace("radiative ", "")
        + (f" {number(balance.factor, 2)}" if balance.ranking[1][1] > 0 else ""),
        "".join(MARKS[one] for one in doubts) + meet,
        field_range(*balance.crossover_range_G),
    ]


def _ground(found: Verdict, cite: Citations) -> list[str]:
    ground = found.ground
    rows = [_process_row(p, d, cite) for p, d in zip(ground.processes, ground.decays, strict=True)]
    rows.append(["sum of the known", "", _value(ground.total), *_marked(ground.total, cite)])
    if ground.pumping is not None:
        rows.append([PUMPING, "", _value(ground.pumping), *_marked(ground.pumping, cite)])
    words = f"field (F={ground.isotope.nuclear_spin + 0.5:g}, g_F={number(ground.g_F, 4)})"
    g_J = ground.atom.levels["S1/2"].gJ
    g_F = replace(g_J, mark=weakest_mark((COMPUTED, g_J.mark)), source=f"g_F = g_J/(2I+1), g_J {g_J.source}")
    rows.append([words, "", f"{number(ground.larmor, 3)} rad/s", *_marked(g_F, cite)])
    headers = ["process", "rate\ns^-1", "decay of <F_z>\ns^-1", "mark", "source"]
    lines = [_title(f"Ground level S1/2 of {ground.isotope.label}"), *table(headers, [*map(_narrow, rows)])]
    lines += [
        line for p in ground.processes if p.rate is None for line in wrapped(f"{p.name}: {p.reason}", "    ", "  ")
    ]
    lines += [f"  {p.name}: only the order of magnitude is known" for p in ground.processes if _rough(p.rate)]
    regime = (
        "spin exchange is fastest: a spin temperature holds" if ground.fast_exchange else "spin exchange is not fastest"
    )
    fields = ", ".join(f"{number(one.field_G, 3)} G ({words})" for words, one in ground.hanle.items())
    lines += wrapped(f"{regime}. Hanle fields: {fields or 'none, no rate is known'}.", "    ", "  ")
    if found.diffusion is not None:
        n, spread = found.question.gas_density_cm3, found.diffusion
        lines += wrapped(
            f"diffusion: D = {number(spread.chosen.value / n, 3)} cm^2/s in this cell {cite(_origin(spread.chosen))}; "
            f"computed from curve X {number(spread.computed.value / n, 3)} cm^2/s. {spread.reason}",
            "    ",
            "  ",
        )
    return lines


def _process_row(acts: GroundProcess, decays: GroundProcess, cite: Citations) -> list[str]:
    decay = "destroys none" if not acts.destroys else _value(decays.rate)
    return [acts.name, _value(acts.rate), decay, *_marked(acts.rate, cite)]


def _marked(value: Sourced | None, cite: Citations) -> tuple[str, str]:
    """Mark and number of the source, empty for an unknown."""
    return ("", "") if value is None else (value.mark, cite(_origin(value)))


def _rough(value: Sourced | None) -> bool:
    """Whether the error is as large as the value."""
    return value is not None and value.error is not None and value.error >= abs(value.value) > 0


def _scattering(found: Verdict) -> list[str]:
    rows, parts = [], []
    for line, one in found.scattering.items():
        W2 = number(one.W2.value, 3) + (f" +- {number(one.W2.error, 2)}" if one.W2.error else "")
        degrees = [number(degree, 3) for degree in (one.unpolarised, one.linear, one.electronic)]
        rows.append([line, W2, *degrees, one.W2.mark])
        if len(one.by_isotope) > 1 and one.electronic:
            values = ", ".join(f"{label} {number(W2, 3)}" for label, W2 in one.by_isotope.items())
            parts += wrapped(f"W2 of {line} by isotope: {values}.", "    ", "  ")
    headers = ["line", "W2", "P at 90 deg\nunpolarised", "p at 90 deg\nlinear", "W2 without\nnuclear spin", "mark"]
    title = _title("Scattered light at zero field, natural mixture")
    return [title, *table(headers, [*map(_narrow, rows)]), *parts]


def _light(found: Verdict) -> list[str]:
    rows = []
    for line, one in found.lines.items():
        trapped = found.trapping[line]
        rows.append(
            [
                line,
                number(one.lorentz_fwhm_GHz, 3),
                _shift(one.shift_GHz),
                number(one.doppler_fwhm_GHz, 3),
                one.resolution("S1/2"),
                number(one.peak()[1], 3),
                _value(trapped.optical_depth),
                "needed" if trapped.matters else "not needed",
            ]
        )
    headers = ["line", "Lorentz\nGHz", "shift\nGHz", "Doppler\nGHz", "ground\nhyperfine", "peak\ncm^2", "optical depth",
               "quenching gas\nto pump on it"]  # fmt: skip
    lines = [_title("Absorption and pumping (COMPUTED)"), *table(headers, rows)]
    for mixing in found.mixing.values():
        lines += wrapped(mixing_sentence(mixing), "    ", "  ")
    beam = found.pumping
    if beam is None:
        return [*lines, *wrapped("no light given: add --power '1 mW' --beam-diameter '5 mm' for pumping rates.")]
    spin = beam.spin
    photons = (
        spin.reason if spin.photons_per_atom is None else f"{_value(spin.photons_per_atom)} photons per polarised atom"
    )
    field = "" if beam.light_shift_field_G is None else f" (effective field {_value(beam.light_shift_field_G, 'G')})"
    lines += wrapped(
        f"pumping on {beam.line}: absorption {_value(beam.rate, 's^-1')}, light shift "
        f"{_value(beam.light_shift, 'rad/s')}{field}, saturation parameter {number(beam.saturation, 2)}, {spin.kind} "
        f"pumping, {photons}, 1/e time {number(spin.time_s, 2)} s without relaxation.",
        "    ",
        "  ",
    )
    return lines


def _shift(value_GHz: float) -> str:
    """A shift [GHz], in MHz where it is below 1e-3 GHz."""
    small = 0 < abs(value_GHz) < 1e-3
    return f"{number(1e3 * value_GHz, 3, sign=True)} MHz" if small else number(value_GHz, 3, sign=True)


def _models(found: Verdict) -> list[str]:
    rows = []
    for one in found.models.values():
        row = [one.line, number(one.gamma_R, 4)]
        for key, value in (("gamma_I", one.gamma_I), ("gamma_E", one.gamma_E)):
            row.append(f"{number(value, 3)} +- {percent(one.errors.get(key))}" if value else "0")
        for K in (1, 2, 3):
            D = one.depolarising.get(K)
            row.append(UNKNOWN if D is None else f"{number(D, 3)} +- {percent(one.errors.get(f'D{K}'))}" if D else "0")
        rows.append(_narrow(row))
    headers = ["line", "Gamma_R", "Gamma_I", "Gamma_E", "D1", "D2", "D3"]
    return [_title("For a model of polarised lines, s^-1 (COMPUTED; --csv has them)"), *table(headers, rows)]
