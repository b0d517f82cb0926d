"""Curve files (TOML): strict reading, the default sets, and the check of a user's own file.

The format is described in notes/curve-files.md. Every bad field of a file is reported in one DataFileError.
"""

from __future__ import annotations

import hashlib
import re
import tomllib
from dataclasses import replace
from functools import cache
from importlib.resources import files as package_files
from os import PathLike
from pathlib import Path
from typing import Any

from pertcalc.curves.build import BUILDERS, StateFields, build, read_limited, reason
from pertcalc.curves.correlation import read_correlation
from pertcalc.curves.curveset import STATES, STATUS_MARKS, CurveSet, Source, StateCurve
from pertcalc.curves.schema import Table
from pertcalc.errors import DataFileError, InputError
from pertcalc.species import ALKALIS, SPECIES_GASES, alkali, noble_gas

# Dotted keys of more parts than this are refused before parsing: the standard parser spends time and memory with their
# square. The pattern itself is linear: it starts at word beginnings only and never gives a character back.
_LONG_KEY = re.compile(r"""(?<![\w-])(?:(?:[\w-]++|"(?:[^"\\\n]|\\.)*+"|'[^'\n]*+')[ \t]*+\.[ \t]*+){17}""")
UNCERTAINTY_KEYS = ("De", "Re", "C6", "C8", "C10", "wall")


def load(path: str | PathLike[str]) -> CurveSet:
    """Read one curve file.

    Parameters
    ----------
    path : str or path
        A ``.toml`` file of at most 2 MB.

    Returns
    -------
    CurveSet
        Curves in atomic units; ``sha256`` covers the file and the tables it names.

    Raises
    ------
    DataFileError
        Lists every bad field: its name, value, rule and next step.
    """
    place = Path(path)
    data, raw = _parse(place)
    problems: list[str] = []
    curves, tables = _read(Table(data, "", problems), place)
    if problems or curves is None:
        raise DataFileError(place, problems)
    digest = hashlib.sha256(raw)
    for extra in tables:
        digest.update(extra)
    return replace(curves, sha256=digest.hexdigest(), path=place)


def check(path: str | PathLike[str]) -> list[str]:
    """The problems of a curve file, one string each; an empty list for a good file."""
    try:
        load(path)
    except DataFileError as error:
        return list(error.problems)
    return []


def default_folder() -> Path:
    """Folder of the default curve sets: inside the installed package, else beside the package in a checkout.

    Raises
    ------
    DataFileError
        Neither exists: the installation is incomplete.
    """
    inside = Path(str(package_files("pertcalc") / "potentials"))
    beside = Path(__file__).resolve().parents[2] / "potentials"
    for folder in (inside, beside):
        if folder.is_dir():
            return folder
    raise DataFileError(inside, "the default curve sets are missing; install pertcalc again")


def default_ids() -> list[str]:
    """Names of the default sets, ``rb-ar_default`` and so on, in the order of the species tables."""
    names = [_default_id(a, g) for a in ALKALIS for g in SPECIES_GASES if g != "3He"]
    folder = default_folder()
    return [name for name in names if (folder / f"{name}.toml").is_file()]


def load_default(alkali_symbol: str, gas_symbol: str) -> CurveSet:
    """The default curve set of a pair; read once, then kept.

    Helium-3 has the curves of helium (they do not depend on the nuclear mass) and its own mass.

    Parameters
    ----------
    alkali_symbol, gas_symbol : str
        Names that species.alkali and species.noble_gas know.

    Returns
    -------
    CurveSet

    Raises
    ------
    UnknownNameError
        For another name, with the nearest ones.
    DataFileError
        The file is missing or damaged.
    """
    gas = noble_gas(gas_symbol)
    curves = _load_default(alkali(alkali_symbol).symbol, "He" if gas.symbol == "3He" else gas.symbol)
    return for_pair(curves, alkali_symbol, gas.symbol)


def _default_id(alkali_symbol: str, gas_symbol: str) -> str:
    return f"{alkali_symbol}-{gas_symbol}_default".lower()


@cache
def _load_default(alkali_symbol: str, gas_symbol: str) -> CurveSet:
    return load(default_folder() / f"{_default_id(alkali_symbol, gas_symbol)}.toml")


def _parse(path: Path) -> tuple[dict[str, Any], bytes]:
    """The TOML document and its bytes, or one DataFileError about the file as a whole."""
    try:
        raw = read_limited(path)
    except (OSError, ValueError) as error:
        raise DataFileError(path, f"cannot be read: {reason(error)}; name a curve file (.toml)") from None
    try:
        text = raw.decode("utf-8")
        if _LONG_KEY.search(text):
            raise RecursionError
        return tomllib.loads(text), raw
    except UnicodeDecodeError:
        raise DataFileError(path, "is not UTF-8 text; save it as plain text") from None
    except RecursionError:
        raise DataFileError(path, "is nested too deeply; a curve file has two levels of tables") from None
    except ValueError as error:
        raise DataFileError(path, f"is not valid TOML: {error}; correct that place") from None


