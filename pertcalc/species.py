"""The five alkalis and the noble gases: masses, levels, lifetimes, hyperfine constants, polarisabilities.

Records are read on first use from ``pertcalc/data/species/*.toml``; every number in them is a :class:`Sourced` that
carries unit, source and mark. Two kinds of value are computed here from the others and marked COMPUTED: the natural
mean mass and the oscillator strengths. notes/species.md says where the data comes from and what is doubtful in it.
"""

from __future__ import annotations

import math
import tomllib
from dataclasses import dataclass
from functools import cache
from importlib.resources import files
from typing import Any

from pertcalc.errors import DataFileError, InputError, UnknownNameError

ALKALIS = ("Li", "Na", "K", "Rb", "Cs")
GASES = ("He", "Ne", "Ar", "Kr", "Xe")
SPECIES_GASES = ("He", "3He", "Ne", "Ar", "Kr", "Xe")
LEVELS = ("S1/2", "P1/2", "P3/2")
UPPER_LEVEL = {"D1": "P1/2", "D2": "P3/2"}
READ, FROM_MEMORY, COMPUTED = "READ", "FROM MEMORY", "COMPUTED"
MARKS = (READ, FROM_MEMORY, COMPUTED)

_ISOTOPES = {
    "6Li": "Li", "7Li": "Li", "23Na": "Na", "39K": "K", "40K": "K", "41K": "K", "85Rb": "Rb", "87Rb": "Rb",
    "133Cs": "Cs",
}  # fmt: skip
ISOTOPES = tuple(_ISOTOPES)


@dataclass(frozen=True, slots=True)
class Sourced:
    """One number with its birth certificate.

    ``value`` [``unit``; "1" for a pure number], ``source`` (publication, and the address when it was read there),
    ``mark`` "READ" | "FROM MEMORY" | "COMPUTED", ``error`` [same unit] as the source states it, None when it does not.
    """

    value: float
    unit: str
    source: str
    mark: str
    error: float | None = None

    def __float__(self) -> float:
        return float(self.value)


@dataclass(frozen=True, slots=True)
class Isotope:
    """A natural isotope of an alkali.

    ``label`` "87Rb", ``symbol`` "Rb", ``mass_u`` [u], ``abundance`` [natural fraction], ``spin`` I [units of hbar],
    ``hyperfine`` level -> {"A", "B"} [MHz]; B is zero where J < 1.
    """

    label: str
    symbol: str
    mass_u: Sourced
    abundance: Sourced
    spin: Sourced
    hyperfine: dict[str, dict[str, Sourced]]

    @property
    def nuclear_spin(self) -> float:
        """Nuclear spin I [units of hbar], a whole or half number."""
        return self.spin.value


@dataclass(frozen=True, slots=True)
class Level:
    """A fine-structure level: "S1/2", "P1/2" or "P3/2" of the valence shell.

    ``term`` "5P1/2"; ``term_cm1`` energy above the ground level [cm^-1]; ``lifetime_ns`` radiative lifetime [ns] and
    ``linewidth_MHz`` natural full width 1/(2 pi lifetime) [MHz], None for the ground level; ``gJ`` electronic g factor
    [1]; ``polarizability_au`` scalar and ``tensor_polarizability_au`` tensor dipole polarisability [au], the latter
    None where J < 1.
    """

    name: str
    term: str
    term_cm1: Sourced
    lifetime_ns: Sourced | None
    linewidth_MHz: Sourced | None
    gJ: Sourced
    polarizability_au: Sourced
    tensor_polarizability_au: Sourced | None

    @property
    def J(self) -> float:
        """Electronic angular momentum J [units of hbar], from the level's name."""
        return float(int(self.name[1]) / 2)


