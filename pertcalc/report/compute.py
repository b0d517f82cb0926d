"""From a request to a report: the rates of every gas, what they do in the cell, and what measurements say."""

from __future__ import annotations

import dataclasses
import os
from collections.abc import Sequence
from concurrent.futures import Executor
from contextlib import AbstractContextManager, nullcontext, suppress
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from pertcalc import __version__
from pertcalc.curves.curveset import CurveSet
from pertcalc.curves.files import load_default
from pertcalc.errors import OutOfRangeError, PertcalcError
from pertcalc.parallel import Outcome, Progress, run_all, worker_pool
from pertcalc.report.comparison import Comparison, compare, known_measurements
from pertcalc.report.request import Request
from pertcalc.results import Coefficient, CollisionRates
from pertcalc.species import SPECIES_GASES, alkali, noble_gas
from pertcalc.vapour.fill import IMPACT_LIMIT, LevelBalance, impact_parameter, level_balance

LEVELS = ("P1/2", "P3/2")


@dataclass(frozen=True, slots=True)
class GasReport:
    """One gas: ``rates`` at the temperature of the cell only, ``balances`` by level, ``comparisons`` with measurement.

    ``impact`` line width times collision duration [1] (largest of D1, D2; nan when no width is known); ``curves`` the
    set used; ``warnings`` of the rates and of the fill.
    """

    noble_gas: str
    rates: CollisionRates
    balances: dict[str, LevelBalance]
    comparisons: tuple[Comparison, ...]
    impact: float
    curves: CurveSet
    warnings: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class Report:
    """Gases in the order asked for; ``missing`` gas -> why it is not there; ``error`` the first failure, if any."""

    request: Request
    gases: tuple[GasReport, ...]
    missing: dict[str, str] = field(default_factory=dict)
    interrupted: bool = False
    error: PertcalcError | None = None
    version: str = __version__


def default_jobs() -> int:
    """Worker processes used when nobody says otherwise: the processors of the machine [1]."""
    return os.cpu_count() or 1


def compute_report(
    request: Request, jobs: int = 1, progress: Progress | None = None, executor: Executor | None = None
) -> Report:
    """Compute the rates of every gas of a request and set them beside decay, field and measurement.

    Parameters
    ----------
    request : Request
        From make_request.
    jobs : int
        Worker processes [1]; 1 computes here.
    progress : callable or None
        ``progress(done, total)``, total 100 per gas.
    executor : concurrent.futures.Executor or None
        Runs the gases in place of an own pool (``jobs`` is then ignored).

    Returns
    -------
    Report
        Without the gases that failed or were not finished when the user stopped it; ``missing`` says why.

    Raises
    ------
    PertcalcError
        Not one gas could be computed; the error of the first.
    """
    # Heavy gases take longest: started first, they do not leave the other workers idle at the end.
    tasks = {
        gas: (request.alkali, gas, _temperatures(request, gas), request.method, request.curves)
        for gas in sorted(request.gases, key=_weight, reverse=True)
    }
    workers_wanted = min(jobs, len(tasks))
    own_pool = executor is None and workers_wanted > 1
    pool: AbstractContextManager[Executor | None] = worker_pool(workers_wanted) if own_pool else nullcontext(executor)
    with pool as workers:
        outcome = run_all(rates_of_gas, tasks, workers, progress)
    return _assemble(request, outcome)


def _weight(gas: str) -> float:
    """Atomic mass [u]; that of a user's own perturber does not matter, it comes alone."""
    return noble_gas(gas).mass_u.value if gas in SPECIES_GASES else 0.0


