"""What ``pertcalc curves ALKALI GAS --compute`` prints: the curve file, its summary, JSON and CSV."""

from __future__ import annotations

from pathlib import Path
from typing import Any

from pertcalc.constants import BOHR_ANGSTROM, HARTREE_CM1
from pertcalc.errors import InputError
from pertcalc.one_electron.curve_file import identity_of, to_toml, uncertainty
from pertcalc.one_electron.model_curves import STATES, ModelCurves
from pertcalc.report.as_json import dump
from pertcalc.report.rows import as_csv as csv_text
from pertcalc.report.tables import number, wrapped


def identity_for(output: str | None) -> str | None:
    """Name of the curve set in a file; InputError when the file is not called NAME.toml."""
    if output is None:
        return None
    if Path(output).suffix != ".toml":
        raise InputError(
            f"output file = {output!r}: a curve file ends in .toml; name it so, or add --json or --csv for the points."
        )
    return Path(output).stem


def rendered(model: ModelCurves, output: str | None, as_json: bool, as_csv: bool) -> str:
    """The curves as a curve file, or the points as JSON or CSV."""
    if as_json:
        return dump(_json(model))
    if as_csv:
        return csv_text(_rows(model))
    return to_toml(model, identity_for(output))


def summary(model: ModelCurves) -> str:
    """A few lines for the terminal: wells, errors, tails, warnings."""
    work = model.work
    lines = [
        f"{model.alkali}-{model.gas}: {work['distances']} distances from {model.R[0]:.3g} to {model.R[-1]:.3g} bohr, "
        f"electron-gas model {model.electron.model}, {work['sigma_functions']} Sigma and {work['pi_functions']} Pi "
        "functions; all COMPUTED"
    ]
    for state in STATES:
        well, errors = model.well(state), uncertainty(model, state)
        C6, own = model.dispersion[state][6], model.own[state][6]
        shown = "no well"
        if well is not None:
            De, Re = well.depth * HARTREE_CM1, well.position * BOHR_ANGSTROM
            shown = (
                f"De {number(De)} +- {number(De * errors['De'], 2)} cm^-1 at "
                f"{number(Re)} +- {number(Re * errors['Re'], 2)} angstrom"
            )
        lines.append(f"  {state}  {shown}; C6 {number(C6)} au (the model alone: {number(own)})")
    for warning in model.warnings:
        lines += wrapped(f"Note: {warning}.", "  ")
    return "\n".join(lines)


def _rows(model: ModelCurves) -> list[dict[str, float]]:
    return [
        {
            "R_bohr": float(R),
            **{f"{s}_cm1": float(model.V[s][k]) * HARTREE_CM1 for s in STATES},
            **{f"{s}_numerical_error_cm1": float(model.numerical_error(s)[k]) * HARTREE_CM1 for s in STATES},
            **{f"{s}_long_range_correction_cm1": float(model.correction[s][k]) * HARTREE_CM1 for s in STATES},
            "np_sigma_weight_of_B": float(model.character[k]),
        }
        for k, R in enumerate(model.R)
    ]


def _json(model: ModelCurves) -> dict[str, Any]:
    states = {}
    for state in STATES:
        well = model.well(state)
        states[state] = {
            "De_cm1": None if well is None else well.depth * HARTREE_CM1,
            "Re_angstrom": None if well is None else well.position * BOHR_ANGSTROM,
            "C_au": {f"C{n}": C for n, C in model.dispersion[state].items()},
            "C_of_the_model_alone_au": {f"C{n}": C for n, C in model.own[state].items()},
            "relative_error": uncertainty(model, state),
        }
    return {
        "schema": "pertcalc.model-curves/1",
        "id": identity_of(model),
        "alkali": model.alkali,
        "noble_gas": model.gas,
        "mark": "COMPUTED",
        "electron_gas_model": model.electron.model,
        "states": states,
        "points": _rows(model),
        "warnings": list(model.warnings),
        "work": model.work,
        "version": model.version,
    }
