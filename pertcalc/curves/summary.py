"""What the curve sets hold, as rows and as plain text for the command line."""

from __future__ import annotations

import textwrap
from collections.abc import Callable
from dataclasses import dataclass, fields
from typing import Any

import numpy as np
from scipy.optimize import minimize_scalar

from pertcalc.constants import BOHR_ANGSTROM, HARTREE_CM1
from pertcalc.curves import fine_structure
from pertcalc.curves.curveset import STATE_NAMES, CurveSet
from pertcalc.curves.files import default_folder, default_ids, load


@dataclass(frozen=True, slots=True)
class CurveSummary:
    """One state of one pair. Errors are one standard deviation, None where the file states none.

    ``De_cm1`` well depth [cm^-1], ``Re_angstrom`` its position [angstrom] (None: no well), ``C6_au`` [hartree bohr^6],
    ``wall_top_cm1`` energy up to which the wall is supported [cm^-1], ``mark`` READ | FROM MEMORY | COMPUTED.
    """

    pair: str
    state: str
    form: str
    De_cm1: float | None
    De_error_cm1: float | None
    Re_angstrom: float | None
    Re_error_angstrom: float | None
    C6_au: float
    C6_error_au: float | None
    wall_top_cm1: float
    status: str
    mark: str
    source: str
    where: str
    note: str


COLUMNS = tuple(field.name for field in fields(CurveSummary))


def summarise(curves: CurveSet) -> list[CurveSummary]:
    """One row per state, in the order X, A, B."""
    rows = []
    for name, state in curves.states.items():
        curve, error = state.curve, state.uncertainty
        well = curve.well()
        De = None if well is None else well.depth * HARTREE_CM1
        Re = None if well is None else well.position * BOHR_ANGSTROM
        rows.append(
            CurveSummary(
                pair=f"{curves.alkali}-{curves.noble_gas}",
                state=name,
                form=state.form,
                De_cm1=De,
                De_error_cm1=_scaled(De, error.get("De")),
                Re_angstrom=Re,
                Re_error_angstrom=_scaled(Re, error.get("Re")),
                C6_au=curve.C6,
                C6_error_au=_scaled(curve.C6, error.get("C6")),
                wall_top_cm1=curve.wall_top * HARTREE_CM1,
                status=state.source.status,
                mark=state.mark,
                source=state.source.cite,
                where=state.source.where,
                note=state.source.note,
            )
        )
    return rows


def list_summaries() -> list[CurveSummary]:
    """Rows of all default sets: 25 pairs x X, A, B.

    Raises
    ------
    DataFileError
        A default file is missing or damaged.
    """
    folder = default_folder()
    return [row for name in default_ids() for row in summarise(load(folder / f"{name}.toml"))]


def _scaled(value: float | None, relative: float | None) -> float | None:
    return None if value is None or relative is None else value * relative


def adiabatic_wells(curves: CurveSet) -> dict[str, tuple[float, float] | None]:
    """Depth [cm^-1] and position [angstrom] of the deepest minimum of the curves with fine structure.

    Keys "A1/2" (tends to P1/2), "A3/2" and "B1/2" (tend to P3/2); each depth counts from its own limit; None for a
    curve without a minimum between 2 and 40 bohr.
    """
    s = fine_structure.splitting_of(curves)
    a = fine_structure.coupling(s)
    functions: dict[str, Callable[[Any], Any]] = {
        "A1/2": lambda R: fine_structure.lower(curves.B(R), curves.A(R), s) + a,
        "A3/2": lambda R: curves.A(R),
        "B1/2": lambda R: fine_structure.upper(curves.B(R), curves.A(R), s) - a / 2,
    }
    R = np.geomspace(2.0, 40.0, 2000)
    wells: dict[str, tuple[float, float] | None] = {}
    for name, function in functions.items():
        V = function(R)
        k = int(np.argmin(V))
        if not (V[k] < 0 and 0 < k < len(R) - 1):
            wells[name] = None
            continue
        found = minimize_scalar(function, bounds=(R[k - 1], R[k + 1]), method="bounded", options={"xatol": 1e-8})
        wells[name] = (-float(found.fun) * HARTREE_CM1, float(found.x) * BOHR_ANGSTROM)
    return wells


def _number(value: float | None, error: float | None, unit: str, digits: str = ".4g") -> str:
    if value is None:
        return "none"
    plus_minus = "" if error is None else f" +- {error:.2g}"
    return f"{value:{digits}}{plus_minus} {unit}"


def describe(curves: CurveSet) -> str:
    """Plain text about one curve set: identity, each state with well, tail, wall, errors, mark and source."""
    lines = [
        f"{curves.id}: {curves.alkali}-{curves.noble_gas}",
        f"  {curves.what}",
        f"  sha256 {curves.sha256}",
    ]
    overrides = {
        "alkali mass [u]": curves.mass_alkali_u,
        "perturber mass [u]": curves.mass_perturber_u,
        "fine-structure splitting [cm^-1]": curves.splitting_cm1,
    }
    lines += [f"  {name} set here: {value:.9g}" for name, value in overrides.items() if value is not None]
    for row in summarise(curves):
        lines += [
            "",
            f"{row.state}  {STATE_NAMES[row.state]}, {row.form}, {row.mark} ({row.status})",
            f"  De    {_number(row.De_cm1, row.De_error_cm1, 'cm^-1')}",
            f"  Re    {_number(row.Re_angstrom, row.Re_error_angstrom, 'angstrom')}",
            f"  C6    {_number(row.C6_au, row.C6_error_au, 'hartree bohr^6')}",
            f"  wall  supported up to {row.wall_top_cm1:.4g} cm^-1",
            *_wrapped("source", row.source),
            *_wrapped("where", row.where),
            *_wrapped("note", row.note),
        ]
    lines += ["", "With fine structure, each well from its own limit (COMPUTED from the curves above):"]
    for name, well in adiabatic_wells(curves).items():
        shown = "no well" if well is None else f"De {well[0]:.4g} cm^-1 at {well[1]:.4g} angstrom"
        lines.append(f"  {name}  {shown}")
    return "\n".join(lines)


def _wrapped(label: str, value: str) -> list[str]:
    if not value:
        return []
    return textwrap.wrap(value, 100, initial_indent=f"  {label + ':':8}", subsequent_indent=" " * 10)
