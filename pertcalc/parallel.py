"""One task per key (a gas, a pair, a sample), here or in a pool; one failure or an interrupt loses nothing finished."""

from __future__ import annotations

import multiprocessing
import signal
from collections.abc import Callable, Iterator, Mapping, Sequence
from concurrent.futures import Executor, ProcessPoolExecutor, as_completed
from concurrent.futures.process import BrokenProcessPool
from contextlib import contextmanager
from dataclasses import dataclass, field
from functools import partial
from typing import Any

from pertcalc.errors import PertcalcError

Progress = Callable[[int, int], None]


@dataclass(slots=True)
class Outcome:
    """What became of the tasks: ``done`` and ``failed`` by key, and whether the user stopped the rest."""

    done: dict[str, Any] = field(default_factory=dict)
    failed: dict[str, PertcalcError] = field(default_factory=dict)
    interrupted: bool = False


@contextmanager
def worker_pool(workers: int) -> Iterator[Executor]:
    """A process pool that leaves no worker behind, however the block is left.

    ``workers``: number of processes [1]. They ignore Ctrl-C: the parent hears it and ends them.
    """
    others = set(multiprocessing.active_children())
    pool = ProcessPoolExecutor(max_workers=workers, initializer=_ignore_interrupt)
    try:
        yield pool
    finally:
        pool.shutdown(wait=False, cancel_futures=True)
        for worker in set(multiprocessing.active_children()) - others:
            worker.terminate()


def run_all(
    task: Callable[..., Any],
    arguments: Mapping[str, Sequence[Any]],
    executor: Executor | None = None,
    progress: Progress | None = None,
) -> Outcome:
    """Run ``task(*arguments[key])`` for every key.

    Without an executor the tasks run here, one after another, and ``task`` also gets the keyword ``progress``. A
    PertcalcError ends its own task only. KeyboardInterrupt stops the rest: what is finished is returned.

    ``progress(done, total)`` is called after each piece of work; total is 100 per task.
    """
    outcome = Outcome()
    report = progress or _nobody
    run = _run_here if executor is None else partial(_run_in, executor)
    try:
        run(task, arguments, outcome, report)
        report(100 * len(arguments), 100 * len(arguments))
    except KeyboardInterrupt:
        outcome.interrupted = True
    return outcome


def _run_here(
    task: Callable[..., Any], arguments: Mapping[str, Sequence[Any]], outcome: Outcome, report: Progress
) -> None:
    total = 100 * len(arguments)
    for number, (key, values) in enumerate(arguments.items()):
        _collect(outcome, key, partial(task, *values, progress=_share(report, 100 * number, total)))


def _run_in(
    executor: Executor,
    task: Callable[..., Any],
    arguments: Mapping[str, Sequence[Any]],
    outcome: Outcome,
    report: Progress,
) -> None:
    futures = {executor.submit(task, *values): key for key, values in arguments.items()}
    try:
        for number, future in enumerate(as_completed(futures), start=1):
            _collect(outcome, futures[future], future.result)
            report(100 * number, 100 * len(arguments))
    except KeyboardInterrupt:
        # Results that came in while the interrupt was on its way are kept too.
        for future, key in futures.items():
            if future.done() and not future.cancelled() and key not in outcome.done:
                _collect(outcome, key, future.result)
        raise


def _collect(outcome: Outcome, key: str, call: Callable[[], Any]) -> None:
    try:
        outcome.done[key] = call()
    except PertcalcError as error:
        outcome.failed[key] = error
    except BrokenProcessPool:
        outcome.failed[key] = PertcalcError(
            "a worker process ended before its result came (out of memory?); try again with --jobs 1."
        )


def _share(progress: Progress, before: int, total: int) -> Progress:
    """Progress of one task as its hundredth parts of the whole."""
    return lambda done, of: progress(before + (100 * done) // max(of, 1), total)


def _nobody(done: int, total: int) -> None:
    """Nobody is told."""


def _ignore_interrupt() -> None:
    signal.signal(signal.SIGINT, signal.SIG_IGN)
