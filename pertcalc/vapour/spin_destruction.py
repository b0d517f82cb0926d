"""Published spin destruction and spin exchange of ground-level alkalis, and which number is taken for a temperature.

Tables: ``pertcalc/data/vapour/spin_destruction.csv`` and ``pairs.csv``, made by notes/scripts/make_spin_destruction.py
and explained in notes/ground-level.md. A destruction coefficient k acts on the electron spin: electron-randomisation
rate G = n k, k = sigma vbar. Units: cm^2, cm^3/s, K.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from functools import cache
from typing import TypeVar

from pertcalc import species
from pertcalc.constants import AMU_AU, AU_VELOCITY_CM_S
from pertcalc.errors import InputError, UnknownNameError
from pertcalc.shipped import shipped_rows
from pertcalc.species import Sourced
from pertcalc.thermal import mean_speed
from pertcalc.vapour.process import weakest_mark

BY_GAS, BY_ALKALI, EXCHANGE = "spin destruction by gas", "alkali-alkali spin destruction", "spin exchange"
KINDS = (BY_GAS, BY_ALKALI, EXCHANGE)
# How far a number may stand for its pair, best first; an upper limit never does.
USES = ("value", "superseded", "order of magnitude", "upper limit")
N2_MASS_U = 28.0134  # standard atomic weight of N, twice (IUPAC, FROM MEMORY): N2 has rows but no curves

# A cross section carried from T0 to T without a published law is doubtful by (T/T0)^DOUBT: published laws of noble
# gases and N2 rise as T^0.7 to T^3.8 above a constant cross section; alkalis are nearly constant (no source).
DOUBT = {BY_GAS: 3.0, BY_ALKALI: 1.0, EXCHANGE: 0.5}
LAW_DOUBT = 1.0  # the same for a published law outside its range or borrowed from another row of the pair
NO_TEMPERATURE = 0.5  # relative error added when the source states no temperature
AS_NEAR = 0.1  # rows whose ln T differ by less than this are equally near

_T = TypeVar("_T")


@dataclass(frozen=True, slots=True)
class SpinRow:
    """One published number.

    ``alkali``; ``partner`` gas or the alkali itself; ``kind`` one of KINDS; ``quantity`` "cross section" [cm^2] |
    "rate" [cm^3/s]; ``value``, ``error`` [``unit``], None where none is stated; ``temperature_K`` [K] and the range
    ``low_K`` .. ``high_K`` [K] it covers, None where none is stated; ``exponent`` m of a law value (T/T0)^m [1];
    ``use`` one of USES; ``published`` as printed; ``definition``; ``source``, ``year``, ``mark``, ``grade``, ``note``.
    """

    alkali: str
    partner: str
    kind: str
    quantity: str
    value: float
    unit: str
    error: float | None
    temperature_K: float | None
    low_K: float | None
    high_K: float | None
    exponent: float | None
    use: str
    published: str
    definition: str
    source: str
    year: int | None
    mark: str
    grade: str
    note: str

    @property
    def relative_error(self) -> float | None:
        """Stated relative error [1], None where none is stated."""
        return None if self.error is None else self.error / self.value


@dataclass(frozen=True, slots=True)
class Choice:
    """The rate coefficient [cm^3/s] taken for a pair and its row, or None and ``reason``; ``note`` on what it is."""

    rate: Sourced | None
    row: SpinRow | None
    reason: str | None = None
    note: str = ""


@dataclass(frozen=True, slots=True)
class BoundPair:
    """What is published about a weakly bound pair, None where it is not.

    ``coupling_MHz`` spin-rotation constant gamma/h of gamma N.S [MHz]; ``lifetime_torr_s`` lifetime times pressure
    [s Torr] and ``equilibrium_cm3`` K [cm^3] at ``temperature_K`` [K].
    """

    alkali: str
    noble_gas: str
    coupling_MHz: float | None
    lifetime_torr_s: float | None
    equilibrium_cm3: float | None
    temperature_K: float
    source: str
    mark: str
    note: str


def spin_rows(alkali: str | None = None, partner: str | None = None, kind: str | None = None) -> tuple[SpinRow, ...]:
    """Return the rows of an alkali, a partner and a kind; None means all. UnknownNameError for an unknown kind."""
    if kind is not None and kind not in KINDS:
        raise UnknownNameError("kind", str(kind), KINDS)
    return tuple(
        row
        for row in _rows()
        if alkali in (None, row.alkali) and partner in (None, row.partner) and kind in (None, row.kind)
    )


def bound_pair(alkali: str, noble_gas: str) -> BoundPair | None:
    """Return what is published about the weakly bound pair of ``alkali`` and ``noble_gas``; None if nothing is."""
    return next((pair for pair in _pairs() if (pair.alkali, pair.noble_gas) == (alkali, noble_gas)), None)


def pair_speed_cm_s(alkali: str, partner: str, temperature_K: float) -> float:
    """Mean relative speed ``sqrt(8 k T/(pi mu))`` [cm/s] of an alkali and a partner at ``temperature_K`` [K]."""
    mass = species.alkali(alkali).mass_u.value
    if partner in species.ALKALIS:
        other = species.alkali(partner).mass_u.value
    else:
        other = N2_MASS_U if partner == "N2" else species.noble_gas(partner).mass_u.value
    return float(mean_speed(temperature_K, mass * other / (mass + other) * AMU_AU)) * AU_VELOCITY_CM_S


def rate_coefficient(row: SpinRow, temperature_K: float, law: SpinRow | None = None) -> Sourced:
    """A row as rate coefficient at a temperature.

    ``k(T0) = sigma vbar(T0)``; then ``k(T0) (T/T0)^m`` with the row's own m or that of ``law``, else
    ``sigma vbar(T)``.

    Parameters
    ----------
    row : SpinRow
        [cm^2 or cm^3/s].
    temperature_K : float
        [K] > 0.
    law : SpinRow or None
        A row of the same pair whose exponent is borrowed where ``row`` has none.

    Returns
    -------
    k : Sourced
        [cm^3/s]; error: the stated one and what the change of temperature costs (DOUBT, LAW_DOUBT), in quadrature;
        None when neither is there. The mark is the row's, or the weaker one of row and borrowed law.

    Raises
    ------
    InputError
        Temperature not finite and > 0.
    """
    T, T0 = temperature_K, row.temperature_K
    if not (math.isfinite(T) and T > 0):
        raise InputError(f"temperature = {T!r} K must be finite and > 0; give another temperature.")
    at = T if T0 is None else T0
    k = row.value * (pair_speed_cm_s(row.alkali, row.partner, at) if row.quantity == "cross section" else 1.0)
    doubt, carried, marks = NO_TEMPERATURE, "no temperature stated", [row.mark]
    if T0 is not None:
        inside = _distance(row, T) == 0
        m, power, carried = 0.5, DOUBT[row.kind], "cross section taken as constant"
        if row.exponent is not None:
            m, power, carried = row.exponent, LAW_DOUBT, f"its law (T/{T0:g} K)^{row.exponent:g}"
        elif law is not None and law.exponent is not None:
            m, power, carried = law.exponent, LAW_DOUBT, f"law T^{law.exponent:g} of {law.source}"
            marks += [] if inside else [law.mark]
        k *= (T / T0) ** m
        doubt = math.expm1(power * _distance(row, T))
        carried = f"{T0:g} K, {carried}" if T != T0 else f"{T0:g} K"
    error = math.hypot(row.relative_error or 0.0, doubt) * k
    return Sourced(k, "cm^3/s", f"{row.source}; {row.published} at {carried}", weakest_mark(marks), error or None)


def choose(alkali: str, partner: str, kind: str, temperature_K: float) -> Choice:
    """The rate coefficient of a pair at a temperature [K], and why that one.

    Rule: rows usable as value before superseded ones before orders of magnitude; READ before FROM MEMORY; nearest in
    ln T (AS_NEAR apart counts as equal); smallest stated relative error; newest. The temperature law of another row of
    the pair is borrowed. The rms difference of the pair's other rows of the same use goes into the error.

    Returns Choice; its rate is None with a reason for a pair without a row, or with an upper limit only.
    """
    rows = spin_rows(alkali, partner, kind)
    usable = [row for row in rows if row.use != "upper limit"]
    if not usable:
        return Choice(None, None, _nothing(alkali, partner, kind, rows))
    best_use = min((row.use for row in usable), key=USES.index)
    same_use = [row for row in usable if row.use == best_use]
    marked = [row for row in same_use if row.mark == species.READ] or same_use
    nearest = min(_distance(row, temperature_K) for row in marked)
    near = [row for row in marked if _distance(row, temperature_K) <= nearest + AS_NEAR]
    row = min(near, key=lambda r: (math.inf if r.error is None else r.relative_error, -(r.year or 0)))
    law = next((other for other in same_use if other.exponent is not None), None)
    rate = rate_coefficient(row, temperature_K, law)
    others = [rate_coefficient(other, temperature_K, law).value for other in same_use if other is not row]
    notes = [row.definition]
    if others:
        spread = math.sqrt(sum((k - rate.value) ** 2 for k in others) / len(others))
        rate = replace(rate, error=math.hypot(rate.error or 0.0, spread))
        notes.append(
            f"{len(others)} other row{'s' * (len(others) > 1)} of the pair differ by {spread:.1e} cm^3/s (rms)"
        )
    if best_use != "value":
        notes.insert(0, f"{best_use} only")
    return Choice(rate, row, None, "; ".join(notes))


def _nothing(alkali: str, partner: str, kind: str, rows: tuple[SpinRow, ...]) -> str:
    """Why there is no rate."""
    if rows:
        limit = rows[0]
        at = "" if limit.temperature_K is None else f" at {limit.temperature_K:g} K"
        return f"only an upper limit is known: {limit.published}{at} ({limit.mark}: {limit.source})"
    hint = "; helium-4 is not a substitute, the rate depends on the mass" if partner == "3He" else ""
    return f"no published {kind} of {alkali} and {partner} in the tables{hint}"


def _distance(row: SpinRow, temperature_K: float) -> float:
    """Distance in ln T from the range a row covers [1]; 1 where it states no temperature."""
    if row.low_K is None or row.high_K is None:
        return 1.0
    return max(0.0, math.log(row.low_K / temperature_K), math.log(temperature_K / row.high_K))


@cache
def _rows() -> tuple[SpinRow, ...]:
    numbers = ("value", "error", "temperature_K", "low_K", "high_K", "exponent")
    return shipped_rows("vapour", "spin_destruction.csv", lambda c: SpinRow(**_typed(c, numbers)))  # type: ignore[arg-type]


@cache
def _pairs() -> tuple[BoundPair, ...]:
    numbers = ("coupling_MHz", "lifetime_torr_s", "equilibrium_cm3", "temperature_K")
    return shipped_rows("vapour", "pairs.csv", lambda c: BoundPair(**_typed(c, numbers)))  # type: ignore[arg-type]


def _typed(cells: dict[str, str], numbers: tuple[str, ...]) -> dict[str, object]:
    """Cells with numbers as float (year as int), empty ones as None."""
    typed: dict[str, object] = dict(cells)
    typed |= {name: float(cells[name]) if cells[name] else None for name in numbers}
    if "year" in cells:
        typed["year"] = int(cells["year"]) if cells["year"] else None
    return typed
