"""Every measurement beside ours: ratio, deviation in units of the combined error, medians, and which ones gate.

Positive quantities (widths, cross sections) are compared by their logarithm, so that ten times too large and ten times
too small count alike; shifts change sign and are compared by their difference. notes/validation-command.md.
"""

from __future__ import annotations

import math
import statistics
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass

from pertcalc.measured import QUANTITIES, Measurement
from pertcalc.species import READ, SPECIES_GASES
from pertcalc.validation.check import Check

# Relative error taken for a measurement that prints none, by grade; "low" is an order of magnitude: a factor 2.
ASSUMED_ERROR = {"high": 0.15, "medium": 0.15, "low": 1.0}
# A rate that gates must lie within this many combined errors; any other is called outside beyond it.
LIMIT = 3.0
# Issue 7: goals for the median deviation of the default curves over measured cells.
GOALS = {"fwhm": 0.06, "shift": 0.12}
# Methods that follow the curves; the closed form claims no more than an order of magnitude.
GATING_METHODS = ("semiclassical", "quantum")

# READ and of high grade, yet not fit to gate: (alkali, quantity, line or level) and why. Argued in the note.
UNFIT: dict[tuple[str, str, str], str] = {
    ("Rb", "multipole_loss", "P1/2"): "in conflict: about 20 A^2 is reported for He by others (3.4 here); same "
    "experiment for Ne",
}


@dataclass(frozen=True, slots=True)
class Score:
    """One measurement beside ours, both in the unit of the measurement.

    ``ours`` and its relative ``numerical_error``, ``model_error`` [1], None when unknown; ``theirs_error`` [unit of the
    measurement], ``assumed`` when none is printed; ``ratio`` ours/theirs [1]; ``log_ratio`` ln of it [1], None where it
    has none; ``deviation`` in units of the combined error [1], positive when ours is larger; ``gates`` and why not.
    """

    measurement: Measurement
    ours: float | None
    numerical_error: float | None
    model_error: float | None
    theirs_error: float
    assumed: bool
    ratio: float | None
    log_ratio: float | None
    deviation: float | None
    gates: bool
    no_gate: str

    @property
    def opposite(self) -> bool:
        """Both values known, of opposite sign (or ours zero)."""
        return self.ratio is not None and self.ratio <= 0

    @property
    def outside(self) -> bool:
        """Further than LIMIT combined errors from the measurement."""
        return self.deviation is not None and abs(self.deviation) > LIMIT


@dataclass(frozen=True, slots=True)
class Median:
    """Medians over the rows of one quantity (None: all) in one gas (None: all).

    ``rows`` measurements, of which ``compared`` have a ratio and ``opposite`` the wrong sign (they count as infinitely
    far off); ``median`` of |ln ratio| [1], ``median_good`` without the ``low`` grade rows (``good`` of them), None if
    empty or infinite; ``within_one``, ``within_three`` shares of rows within 1 and 3 combined errors [1], bounds
    included; ``goal`` for the median [1].
    """

    quantity: str | None
    noble_gas: str | None
    rows: int
    compared: int
    opposite: int
    median: float | None
    good: int
    median_good: float | None
    within_one: float | None
    within_three: float | None
    goal: float | None


def score(
    measurement: Measurement,
    ours: float | None,
    numerical_error: float | None,
    model_error: float | None,
    method: str = "semiclassical",
) -> Score:
    """Set one value of ours beside a measurement.

    ``ln(ours/theirs) / hypot(relative errors)`` for positive quantities, ``(ours - theirs) / hypot(errors)`` for
    shifts, ``max(0, |ours| - bound) / error of ours`` for a bound; none where the error of ours is not estimated.

    Parameters
    ----------
    measurement : Measurement
    ours : float or None
        [unit of the measurement].
    numerical_error, model_error : float or None
        Relative [1]; added in quadrature.
    method : str
        The method that made it.

    Returns
    -------
    Score
    """
    assumed = measurement.error is None
    error = abs(measurement.value) * ASSUMED_ERROR[measurement.grade] if assumed else measurement.error
    assert error is not None
    is_value = measurement.kind == "value"
    if ours is not None and not math.isfinite(ours):
        ours = None
    ratio = ours / measurement.value if ours is not None and is_value and measurement.value else None
    log_ratio = math.log(ratio) if ratio is not None and ratio > 0 else None
    own = None if model_error is None else math.hypot(numerical_error or 0.0, model_error)
    deviation = None if ours is None or own is None else _deviation(measurement, ours, error, own)
    reason = no_gate(measurement, method)
    return Score(
        measurement, ours, numerical_error, model_error, error if is_value else 0.0, assumed and is_value, ratio,
        log_ratio, deviation, not reason, reason,
    )  # fmt: skip