def rates_of_gas(
    alkali: str,
    gas: str,
    temperatures: Sequence[float],
    method: str,
    curves: CurveSet | None,
    progress: Progress | None = None,
) -> CollisionRates:
    """The task of one worker: the rates at the first temperature [K] and at those of the others the curves support.

    At module level so that it pickles. Errors as pertcalc.rates.collision_rates.
    """
    from pertcalc.rates import check_walls, collision_rates, temperatures_of

    loaded = load_default(alkali, gas) if curves is None else curves
    wanted = [temperatures[0]]
    for T in temperatures[1:]:
        with suppress(OutOfRangeError):
            check_walls(loaded, temperatures_of(T))
            wanted.append(T)
    return collision_rates(alkali, gas, wanted, method=method, curves=loaded, progress=progress)


def restrict(rates: CollisionRates, count: int) -> CollisionRates:
    """The same rates at the first ``count`` temperatures only."""

    def cut(node: Coefficient) -> Coefficient:
        arrays: dict[str, Any] = {
            name: None if getattr(node, name) is None else getattr(node, name)[:count]
            for name in ("values", "numerical_error", "model_error", "exponent")
        }
        return dataclasses.replace(node, **arrays)

    return dataclasses.replace(
        rates,
        temperatures=rates.temperatures[:count],
        fwhm={line: cut(c) for line, c in rates.fwhm.items()},
        shift={line: cut(c) for line, c in rates.shift.items()},
        transfer={level: cut(c) for level, c in rates.transfer.items()},
        multipole_loss={level: {K: cut(c) for K, c in ranks.items()} for level, ranks in rates.multipole_loss.items()},
        multipole_transfer={
            level: {K: cut(c) for K, c in ranks.items()} for level, ranks in rates.multipole_transfer.items()
        },
    )


def _temperatures(request: Request, gas: str) -> tuple[float, ...]:
    """The cell's temperature first, then those at which the pair was measured [K], each once."""
    measured = (one.temperature_K for one in known_measurements(request.alkali, gas))
    return tuple(dict.fromkeys((request.fill.temperature_K, *measured)))


def _assemble(request: Request, outcome: Outcome) -> Report:
    gases = tuple(_gas_report(request, outcome.done[gas]) for gas in request.gases if gas in outcome.done)
    missing = {gas: str(outcome.failed[gas]) for gas in request.gases if gas in outcome.failed}
    error = next((outcome.failed[gas] for gas in request.gases if gas in outcome.failed), None)
    if outcome.interrupted:
        rest = (gas for gas in request.gases if gas not in outcome.done and gas not in missing)
        missing |= dict.fromkeys(rest, "not finished: stopped by the user")
    elif not gases and error is not None:
        raise error
    return Report(request, gases, missing, outcome.interrupted, error)


def _gas_report(request: Request, rates: CollisionRates) -> GasReport:
    comparisons = compare(rates)
    here = restrict(rates, 1)
    record = alkali(request.alkali)
    balances = {
        level: level_balance(
            level,
            record.decay_rate(level),
            record.levels[level].gJ.value,
            {K: first(c) for K, c in here.multipole_loss[level].items()},
            request.fill,
        )
        for level in LEVELS
    }
    widths = [first(c) for c in here.fwhm.values()]
    T, n = request.fill.temperature_K, request.fill.density_cm3
    impact = max((impact_parameter(w, T, here.reduced_mass, n) for w in widths if w is not None), default=np.nan)
    curves = request.curves or load_default(request.alkali, rates.noble_gas)
    warnings = (*rates.warnings, *_fill_warnings(impact))
    return GasReport(rates.noble_gas, here, balances, comparisons, float(impact), curves, warnings)


def first(coefficient: Coefficient, name: str = "values") -> float | None:
    """The named array of a coefficient at its first temperature, None where it is missing or not finite."""
    listed = coefficient.listed(name)
    return None if listed is None else listed[0]


def _fill_warnings(impact: float) -> tuple[str, ...]:
    if not impact > IMPACT_LIMIT:
        return ()
    return (
        f"line width x collision duration = {impact:.2g} is above {IMPACT_LIMIT:g}: collisions overlap, so the impact "
        "approximation and binary collisions are doubtful; lines become asymmetric and rates stop being proportional "
        "to density. Read the numbers at the fill as orders of magnitude, or lower the pressure.",
    )
