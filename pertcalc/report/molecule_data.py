"""Levels and equilibrium of a pair as plain data: the JSON contract ``pertcalc.molecule/1`` and the rows of --csv."""

from __future__ import annotations

import math
from collections.abc import Iterator
from typing import Any

import numpy as np

from pertcalc.constants import AMU_AU, AU_TIME_S, BOHR_ANGSTROM, BOHR_CM, HARTREE_CM1
from pertcalc.molecules.molecule import Molecule
from pertcalc.molecules.quasibound import QuasiLevels
from pertcalc.molecules.radial import PARTS
from pertcalc.species import COMPUTED

BOHR3_CM3 = BOHR_CM**3
# hbar over a width of 1 cm^-1 [s].
LIFE_CM1 = AU_TIME_S * HARTREE_CM1


def bound_rows(found: Molecule) -> Iterator[dict[str, Any]]:
    """One plain dict per bound level (of the rotation asked for), in cm^-1 and bohr."""
    levels = found.levels
    for i in np.flatnonzero(_shown(found, levels.N)):
        yield {
            "v": int(levels.v[i]),
            "N": int(levels.N[i]),
            "energy_cm-1": float(levels.energy[i] * HARTREE_CM1),
            "model_error_cm-1": None if levels.model_error is None else float(levels.model_error[i] * HARTREE_CM1),
            "B_cm-1": float(levels.rotation[i] * HARTREE_CM1),
            "R_inner_bohr": float(levels.inner[i]),
            "R_outer_bohr": float(levels.outer[i]),
            "R_extent_bohr": float(levels.extent[i]),
        }


def quasi_rows(found: Molecule) -> Iterator[dict[str, Any]]:
    """One plain dict per quasi-bound level (of the rotation asked for), in cm^-1, bohr and s."""
    quasi = found.quasi
    for i in np.flatnonzero(_shown(found, quasi.N)):
        width = _cm1(quasi.width[i])
        yield {
            "v": int(quasi.v[i]),
            "N": int(quasi.N[i]),
            "energy_cm-1": float(quasi.energy[i] * HARTREE_CM1),
            "model_error_cm-1": None if quasi.model_error is None else _cm1(quasi.model_error[i]),
            "barrier_cm-1": float(quasi.barrier[i] * HARTREE_CM1),
            "R_inner_bohr": float(quasi.inner[i]),
            "R_outer_bohr": float(quasi.outer[i]),
            "width_cm-1": width,
            "width_method": width_method(quasi, i),
            "width_flux_cm-1": _cm1(quasi.width_flux[i]),
            "width_wkb_cm-1": _cm1(quasi.width_wkb[i]),
            "width_delay_cm-1": _cm1(quasi.width_delay[i]),
            "life_s": LIFE_CM1 / width if width else None,
        }


def _shown(found: Molecule, N: Any) -> Any:
    return np.ones(len(N), dtype=bool) if found.rotation is None else found.rotation == N


def _cm1(value: float) -> float | None:
    """An energy [hartree] in cm^-1, None where it is not known."""
    return float(value * HARTREE_CM1) if math.isfinite(value) else None


def width_method(quasi: QuasiLevels, i: Any) -> str | None:
    """Which way gave the width: "delay", "flux", or None where there is none."""
    if quasi.by_delay[i]:
        return "delay"
    return "flux" if math.isfinite(quasi.width_flux[i]) else None


def molecule_csv_rows(found: Molecule) -> list[dict[str, Any]]:
    """Bound and quasi-bound levels as rows with the same keys, None where a key does not apply."""
    bound = [{"kind": "bound"} | row for row in bound_rows(found)]
    quasi = [{"kind": "quasi-bound"} | row for row in quasi_rows(found)]
    keys = list(dict.fromkeys(key for row in (*bound, *quasi) for key in row))
    return [{key: row.get(key) for key in keys} | {"mark": COMPUTED} for row in (*bound, *quasi)]