def _deviation(measurement: Measurement, ours: float, error: float, own: float) -> float:
    theirs = measurement.value
    if measurement.kind == "bound":
        excess = max(0.0, abs(ours) - theirs)
        return excess / (own * abs(ours)) if excess else 0.0
    if measurement.quantity == "shift":
        return (ours - theirs) / math.hypot(error, own * ours)
    if ours <= 0:
        return -math.inf  # a width or a loss that is not positive is no answer at all
    return math.log(ours / theirs) / math.hypot(error / theirs, own)


def no_gate(measurement: Measurement, method: str) -> str:
    """Why a measurement does not gate; empty when it does."""
    if measurement.mark != READ:
        return f"{measurement.mark} never gates"
    if measurement.kind != "value":
        return "a bound only"
    if measurement.grade != "high":
        return f"grade {measurement.grade}: its definition is inferred"
    if method not in GATING_METHODS:
        return f"method {method} claims an order of magnitude only"
    return UNFIT.get((measurement.alkali, measurement.quantity, measurement.line_or_level), "")


def rate_check(one: Score) -> Check:
    """A measurement as a check: within LIMIT combined errors, counted as in `score`."""
    m = one.measurement
    rank = f" K={m.rank}" if m.rank else ""
    printed = "15 % for the source, which prints none," if one.assumed else "the printed error"
    return Check(
        group="rate",
        name=f"{m.alkali}-{m.noble_gas} {m.line_or_level} {m.quantity}{rank} {m.temperature_K:g} K",
        theirs=m.value,
        ours=one.ours,
        unit=m.unit,
        difference=math.nan if one.deviation is None else one.deviation,
        tolerance=LIMIT,
        tolerance_unit="combined errors",
        basis=f"{LIMIT:g} x ({printed} and ours: numerical, curves, method), of the logarithm",
        source=m.source,
        mark=m.mark,
        gates=one.gates,
        note=m.note,
    )


def medians(scores: Sequence[Score]) -> list[Median]:
    """Medians by quantity, by gas, and by both; only groups that have rows."""
    groups: list[tuple[str | None, str | None]] = [(quantity, None) for quantity in QUANTITIES]
    groups += [(None, gas) for gas in SPECIES_GASES]
    groups += [(quantity, gas) for quantity in QUANTITIES for gas in SPECIES_GASES]
    found = (_median(scores, quantity, gas) for quantity, gas in groups)
    return [one for one in found if one.rows]


def _median(scores: Sequence[Score], quantity: str | None, gas: str | None) -> Median:
    rows = [
        one
        for one in scores
        if quantity in (None, one.measurement.quantity) and gas in (None, one.measurement.noble_gas)
    ]
    compared = [one for one in rows if one.ratio is not None]
    good = [one for one in compared if one.measurement.grade != "low"]
    off = [abs(one.deviation) for one in rows if one.deviation is not None]
    return Median(
        quantity,
        gas,
        len(rows),
        len(compared),
        sum(one.opposite for one in compared),
        _middle(compared),
        len(good),
        _middle(good),
        _share(off, lambda x: x <= 1),
        _share(off, lambda x: x <= LIMIT),
        None if quantity is None or gas is not None else GOALS.get(quantity),
    )


def _middle(compared: Sequence[Score]) -> float | None:
    sizes = [math.inf if one.log_ratio is None else abs(one.log_ratio) for one in compared]
    middle = statistics.median(sizes) if sizes else math.inf
    return middle if math.isfinite(middle) else None


def _share(values: Iterable[float], inside: Callable[[float], bool]) -> float | None:
    flags = [inside(value) for value in values]
    return sum(flags) / len(flags) if flags else None