@dataclass(frozen=True, slots=True)
class Alkali:
    """An alkali of natural composition.

    ``mass_u`` natural mean [u]; ``fine_structure_cm1`` P3/2 - P1/2 [cm^-1]; ``ionisation_cm1`` [cm^-1];
    ``core_polarizability_au`` dipole polarisability of the ion [au]; ``oscillator_strength`` {"D1", "D2"} absorption f
    [1]; ``one_electron_model`` moments and polarisabilities of the ns and np valence states [au] from the model
    potential behind the tabulated curves (keys alpha_d_s, alpha_d_p, alpha_d_p_tensor, alpha_q_s, alpha_o_s, r2_s,
    r2_p, r4_p).
    """

    symbol: str
    name: str
    isotopes: tuple[Isotope, ...]
    levels: dict[str, Level]
    oscillator_strength: dict[str, Sourced]
    mass_u: Sourced
    fine_structure_cm1: Sourced
    ionisation_cm1: Sourced
    core_polarizability_au: Sourced
    one_electron_model: dict[str, Sourced]

    @property
    def polarizability_au(self) -> Sourced:
        """Static dipole polarisability of the ground level [au]."""
        return self.levels["S1/2"].polarizability_au

    def line_wavelength_nm(self, line: str) -> float:
        """Vacuum wavelength of "D1" or "D2" [nm], 1e7 / term energy; UnknownNameError for another line."""
        return 1e7 / self.levels[_upper_level(line)].term_cm1.value

    def decay_rate(self, level: str) -> float:
        """Radiative decay rate of a level [s^-1], 1 / lifetime; 0 for the ground level; UnknownNameError otherwise."""
        if level not in self.levels:
            raise UnknownNameError("level", str(level), LEVELS)
        lifetime = self.levels[level].lifetime_ns
        return 0.0 if lifetime is None else 1e9 / lifetime.value


@dataclass(frozen=True, slots=True)
class NobleGas:
    """A noble gas of natural composition, or helium-3.

    ``mass_u`` [u]; ``ionisation_eV`` [eV]; dipole, quadrupole and octupole polarisabilities [au]; C6 and C8 of the
    like-atom pair [au]; ``electron_scattering_length_bohr`` of slow electrons [bohr].
    """

    symbol: str
    name: str
    atomic_number: Sourced
    mass_u: Sourced
    ionisation_eV: Sourced
    polarizability_au: Sourced
    quadrupole_polarizability_au: Sourced
    octupole_polarizability_au: Sourced
    C6_homonuclear_au: Sourced
    C8_homonuclear_au: Sourced
    electron_scattering_length_bohr: Sourced

    @property
    def Z(self) -> int:
        """Nuclear charge [units of e]."""
        return int(self.atomic_number.value)


def alkali_symbol(name: str) -> str:
    """Return the standard spelling of an alkali's symbol; errors as :func:`alkali`."""
    return _symbol("alkali", name, ALKALIS)


def noble_gas_symbol(name: str) -> str:
    """Return the standard spelling of a gas's symbol; errors as :func:`noble_gas`."""
    return _symbol("noble gas", name, SPECIES_GASES)


def alkali(name: str) -> Alkali:
    """Return the record of an alkali by its symbol ("Li", "Na", "K", "Rb", "Cs"; any case).

    Raises UnknownNameError with the nearest symbols, InputError when ``name`` is not text.
    """
    return _load_alkali(alkali_symbol(name))


def noble_gas(name: str) -> NobleGas:
    """Return the record of a gas by its symbol ("He", "3He", "Ne", "Ar", "Kr", "Xe"; any case).

    Raises UnknownNameError with the nearest symbols, InputError when ``name`` is not text.
    """
    return _load_gas(noble_gas_symbol(name))


def isotope(name: str) -> Isotope:
    """Return the record of a natural alkali isotope by its label ("87Rb"; any case).

    Raises UnknownNameError with the nearest labels, InputError when ``name`` is not text.
    """
    label = _symbol("isotope", name, ISOTOPES)
    return next(found for found in alkali(_ISOTOPES[label]).isotopes if found.label == label)


def oscillator_strength(decay_rate: float, wavelength_nm: float, j_lower: float, j_upper: float) -> float:
    """Absorption oscillator strength of a line whose upper level decays in this line only.

    ``f = (g_u/g_l) A eps0 m_e c lambda^2 / (2 pi e^2)``, g = 2J + 1.

    Parameters: ``decay_rate`` A [s^-1], vacuum ``wavelength_nm`` [nm], ``j_lower``, ``j_upper`` [units of hbar].
    Returns f [1]. Source: any text on atomic spectra; CODATA constants of scipy.
    """
    from scipy.constants import c, e, epsilon_0, m_e

    weights = (2 * j_upper + 1) / (2 * j_lower + 1)
    return weights * decay_rate * epsilon_0 * m_e * c * (wavelength_nm * 1e-9) ** 2 / (2 * math.pi * e**2)