def molecule_json(found: Molecule) -> dict[str, Any]:
    """The object of ``pertcalc molecule --json``: contract ``pertcalc.molecule/1``."""
    levels, problem = found.levels, found.problem
    return {
        "schema": "pertcalc.molecule/1",
        "alkali": found.alkali,
        "noble_gas": found.noble_gas,
        "state": found.state,
        "isotopes": list(found.isotopes),
        "curves": {
            "id": found.curves.id,
            "sha256": found.curves.sha256,
            "marks": {name: found.curves.states[name].mark for name in PARTS[found.state]},
        },
        "reduced_mass_u": problem.reduced_mass / AMU_AU,
        "well": {
            "depth_cm-1": problem.depth * HARTREE_CM1,
            "position_angstrom": problem.position * BOHR_ANGSTROM,
        }
        if problem.has_well
        else None,
        "counts": _counts(found),
        "rotation": found.rotation,
        "levels": list(bound_rows(found)),
        "metastable": list(quasi_rows(found)),
        "numerical_error_cm-1": {
            "levels": levels.numerical_error * HARTREE_CM1,
            "metastable": found.quasi.numerical_error * HARTREE_CM1,
        },
        "near_dissociation": _law(found),
        "scattering_length_bohr": _length(found, found.counts.scattering_length),
        "scattering_length_error_bohr": _length(found, found.counts.scattering_error),
        "isotope_counts": [
            {"alkali": c.alkali, "noble_gas": c.perturber, "reduced_mass_u": c.reduced_mass_u}
            | {"N0": c.N0, "total": c.total, "N_max": c.N_max}
            for c in found.isotope_counts
        ],
        "equilibrium": _equilibrium(found),
        "cell": _cell(found),
        "work": {"grid_points": levels.points, "levels": len(levels.v), "metastable": len(found.quasi.v)},
        "warnings": list(found.warnings),
        "version": found.version,
    }


def _length(found: Molecule, value: float) -> float | None:
    """Scattering lengths are those of the ground curve only; None without a well."""
    return value if found.state == "X" and math.isfinite(value) else None


def _counts(found: Molecule) -> dict[str, Any]:
    counts, levels = found.counts, found.levels
    used = [int(n) for n in levels.count_by_rotation]
    return {
        "N0": used[0] if used else 0,
        "total": len(levels.v),
        "N_max": len(used) - 1 if used else None,
        "total_with_rotational_weight": int(np.sum(2 * levels.N + 1)),
        "model_error": None
        if found.count_error is None
        else dict(zip(("N0", "total"), found.count_error, strict=True)),
        "by_N": used,
        "by_nodes": {"N0": int(counts.nodes[0]), "total": int(counts.nodes.sum())},
        "by_wkb": {"N0": int(counts.wkb[0]), "total": int(counts.wkb.sum())},
        "agree": counts.agree,
        "remarks": list(counts.remarks),
        "metastable": len(found.quasi.v),
    }


def _law(found: Molecule) -> dict[str, Any] | None:
    law = found.law
    if law is None:
        return None
    return {
        "v_limit": law.v_D,
        "levels_by_law": law.count,
        "slope_ratio_observed_to_law": [float(ratio) for ratio in law.ratios],
    }


def _equilibrium(found: Molecule) -> dict[str, Any]:
    balance = found.equilibrium
    names = ("bound", "metastable", "classical", "classical_metastable")
    return {
        "temperature_K": found.temperature_K,
        **{f"K_{name}_cm3": None if balance is None else getattr(balance, name) * BOHR3_CM3 for name in names},
        "K_total_cm3": None if balance is None else balance.total * BOHR3_CM3,
        "K_metastable_long_lived_cm3": None if balance is None else found.long_lived * BOHR3_CM3,
        "electronic_weight": None if balance is None else balance.weight,
        "numerical_error_relative": None if balance is None else balance.numerical_error,
        "model_error_relative": None if balance is None else balance.model_error,
        "reason": found.no_equilibrium or None,
    }


def _cell(found: Molecule) -> dict[str, Any]:
    balance, times, n = found.equilibrium, found.times, found.density_cm3
    formation = None if balance is None or times is None or not math.isfinite(times.formation) else times.formation
    return {
        "pressure_torr": found.pressure_torr,
        "fill_temperature_K": found.fill_temperature_K,
        "density_cm3": n,
        "bound_per_free_atom": None if balance is None else n * balance.bound * BOHR3_CM3,
        "metastable_per_free_atom": None if balance is None else n * balance.metastable * BOHR3_CM3,
        "bound_fraction": None if balance is None else found.fraction,
        "break_up_s_estimate": None if times is None else times.break_up * AU_TIME_S,
        "formation_s_estimate": None if formation is None else formation * AU_TIME_S,
        "estimate": "strong-collision assumption, good to about a factor two",
    }
