"""From the fields of one state in a curve file to its curve; one builder per form."""

from __future__ import annotations

import csv
import io
from collections.abc import Callable
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import numpy as np

from pertcalc import constants
from pertcalc.curves.base import Array, Curve
from pertcalc.curves.forms import LennardJones, MorseVanDerWaals, TangToennies, VanDerWaals
from pertcalc.curves.schema import ENERGY_UNITS, LENGTH_UNITS, Table, finite, shown
from pertcalc.curves.tabulated import MIN_POINTS, Tabulated, table_problems
from pertcalc.errors import InputError

MAX_BYTES = 2_000_000
MAX_POINTS = 20_000
# A van der Waals curve without R_core gets its core where the attraction reaches this depth [hartree] (2195 cm^-1).
DEFAULT_CORE_DEPTH = 0.01
# Redundant De and Re may differ this much from the well of the curve: rounding of printed parameters, not more.
WELL_TOLERANCE = 0.03
POSITION_TOLERANCE = 0.015
# A wall lower than this [hartree] (1000 cm^-1) does not keep thermal atoms apart.
MIN_WALL = 0.00456
# Depths and distances beyond these [hartree, bohr] are a wrong unit.
MAX_ENERGY, MAX_LENGTH = 1.0, 200.0


@dataclass(slots=True)
class StateFields:
    """What a builder sees: the fields of the state, the folder of the file, and what it learns on the way."""

    fields: Table
    folder: Path
    table_bytes: bytes = b""
    uncertainty: dict[str, float] = field(default_factory=dict)
    checks: dict[str, float] = field(default_factory=dict)

    def quantity(self, key: str, required: str = "", name: str = "") -> float | None:
        """A {value, sd, unit} field in atomic units; its sd becomes the uncertainty of De or Re."""
        units, high = (LENGTH_UNITS, MAX_LENGTH) if key.startswith("R") else (ENERGY_UNITS, MAX_ENERGY)
        found = self.fields.quantity(key, units, high, required)
        if found is None:
            return None
        if found[1] is not None and name:
            self.uncertainty[name] = found[1]
        return found[0]

    def well(self, required: str = "") -> tuple[float | None, float | None]:
        """De [hartree] and Re [bohr], remembered for the comparison with the finished curve."""
        De, Re = self.quantity("De", required, "De"), self.quantity("Re", required, "Re")
        for key, value in (("De", De), ("Re", Re)):
            if value is not None:
                self.checks[key] = value
        return De, Re

    def leading(self) -> float | None:
        """C6 [hartree bohr^6], required; the largest of any alkali with any atom are a few thousand."""
        step = "give the C6 of the pair in atomic units"
        return self.fields.number("C6_au", "hartree bohr^6", high=1e8, required=step)

    def dispersion(self) -> tuple[float, float, float] | None:
        """C6 (required, > 0), C8 and C10 (0 when absent), [hartree bohr^n]."""
        C6 = self.leading()
        rest = []
        for key, unit, high in (("C8_au", "hartree bohr^8", 1e12), ("C10_au", "hartree bohr^10", 1e15)):
            value = self.fields.number(key, unit, high=high, closed=True)
            rest.append(0.0 if key not in self.fields.data else value)
        if C6 is None or rest[0] is None or rest[1] is None:
            return None
        return C6, rest[0], rest[1]


def _tang_toennies(state: StateFields) -> Curve | None:
    table = state.fields
    A = table.number("A_hartree", "hartree", high=1e8)
    b = table.number("b_per_bohr", "1/bohr", high=50.0)
    De, Re = state.well()
    dispersion = state.dispersion()
    has = [key in table.data for key in ("A_hartree", "b_per_bohr", "De", "Re")]
    if has[0] != has[1]:
        missing = "b_per_bohr" if has[0] else "A_hartree"
        table.note(missing, "is missing; A_hartree and b_per_bohr go together")
        return None
    if not has[0] and not (has[2] and has[3]):
        table.problems.append(f"{table.name}: needs A_hartree and b_per_bohr, or both De and Re; add them")
        return None
    if dispersion is None:
        return None
    if has[0]:
        return None if A is None or b is None else TangToennies(A, b, *dispersion)
    return None if De is None or Re is None else TangToennies.from_well(De, Re, *dispersion)


