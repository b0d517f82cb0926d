"""Levels, counts and equilibrium of a pair as text of at most 100 columns."""

from __future__ import annotations

import math
from typing import Any

import numpy as np

from pertcalc.constants import AMU_AU, AU_TIME_S, BOHR2_ANGSTROM2, BOHR_ANGSTROM, HARTREE_CM1
from pertcalc.molecules.molecule import Molecule
from pertcalc.molecules.radial import LIMITS, PARTS
from pertcalc.report.molecule_data import bound_rows, quasi_rows
from pertcalc.report.tables import number, percent, table, wrapped

# Quasi-bound levels shown when no N is asked for: --csv has all.
MOST_ROWS = 16
BOHR3_ANGSTROM3 = BOHR_ANGSTROM**3
READING = (
    "N: rotation of the pair, v: vibration; energies from the curve's own limit at infinite separation. +-: change by "
    "the curves' stated errors in first order ('?': not known). Extent: radius that holds 99.9 % of the probability.",
    "Each state is one adiabatic curve: spin-rotation, Lambda doubling and the coupling to other curves are left out. "
    "Nuclear spins and exchange statistics cancel in K: the partners are different atoms.",
    "Width: full width. delay: Lorentzian in d(phase)/dE, for broad levels; flux: outgoing flux over the probability "
    "inside the barrier, for narrow ones; WKB beside them.",
)


def molecule_text(found: Molecule) -> str:
    """The whole answer as text."""
    lines = _head(found)
    if not found.problem.has_well:
        return "\n".join([*lines, "", "The curve is purely repulsive: it has no bound and no quasi-bound level."])
    lines += ["", *_counts(found)]
    if len(found.levels.v) + len(found.quasi.v):
        lines += ["", *_levels(found)]
        lines += ["", *_quasi(found)]
    else:
        lines += wrapped("No level, bound or quasi-bound: the curve is repulsive, its well too shallow to hold one.")
    lines += ["", *_limit(found)]
    lines += ["", *_isotopes(found)]
    lines += ["", *_equilibrium(found)]
    lines += [""] + [line for note in READING for line in wrapped(note)]
    for warning in found.warnings:
        lines += wrapped(f"warning: {warning}")
    return "\n".join(lines)


def _head(found: Molecule) -> list[str]:
    problem, curves = found.problem, found.curves
    masses = f"isotopes {', '.join(found.isotopes)}" if found.isotopes else "natural unless the set says otherwise"
    sources = ", ".join(f"{name} {curves.states[name].mark}" for name in PARTS[found.state])
    lines = [
        f"{found.alkali} + {found.noble_gas}, state {found.state} (tends to {LIMITS[found.state]}): bound and "
        "quasi-bound pairs",
        f"curves {curves.id}, sha256 {curves.sha256}",
        f"  {sources}; reduced mass {problem.reduced_mass / AMU_AU:.6g} u ({masses})",
    ]
    if problem.has_well:
        depth, place = problem.depth * HARTREE_CM1, problem.position * BOHR_ANGSTROM
        lines.append(f"  well {number(depth)} cm^-1 deep at {number(place)} angstrom")
    return lines


def _counts(found: Molecule) -> list[str]:
    counts, levels = found.counts, found.levels
    weighted = int(np.sum(2 * levels.N + 1))
    by_N = levels.count_by_rotation
    highest = f"highest N = {len(by_N) - 1}" if by_N.size else "no level"
    rows = [
        ["spectrum (mapped grid)", str(counts.spectral[0]), str(counts.spectral.sum())],
        ["nodes of the solution at E = 0", str(counts.nodes[0]), str(counts.nodes.sum())],
        ["WKB with the r^-6 term", str(counts.wkb[0]), str(counts.wkb.sum())],
    ]
    lines = ["Number of levels, by three ways (COMPUTED)", *table(["", "N = 0", "all N"], rows)]
    lines += wrapped(
        f"{highest}; with 2N+1 each: {weighted}. WKB at N = 0 before rounding, all wells: {counts.wkb_real[0]:.2f}."
        + (" The three ways agree for every N." if counts.agree else "")
    )
    if found.count_error is not None:
        lines += wrapped(
            "by the curves' stated errors, added in quadrature: "
            f"N = 0 +- {found.count_error[0]:.2g}, all N +- {found.count_error[1]:.2g}"
        )
    for remark in counts.remarks:
        lines += wrapped(f"- {remark}", indent="    ", first="  ")
    if by_N.size:
        lines += wrapped(f"levels by N: {runs(by_N)}")
    return lines


def runs(counts: np.ndarray) -> str:
    """Counts for N = 0, 1, ... as text, equal neighbours together: "0-3: 10, 4-8: 9"."""
    edges = [0, *(np.flatnonzero(np.diff(counts)) + 1), len(counts)]
    spans = zip(edges[:-1], edges[1:], strict=True)
    return ", ".join(f"{a}: {counts[a]}" if b == a + 1 else f"{a}-{b - 1}: {counts[a]}" for a, b in spans)


def _levels(found: Molecule) -> list[str]:
    N = found.rotation or 0
    rows = [row for row in bound_rows(found) if row["N"] == N]
    title = f"Bound levels of N = {N}, COMPUTED"
    if not rows:
        return [f"{title}: none"]
    error = found.levels.numerical_error * HARTREE_CM1
    body = [
        [
            str(row["v"]),
            f"{number(row['energy_cm-1'], 6)} +- {_error(row['model_error_cm-1'])}",
            number(row["B_cm-1"], 5),
            *(number(row[key] * BOHR_ANGSTROM, 5) for key in ("R_inner_bohr", "R_outer_bohr", "R_extent_bohr")),
        ]
        for row in rows
    ]
    headers = ["v", "E, cm^-1\n+- curves", "B_v\ncm^-1", "inner turning\npoint, angstrom", "outer\nangstrom"]
    return [*_titled(title, error), *table([*headers, "extent\nangstrom"], body)]


