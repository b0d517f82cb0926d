"""A curve file and a curve set from model curves: the fixed format of notes/curve-files.md with full provenance."""

from __future__ import annotations

import numpy as np

from pertcalc.constants import BOHR_ANGSTROM, HARTREE_CM1
from pertcalc.curves.base import Well
from pertcalc.curves.curveset import CurveSet, Source, StateCurve
from pertcalc.errors import InputError
from pertcalc.one_electron.gas_electron import DEFAULT_MODEL
from pertcalc.one_electron.long_range import ORDERS
from pertcalc.one_electron.model_curves import RELATIVE_ERROR, STATES, ModelCurves
from pertcalc.species import alkali, noble_gas

# Relative errors of De and Re: how far the default electron-gas model is from the wells of other authors, rounded up
# (notes/model-curves.md, deviations), and what the sets with given ranges, or parameters of a user, deserve.
WELL_ERROR = {"X": (0.15, 0.02), "A": (0.25, 0.04), "B": (0.30, 0.04)}
WELL_ERROR_OTHER = {"X": (1.00, 0.20), "A": (0.35, 0.04), "B": (1.00, 0.10)}
WHERE = "notes/model-curves.md"


def identity_of(model: ModelCurves) -> str:
    """Name of the set: "rb-ar_model"."""
    return f"{model.alkali}-{model.gas}_model".lower()


def source(model: ModelCurves, state: str) -> Source:
    """Where the curve of a state comes from, in words."""
    own, tail = model.own[state], model.dispersion[state]
    error = model.numerical_error(state) * HARTREE_CM1
    R, V = model.R, model.V[state]
    thermal = V < 0.0456
    note = (
        f"Electron-gas model {model.electron.model!r} ({model.electron.mark}: {model.electron.source}). "
        f"Core and gas: {model.core.provenance}. Alkali core: {model.atom.core.mark}, {model.atom.core.source}. "
        f"Numerical error at most {float(error[thermal].max()):.2g} cm^-1 below 10,000 cm^-1 "
        f"({model.work['sigma_functions']} Sigma and {model.work['pi_functions']} Pi functions). "
        "C6, C8, C10: COMPUTED, second-order sum over states of the same atom; the model alone has "
        + ", ".join(f"{own[n] / tail[n]:.2f} C{n}" for n in ORDERS)
        + ", the difference is added with damping. "
        f"Points from {R[0]:.4g} to {R[-1]:.4g} bohr; an exponential continues the wall."
    )
    cite = f"one-electron pseudopotential calculation of pertcalc {model.version}, not published"
    return Source(cite, "model", WHERE, note)


def uncertainty(model: ModelCurves, state: str) -> dict[str, float]:
    """Judged relative errors of a state: De and Re (where there is a well), C6, C8, C10."""
    judged = WELL_ERROR if model.electron.model == DEFAULT_MODEL else WELL_ERROR_OTHER
    well = {} if model.well(state) is None else dict(zip(("De", "Re"), judged[state], strict=True))
    return {**well, **{f"C{n}": e for n, e in zip(ORDERS, RELATIVE_ERROR[state], strict=True)}}


def curve_set(model: ModelCurves, identity: str | None = None) -> CurveSet:
    """The curves as a set that everything else takes, as if read from the file.

    InputError when the points of a state make no curve.
    """
    states = {
        state: StateCurve(model.curve(state), source(model, state), uncertainty(model, state), "table")
        for state in STATES
    }
    return CurveSet(identity or identity_of(model), model.alkali, model.gas, what(model), states)


def what(model: ModelCurves) -> str:
    """One line about the set."""
    names = f"{alkali(model.alkali).name} with {noble_gas(model.gas).name}"
    return f"one-electron model curves of {names}, electron-gas model {model.electron.model}"


def to_toml(model: ModelCurves, identity: str | None = None) -> str:
    """The curve file.

    Parameters
    ----------
    model : ModelCurves
        The curves [atomic units].
    identity : str, optional
        Name of the file without .toml; None: "rb-ar_model" for rubidium with argon.

    Returns
    -------
    str
        TOML text.

    Raises
    ------
    InputError
        The points of a state make no curve.
    """
    problems = []
    lines = [
        f"# Made by pertcalc {model.version}: pertcalc curves {model.alkali} {model.gas} --compute",
        f"id = {_text(identity or identity_of(model))}",
        f'alkali = "{model.alkali}"',
        f'noble_gas = "{model.gas}"',
        f"what = {_text(what(model))}",
    ]
    for state in STATES:
        try:
            lines += _state(model, state)
        except InputError as error:
            problems += [f"{state}: {problem}" for problem in error.problems]
    if problems:
        raise InputError(problems)
    return "\n".join(lines) + "\n"


def _state(model: ModelCurves, state: str) -> list[str]:
    R, V = model.table(state)
    well, errors, origin = model.well(state), uncertainty(model, state), source(model, state)
    lines = ["", f"[states.{state}]", 'form = "table"', *_well_lines(well, errors)]
    lines += [f"C{n}_au = {_digits(model.dispersion[state][n])}" for n in ORDERS]
    lines += ["# R [bohr], V [cm^-1]", "points = ["]
    lines += [f"  [{r:.3f}, {v:.4f}]," for r, v in zip(R, V * HARTREE_CM1, strict=True)]
    lines += ["]", "", f"[states.{state}.source]"]
    fields = {"cite": origin.cite, "status": origin.status, "where": origin.where, "note": origin.note}
    lines += [f"{key} = {_text(value)}" for key, value in fields.items()]
    lines += ["", f"[states.{state}.uncertainty]  # relative, judged"]
    return lines + [f"{key} = {value:g}" for key, value in errors.items()]


def _well_lines(well: Well | None, errors: dict[str, float]) -> list[str]:
    if well is None:
        return []
    De, Re = well.depth * HARTREE_CM1, well.position * BOHR_ANGSTROM
    return [
        f'De = {{ value = {De:.4g}, sd = {errors["De"] * De:.2g}, unit = "cm^-1" }}',
        f'Re = {{ value = {Re:.4g}, sd = {errors["Re"] * Re:.2g}, unit = "angstrom" }}',
    ]


def _digits(value: float) -> str:
    """Five digits, the form TOML takes as a float."""
    return repr(float(np.format_float_positional(value, precision=5, fractional=False)))


def _text(value: str) -> str:
    """A TOML basic string."""
    return '"' + value.replace("\\", "\\\\").replace('"', '\\"') + '"'