def _one_of(state: StateFields, keys: tuple[str, str], name: str) -> float | None:
    """The value of exactly one of two synonymous fields."""
    given = [key for key in keys if key in state.fields.data]
    for key in keys:
        state.fields.take(key)
    if len(given) == 2:
        state.fields.note(keys[1], f"is a synonym of {keys[0]}; give only one of them")
        return None
    return state.quantity(given[0] if given else keys[0], f"give {keys[0]} or {keys[1]}", name)


def _lennard_jones(state: StateFields) -> Curve | None:
    De = _one_of(state, ("epsilon", "De"), "De")
    R_min = _one_of(state, ("R_min", "Re"), "Re")
    return None if De is None or R_min is None else LennardJones(De, R_min)


def _van_der_waals(state: StateFields) -> Curve | None:
    C6 = state.leading()
    core = state.quantity("R_core")
    if C6 is None or (core is None and "R_core" in state.fields.data):
        return None
    return VanDerWaals(C6, core if core is not None else (C6 / DEFAULT_CORE_DEPTH) ** (1 / 6))


def _morse_van_der_waals(state: StateFields) -> Curve | None:
    De, Re = state.well("a Morse well needs De and Re")
    a = state.fields.number("a_per_bohr", "1/bohr", high=50.0)
    join = state.quantity("R_join")
    dispersion = state.dispersion()
    if join is not None and "a_per_bohr" not in state.fields.data:
        state.fields.note("R_join", "needs a_per_bohr beside it; without a_per_bohr the join is computed")
        return None
    if De is None or Re is None or dispersion is None or (a is None and "a_per_bohr" in state.fields.data):
        return None
    return MorseVanDerWaals.from_well(De, Re, *dispersion, a=a, R_join=join)


def _table(state: StateFields) -> Curve | None:
    table = state.fields
    points, file = table.take("points"), table.text("file")
    state.well()
    dispersion = state.dispersion()
    if ("points" in table.data) == ("file" in table.data):
        found = "both" if points else "neither"
        table.problems.append(f"{table.name}: a table needs either points or file, not {found}")
        return None
    if "file" in table.data:
        rows, key = (None if file is None else _read_csv(state, file)), "file"
    else:
        rows, key = _checked_points(table, points), "points"
    if rows is None:
        return None
    R, V = rows[:, 0], rows[:, 1]
    problems = table_problems(R, V)
    for problem in problems:
        table.note(key, problem)
    if problems or dispersion is None:
        return None
    return Tabulated(R, V / constants.HARTREE_CM1, *dispersion)


def _checked_points(table: Table, points: Any) -> Array | None:
    if not isinstance(points, list):
        table.note("points", "must be a list of [R_bohr, V_cm-1] pairs; write points = [[5.0, 1200.0], ...]")
        return None
    if not MIN_POINTS <= len(points) <= MAX_POINTS:
        table.note("points", f"{len(points)} points; between {MIN_POINTS} and {MAX_POINTS} are allowed")
        return None
    rows = []
    for k, point in enumerate(points):
        values = [finite(x) for x in point] if isinstance(point, list) and len(point) == 2 else [None]
        if None in values:
            table.note("points", f"point {k + 1} is {shown(point)}; each must be [R_bohr, V_cm-1], two finite numbers")
            return None
        rows.append(values)
    return np.array(rows, dtype=np.float64)


def _read_csv(state: StateFields, name: str) -> Array | None:
    """Rows R_bohr, V_cm-1 of a file beside the curve file; '#' starts a comment, one header line is allowed."""
    table = state.fields
    if not name or name in (".", "..") or any(c in name for c in "/\\:") or "\x00" in name:
        table.note("file", "must be the plain name of a file in the same folder; move it there and drop the path")
        return None
    path = state.folder / name
    try:
        if path.resolve().parent != state.folder.resolve():
            table.note("file", "leads out of the folder of the curve file; copy the table there")
            return None
        data = read_limited(path)
        text = data.decode("utf-8")
    except UnicodeDecodeError:
        table.note("file", "is not UTF-8 text; save it as plain CSV")
        return None
    except (OSError, ValueError) as error:
        table.note("file", f"cannot be read ({reason(error)}); check that the file lies beside the curve file")
        return None
    state.table_bytes = data
    return _parse_csv(table, text)