def _titled(title: str, error: float) -> list[str]:
    return wrapped(f"{title}; numerical error {number(error, 2)} cm^-1 at most", "")


def _error(value: float | None) -> str:
    return "?" if value is None else number(value, 2)


def _quasi(found: Molecule) -> list[str]:
    rows = list(quasi_rows(found))
    where = "all N" if found.rotation is None else f"N = {found.rotation}"
    title = f"Quasi-bound levels behind a barrier, {where}: {len(rows)}, COMPUTED"
    if not rows:
        return [title]
    error = found.quasi.numerical_error * HARTREE_CM1
    shown = rows if found.rotation is not None else _spread(rows)
    body = [
        [
            str(row["N"]),
            str(row["v"]),
            f"{number(row['energy_cm-1'], 5)} +- {_error(row['model_error_cm-1'])}",
            number(row["barrier_cm-1"]),
            number(row["width_cm-1"], 3),
            row["width_method"] or "-",
            number(row["width_wkb_cm-1"], 3),
            number(row["life_s"], 2),
        ]
        for row in shown
    ]
    headers = ["N", "v", "E, cm^-1\n+- curves", "barrier\ncm^-1", "width\ncm^-1", "by", "width by\nWKB", "life\ns"]
    lines = [*_titled(title, error), *table(headers, body, left=2)]
    if len(shown) < len(rows):
        lines += wrapped(f"{len(shown)} of {len(rows)} shown; --csv and --json have all, --rotation N those of one N.")
    return lines


def _spread(rows: list[dict[str, Any]]) -> list[dict[str, Any]]:
    """At most MOST_ROWS rows, evenly chosen."""
    if len(rows) <= MOST_ROWS:
        return rows
    return [rows[round(i)] for i in np.linspace(0, len(rows) - 1, MOST_ROWS)]


def _limit(found: Molecule) -> list[str]:
    lines = ["Near the limit"]
    law = found.law
    if law is not None and law.observed.size:
        ratios = ", ".join(f"{ratio:.3f}" for ratio in law.ratios)
        lines += wrapped(
            f"r^-6 law (LeRoy and Bernstein 1970, FROM MEMORY): |E|^(1/3) of the last levels of N = 0 falls with v by "
            f"{ratios} times the law's slope; extrapolated to the limit v = {law.v_D:.2f}, that is {law.count} levels."
        )
    else:
        lines += wrapped("r^-6 law: needs two levels of N = 0 and a C6 tail.")
    if found.state == "X":
        a, error = found.counts.scattering_length, found.counts.scattering_error
        lines += wrapped(
            f"scattering length {number(a, 4)} +- {number(error, 1)} bohr (numerical); it hangs on the fraction "
            "of a level at the limit, so the curves' errors may give it any value unless the well is shallow."
        )
    return lines


def _isotopes(found: Molecule) -> list[str]:
    rows = [
        [
            f"{one.alkali}-{one.perturber}",
            f"{one.reduced_mass_u:.5g}",
            str(one.N0),
            str(one.total),
            "-" if one.N_max is None else str(one.N_max),
        ]
        for one in found.isotope_counts
    ]
    return ["Isotopes, by nodes (COMPUTED)", *table(["", "reduced mass, u", "N = 0", "all N", "highest N"], rows)]


def _equilibrium(found: Molecule) -> list[str]:
    balance, n = found.equilibrium, found.density_cm3
    lines = [f"Equilibrium at {found.temperature_K:.6g} K, K = [pairs]/([alkali][gas]) in cubic angstrom, COMPUTED"]
    if balance is None:
        lines += wrapped(f"not given: {found.no_equilibrium}.")
        return lines + _times(found)
    unit = BOHR3_ANGSTROM3
    pairs = (
        ("bound", balance.bound, balance.classical),
        ("metastable", balance.metastable, balance.classical_metastable),
        ("together", balance.total, balance.classical + balance.classical_metastable),
    )
    body = [[name, number(q * unit), number(c * unit), number(n * q * unit * 1e-24, 3)] for name, q, c in pairs]
    lines += table(["", "from levels", "classical", "n K at the fill"], body)
    lines += wrapped(
        f"errors: numerical {percent(balance.numerical_error)}, curves {percent(balance.model_error)}."
        + (
            f" Of the metastable, {number(found.long_lived * unit)} cubic angstrom tunnel out more slowly than "
            "collisions break them at this fill."
            if balance.metastable
            else ""
        )
    )
    if balance.weight != 1:
        lines += wrapped(f"K counts atoms in {LIMITS[found.state]}; this curve has {balance.weight:g} of its states.")
    lines += wrapped(
        f"fill {found.pressure_torr:.4g} Torr at {found.fill_temperature_K:.5g} K, n = {n:.3e} cm^-3: "
        f"{100 * found.fraction:.2g} % of the alkali atoms are bound or metastable at any time."
    )
    return lines + _times(found)


def _times(found: Molecule) -> list[str]:
    times = found.times
    if times is None:
        return []
    parts = f"a pair lives {number(times.break_up * AU_TIME_S, 2)} s"
    if math.isfinite(times.formation) and found.equilibrium is not None:
        parts += f", a free atom waits {number(times.formation * AU_TIME_S, 2)} s for its next pair"
    area = times.cross_section * BOHR2_ANGSTROM2
    return wrapped(
        f"ESTIMATE, within a factor two or so: {parts}. Assumed: every collision with a gas atom inside the pair's own "
        f"size, pi Re^2 = {area:.3g} square angstrom, breaks the pair (strong collisions), and pairs are made by the "
        "reverse, three-body collisions."
    )
