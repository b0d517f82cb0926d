"""The work of `pertcalc validate`: checks, laws, the method table, and the measured pairs in several processes."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from concurrent.futures import Executor
from contextlib import AbstractContextManager, nullcontext
from dataclasses import dataclass, field

from pertcalc import __version__
from pertcalc.errors import PertcalcError, PublishedCheckError, UnknownNameError
from pertcalc.measured import QUANTITIES, Measurement, measurements
from pertcalc.names import METHODS
from pertcalc.parallel import Outcome, Progress, run_all, worker_pool
from pertcalc.report.comparison import compare
from pertcalc.report.compute import rates_of_gas
from pertcalc.results import CollisionRates
from pertcalc.species import ALKALIS, READ, SPECIES_GASES, alkali, noble_gas
from pertcalc.validation.check import Check, failure_message, failures
from pertcalc.validation.laws import check_balance, check_laws
from pertcalc.validation.methods import MethodDifference, method_differences
from pertcalc.validation.published import check_constants, check_wells
from pertcalc.validation.scores import Median, Score, medians, rate_check, score


@dataclass(frozen=True, slots=True)
class Validation:
    """Everything `pertcalc validate` found.

    ``checks`` wells, constants, laws and the READ rates; ``differences`` of the methods; ``scores`` one per measurement
    of the pairs computed; ``medians`` over them; ``pairs`` computed and ``pairs_total`` with a measurement asked for;
    ``missing`` pair -> why it is not there; ``error`` the first failure of a pair, if any.
    """

    method: str
    everything: bool
    quantities: tuple[str, ...]
    checks: tuple[Check, ...]
    differences: tuple[MethodDifference, ...]
    scores: tuple[Score, ...]
    medians: tuple[Median, ...]
    pairs: tuple[str, ...]
    pairs_total: int
    missing: dict[str, str] = field(default_factory=dict)
    interrupted: bool = False
    error: PertcalcError | None = None
    version: str = __version__

    @property
    def failed(self) -> tuple[Check, ...]:
        """The gating checks that failed."""
        return failures(self.checks)

    def failure(self) -> PublishedCheckError | None:
        """The error to end with when a gating check failed, else None."""
        return PublishedCheckError(failure_message(self.failed)) if self.failed else None


def pairs_to_compute(quantities: Sequence[str], everything: bool) -> dict[tuple[str, str], list[Measurement]]:
    """Pairs with measurements of these quantities, each with those rows; without ``everything`` only READ pairs.

    A READ pair has at least one READ measurement of any quantity: what may gate is always among the quick ones.
    """
    found: dict[tuple[str, str], list[Measurement]] = {}
    for row in measurements():
        if row.quantity in quantities:
            found.setdefault((row.alkali, row.noble_gas), []).append(row)
    found = dict(sorted(found.items(), key=lambda item: (ALKALIS.index(item[0][0]), SPECIES_GASES.index(item[0][1]))))
    if everything:
        return found
    read = {(row.alkali, row.noble_gas) for row in measurements() if row.mark == READ}
    return {pair: rows for pair, rows in found.items() if pair in read}


def validate(
    everything: bool = False,
    quantities: Sequence[str] = (),
    method: str = METHODS[0],
    jobs: int = 1,
    progress: Progress | None = None,
    executor: Executor | None = None,
) -> Validation:
    """Run the published checks and the exact laws, summarise the method table and score the measured rows.

    Parameters
    ----------
    everything : bool
        Every pair with a measurement; otherwise only those with a READ one.
    quantities : sequence of str
        "fwhm", "shift", "transfer", "multipole_loss"; empty means all.
    method : str
        Method of the computed rates.
    jobs : int
        Worker processes [1]; 1 computes here.
    progress : callable or None
        ``progress(done, total)``, total 100 per pair.
    executor : concurrent.futures.Executor or None
        Runs the pairs in place of an own pool.

    Returns
    -------
    Validation
        Without the pairs that failed or were not finished when the user stopped it.

    Raises
    ------
    UnknownNameError
        A quantity or method that is not known.
    DataFileError
        A data file of the package is missing or damaged.
    """
    wanted = _checked(quantities, method)
    # What needs no rates comes first: a damaged file is told before a minute of work.
    checks = [*check_wells(), *check_constants(), *check_laws()]
    differences = method_differences()
    chosen = pairs_to_compute(wanted, everything)
    outcome = _computed(chosen, method, jobs, progress, executor)
    names = [f"{metal}-{gas}" for metal, gas in chosen]
    done: list[CollisionRates] = [outcome.done[name] for name in names if name in outcome.done]
    scores = tuple(_scores(done, wanted, method))
    checks += [*check_balance(done), *(rate_check(one) for one in scores if one.gates)]
    return Validation(
        method,
        everything,
        wanted,
        tuple(checks),
        tuple(differences),
        scores,
        tuple(medians(scores)),
        tuple(name for name in names if name in outcome.done),
        len(pairs_to_compute(wanted, True)),
        _missing(names, outcome),
        outcome.interrupted,
        next((outcome.failed[name] for name in names if name in outcome.failed), None),
    )


def _checked(quantities: Sequence[str], method: str) -> tuple[str, ...]:
    """The quantities in our order, all if none is named; UnknownNameError for a wrong one or a wrong method."""
    for name in quantities:
        if name not in QUANTITIES:
            raise UnknownNameError("quantity", name, QUANTITIES)
    if method not in METHODS:
        raise UnknownNameError("method", method, METHODS)
    return tuple(name for name in QUANTITIES if not quantities or name in quantities)


def _computed(
    chosen: Mapping[tuple[str, str], Sequence[Measurement]],
    method: str,
    jobs: int,
    progress: Progress | None,
    executor: Executor | None,
) -> Outcome:
    """The rates of the chosen pairs at the temperatures of their measurements."""
    tasks = {
        f"{metal}-{gas}": (metal, gas, sorted({row.temperature_K for row in rows}), method, None)
        for (metal, gas), rows in sorted(chosen.items(), key=lambda item: -_weight(*item[0]))
    }
    workers_wanted = min(jobs, len(tasks))
    own_pool = executor is None and workers_wanted > 1
    pool: AbstractContextManager[Executor | None] = worker_pool(workers_wanted) if own_pool else nullcontext(executor)
    with pool as workers:
        return run_all(rates_of_gas, tasks, workers, progress)


def _weight(metal: str, gas: str) -> float:
    """Reduced mass [u]: heavy pairs take longest and start first."""
    m, M = alkali(metal).mass_u.value, noble_gas(gas).mass_u.value
    return m * M / (m + M)


def _scores(done: Sequence[CollisionRates], quantities: Sequence[str], method: str) -> list[Score]:
    compared = [one for rates in done for one in compare(rates) if one.measurement.quantity in quantities]
    compared.sort(key=lambda one: QUANTITIES.index(one.measurement.quantity))
    return [score(one.measurement, one.ours, one.numerical_error, one.model_error, method) for one in compared]


def _missing(names: Sequence[str], outcome: Outcome) -> dict[str, str]:
    missing = {name: str(outcome.failed[name]) for name in names if name in outcome.failed}
    if outcome.interrupted:
        rest = (name for name in names if name not in outcome.done and name not in missing)
        missing |= dict.fromkeys(rest, "not finished: stopped by the user")
    return missing