def _read(top: Table, path: Path) -> tuple[CurveSet | None, list[bytes]]:
    """Examine every field; the set is None when a problem was noted."""
    identity = top.text("id", f"write id = {path.stem!r}")
    if identity is not None and (identity != path.stem or path.suffix != ".toml"):
        top.note("id", f"must be the file name without .toml; the file is called {path.name!r}, rename one of them")
    alkali_symbol = top.text("alkali", "name one of the alkalis", ALKALIS)
    gas = top.text("noble_gas", "name the perturber")
    what = top.text("what", "say in a few words what the curves are")
    masses = _masses(top, gas)
    splitting = None
    fine = top.table("fine_structure")
    if fine is not None:
        splitting = fine.number("splitting", "cm^-1", high=1e5, closed=True, required="or drop the section")
        fine.finish()
    states, tables = _states(top, path.parent)
    top.finish()
    if top.problems or identity is None or alkali_symbol is None or gas is None or what is None:
        return None, tables
    return CurveSet(identity, alkali_symbol, gas, what, states, masses[0], masses[1], splitting), tables


def _masses(top: Table, gas: str | None) -> tuple[float | None, float | None]:
    """Overrides of the masses [u]; the perturber's is required when the species table has none."""
    section = top.table("masses_u")
    values: list[float | None] = [None, None]
    if section is not None:
        values = [section.number(key, "u", low=0.0005, high=10000.0) for key in ("alkali", "perturber")]
        section.finish()
    given = section is not None and "perturber" in section.data
    if gas is not None and gas not in SPECIES_GASES and not given and not ("masses_u" in top.data and section is None):
        top.problems.append(
            f"masses_u.perturber: is missing; {gas!r} is none of {', '.join(SPECIES_GASES)}: give its mass [u]"
        )
    return values[0], values[1]


def _states(top: Table, folder: Path) -> tuple[dict[str, StateCurve], list[bytes]]:
    states: dict[str, StateCurve] = {}
    tables: list[bytes] = []
    section = top.table("states", "give [states.X], [states.A] and [states.B]")
    if section is None:
        return states, tables
    for name in STATES:
        fields = section.table(name, f"add a section [states.{name}]; X, A and B are all needed")
        if fields is not None:
            state, extra = _state(fields, folder)
            tables.append(extra)
            if state is not None:
                states[name] = state
    section.finish()
    return states, tables


def _state(fields: Table, folder: Path) -> tuple[StateCurve | None, bytes]:
    form = fields.text("form", f"name one of {', '.join(BUILDERS)}", tuple(BUILDERS))
    source = _source(fields)
    stated, together = _uncertainty(fields)
    if form is None:
        # Without a form nobody can say which other keys belong here.
        return None, b""
    state = StateFields(fields, folder)
    curve = build(form, state)
    fields.finish()
    if curve is None or source is None:
        return None, state.table_bytes
    uncertainty = {**state.uncertainty, **stated}
    correlation = {} if together is None else read_correlation(together, uncertainty)
    return StateCurve(curve, source, uncertainty, form, correlation), state.table_bytes


def _source(fields: Table) -> Source | None:
    section = fields.table("source", f"add a section [{fields.path('source')}] with cite, status and where")
    if section is None:
        return None
    cite = section.text("cite", "cite the publication or say how the curve was made")
    status = section.text("status", f"name one of {', '.join(STATUS_MARKS)}", tuple(STATUS_MARKS))
    where, note = section.text("where"), section.text("note")
    section.finish()
    return None if cite is None or status is None else Source(cite, status, where or "", note or "")


def _uncertainty(fields: Table) -> tuple[dict[str, float], Table | None]:
    """Stated relative errors, and the table of their correlations, to be read once all of them are known."""
    section = fields.table("uncertainty")
    if section is None:
        return {}, None
    found = {key: section.number(key, "relative, 0.1 = 10 %", high=100.0, closed=True) for key in UNCERTAINTY_KEYS}
    together = section.table("correlation")
    section.finish()
    return {key: value for key, value in found.items() if value is not None}, together


def for_pair(curves: CurveSet, alkali_symbol: str, gas_symbol: str) -> CurveSet:
    """A set for the pair asked for: itself, or with helium-3's mass where helium's curves serve helium-3.

    Parameters
    ----------
    curves : CurveSet
    alkali_symbol, gas_symbol : str
        A known alkali; a known gas or the set's own label of its perturber.

    Returns
    -------
    CurveSet

    Raises
    ------
    InputError
        The set belongs to another pair.
    UnknownNameError
        Neither the species table nor the set knows the gas.
    """
    own = gas_symbol.strip().lower() == curves.noble_gas.lower()
    wanted = (alkali(alkali_symbol).symbol, curves.noble_gas if own else noble_gas(gas_symbol).symbol)
    if wanted == (curves.alkali, "3He") and curves.noble_gas == "He":
        return replace(curves, noble_gas="3He", mass_perturber_u=noble_gas("3He").mass_u.value)
    if (curves.alkali, curves.noble_gas) != wanted:
        raise InputError(
            f"curves {curves.id!r} are for {curves.alkali}-{curves.noble_gas}, not {wanted[0]}-{wanted[1]}; "
            "name that pair or another file"
        )
    return curves