def _parse_csv(table: Table, text: str) -> Array | None:
    rows: list[tuple[float, float]] = []
    lines = [(k, line) for k, line in enumerate(text.splitlines(), 1) if line.strip() and not line.startswith("#")]
    if len(lines) > MAX_POINTS + 1:
        table.note("file", f"has {len(lines)} rows; at most {MAX_POINTS} are allowed")
        return None
    for place, (number, line) in enumerate(lines):
        try:
            cells = next(csv.reader(io.StringIO(line)))
            R, V = (float(cell) for cell in cells)
        except (ValueError, csv.Error):
            if place == 0 and any(c.isalpha() for c in line):
                continue
            table.note("file", f"line {number} is {shown(line)}; each must be two numbers R_bohr,V_cm-1")
            return None
        rows.append((R, V))
    return np.array(rows, dtype=np.float64).reshape(-1, 2)


def read_limited(path: Path) -> bytes:
    """The bytes of an ordinary file of at most MAX_BYTES; ValueError says why not, OSError as usual."""
    if path.is_dir():
        raise ValueError("it is a folder")
    if not path.exists():
        raise ValueError("no such file")
    if not path.is_file():
        raise ValueError("it is not an ordinary file")
    with path.open("rb") as stream:
        data = stream.read(MAX_BYTES + 1)
    if len(data) > MAX_BYTES:
        raise ValueError(f"it is larger than {MAX_BYTES // 1_000_000} MB")
    return data


def reason(error: Exception) -> str:
    """The plain words of an OSError or ValueError."""
    return getattr(error, "strerror", None) or str(error)


BUILDERS: dict[str, Callable[[StateFields], Curve | None]] = {
    "tang-toennies": _tang_toennies,
    "lennard-jones": _lennard_jones,
    "van-der-waals": _van_der_waals,
    "morse-van-der-waals": _morse_van_der_waals,
    "table": _table,
}


def build(form: str, state: StateFields) -> Curve | None:
    """The curve of a state, None after problems were noted; unknown keys are for the caller's ``finish``."""
    try:
        with np.errstate(all="ignore"):
            curve = BUILDERS[form](state)
            if curve is not None:
                _examine(curve, state)
    except InputError as error:
        state.fields.problems.extend(f"{state.fields.name}: {problem}" for problem in error.problems)
        return None
    except (ArithmeticError, ValueError):
        state.fields.problems.append(f"{state.fields.name}: these numbers are too extreme for a curve; check the units")
        return None
    return curve


def _examine(curve: Curve, state: StateFields) -> None:
    """Note what is wrong with a finished curve: not finite, no wall, or a well other than the De and Re beside it."""
    name, problems = state.fields.name, state.fields.problems
    R = np.geomspace(0.1, 1000.0, 300)
    V, slope = curve.with_derivative(R)
    if not (np.all(np.isfinite(V)) and np.all(np.isfinite(slope))):
        problems.append(f"{name}: the curve is not finite between 0.1 and 1000 bohr; check the size of its parameters")
        return
    well = curve.well()
    top = float(V[R < (well.position if well else np.inf)].max(initial=-np.inf))
    if top < MIN_WALL:
        problems.append(
            f"{name}: the repulsive wall rises to {top * constants.HARTREE_CM1:.4g} cm^-1 only, at least "
            f"{MIN_WALL * constants.HARTREE_CM1:.0f} are needed; check A, b, C_n and their units"
        )
    if not state.checks or well is None:
        return
    De, Re = state.checks.get("De", well.depth), state.checks.get("Re", well.position)
    if abs(well.depth / De - 1) > WELL_TOLERANCE or abs(well.position / Re - 1) > POSITION_TOLERANCE:
        problems.append(
            f"{name}: De and Re say {De * constants.HARTREE_CM1:.5g} cm^-1 at "
            f"{Re * constants.BOHR_ANGSTROM:.4g} angstrom, but the curve has its well "
            f"{well.depth * constants.HARTREE_CM1:.5g} cm^-1 at {well.position * constants.BOHR_ANGSTROM:.4g} "
            "angstrom; correct one, or leave De and Re out"
        )