def _symbol(kind: str, name: object, known: tuple[str, ...]) -> str:
    """Return the spelling of ``known`` that equals ``name`` apart from case and outer blanks."""
    if not isinstance(name, str):
        raise InputError(f"{kind} = {name!r} must be text. Give one of {', '.join(known)}.")
    wanted = name.strip().lower()
    for symbol in known:
        if symbol.lower() == wanted:
            return symbol
    raise UnknownNameError(kind, name.strip(), known)


def _upper_level(line: str) -> str:
    if line not in UPPER_LEVEL:
        raise UnknownNameError("line", str(line), tuple(UPPER_LEVEL))
    return UPPER_LEVEL[line]


def _read(symbol: str) -> dict[str, Any]:
    """Return the parsed data file of one species, its inline tables turned into Sourced."""
    path = files("pertcalc") / "data" / "species" / f"{symbol.lower()}.toml"
    try:
        raw = tomllib.loads(path.read_text(encoding="utf-8"))
    except (OSError, ValueError) as problem:
        raise DataFileError(path, f"{problem}; reinstall pertcalc") from problem
    return {key: _sourced(value, f"{symbol}: {key}", path) for key, value in raw.items()}


def _sourced(node: Any, where: str, path: object) -> Any:
    """Turn every table that has a value into a Sourced; walk into the others."""
    if not isinstance(node, dict):
        return node
    if "value" not in node:
        return {key: _sourced(child, f"{where}.{key}", path) for key, child in node.items()}
    try:
        made = Sourced(**node)
    except TypeError as problem:
        raise DataFileError(path, f"{where}: {problem}; reinstall pertcalc") from problem
    if made.mark not in MARKS or not made.source or not made.unit or not math.isfinite(made.value):
        raise DataFileError(path, f"{where} = {node}: needs value, unit, source and a mark of {', '.join(MARKS)}")
    return made


@cache
def _load_alkali(symbol: str) -> Alkali:
    raw = _read(symbol)
    optional = {"lifetime_ns": None, "linewidth_MHz": None, "tensor_polarizability_au": None}
    levels = {name: Level(name=name, **(optional | fields)) for name, fields in raw.pop("levels").items()}
    isotopes = tuple(Isotope(label=label, symbol=symbol, **fields) for label, fields in raw.pop("isotopes").items())
    strengths = {line: _line_strength(line, levels) for line in UPPER_LEVEL}
    return Alkali(isotopes=isotopes, levels=levels, oscillator_strength=strengths, mass_u=_mean_mass(isotopes), **raw)


@cache
def _load_gas(symbol: str) -> NobleGas:
    return NobleGas(**_read(symbol))


def _mean_mass(isotopes: tuple[Isotope, ...]) -> Sourced:
    """Mean of the isotope masses weighted by abundance (the abundances' rounding error is divided out)."""
    total = sum(one.abundance.value for one in isotopes)
    mean = sum(one.abundance.value * one.mass_u.value for one in isotopes) / total
    marks = ", ".join(sorted({mark for one in isotopes for mark in (one.mass_u.mark, one.abundance.mark)}))
    return Sourced(mean, "u", f"isotope masses weighted by natural abundances (inputs: {marks})", COMPUTED)


def _line_strength(line: str, levels: dict[str, Level]) -> Sourced:
    """Oscillator strength of a line from the lifetime and term energy of its upper level."""
    lower, upper = levels["S1/2"], levels[UPPER_LEVEL[line]]
    assert upper.lifetime_ns is not None  # only the ground level has none
    f = oscillator_strength(1e9 / upper.lifetime_ns.value, 1e7 / upper.term_cm1.value, lower.J, upper.J)
    source = f"from lifetime and term energy of {upper.term} (inputs: {upper.lifetime_ns.mark})"
    return Sourced(f, "1", source, COMPUTED)
