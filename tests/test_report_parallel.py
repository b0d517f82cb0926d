"""Gases in a pool: the same answers, errors that cross process borders, interrupts that lose nothing."""

from __future__ import annotations

import multiprocessing
import os
import pickle
import signal
import subprocess
import sys
import time

import pytest

from pertcalc.errors import (
    DataFileError,
    InputError,
    NotConvergedError,
    OutOfRangeError,
    PertcalcError,
    PublishedCheckError,
    UnknownNameError,
)
from pertcalc.parallel import run_all, worker_pool

ERRORS = [
    PertcalcError("plain"),
    InputError(["one", "two"]),
    UnknownNameError("alkali", "Rbb", ("Rb", "Cs")),
    DataFileError("x.toml", ["bad", "worse"]),
    OutOfRangeError("temperature", 5000, 20, 2000, "K", "Cool it."),
    NotConvergedError("width", 1.0, 0.1, 0.01),
    PublishedCheckError("no"),
]


def square(x, progress=None):
    """A task that tells its progress when it can."""
    if progress is not None:
        progress(1, 2)
        progress(2, 2)
    return x * x


def fail(x, progress=None):
    """A task that ends in one of the library's errors."""
    raise ERRORS[x]


def die(x, progress=None):
    """A task whose process disappears."""
    os._exit(1)


@pytest.mark.parametrize("error", ERRORS, ids=lambda error: type(error).__name__)
def test_errors_survive_pickling(error):
    twin = pickle.loads(pickle.dumps(error))
    assert type(twin) is type(error) and str(twin) == str(error) and twin.exit_code == error.exit_code
    assert twin.__dict__ == error.__dict__


def test_a_pool_gives_what_one_process_gives_and_leaves_nobody_behind():
    before = multiprocessing.active_children()
    arguments = {name: (i,) for i, name in enumerate("abcde")}
    here = run_all(square, arguments)
    with worker_pool(2) as pool:
        there = run_all(square, arguments, pool)
    assert here.done == there.done == {"a": 0, "b": 1, "c": 4, "d": 9, "e": 16}
    deadline = time.monotonic() + 5
    while multiprocessing.active_children() != before and time.monotonic() < deadline:
        time.sleep(0.02)
    assert multiprocessing.active_children() == before


def test_progress_rises_to_the_total():
    seen: list[tuple[int, int]] = []
    run_all(square, {"a": (1,), "b": (2,)}, progress=lambda done, total: seen.append((done, total)))
    assert seen == [(50, 200), (100, 200), (150, 200), (200, 200), (200, 200)]


def test_an_error_ends_its_own_task_only():
    with worker_pool(2) as pool:
        outcome = run_all(fail, {"a": (4,), "b": (2,)}, pool)
    assert outcome.done == {} and not outcome.interrupted
    assert {key: str(error) for key, error in outcome.failed.items()} == {"a": str(ERRORS[4]), "b": str(ERRORS[2])}


def test_a_lost_worker_is_one_clear_error():
    with worker_pool(2) as pool:
        outcome = run_all(die, {"a": (1,)}, pool)
    assert "try again with --jobs 1" in str(outcome.failed["a"])


SLOW_GASES = """
import sys, time
import pertcalc.rates
from tests.report_fakes import fake_rates

def slow(alkali, gas, *others, **named):
    if gas != "Xe":  # the first to start
        time.sleep(60)
    return fake_rates(alkali, gas, *others, **named)

pertcalc.rates.collision_rates = slow
from pertcalc.cli import cli
cli(["report", "Rb", "--jobs", "2"], prog_name="pertcalc")
"""


@pytest.mark.skipif(multiprocessing.get_start_method() != "fork", reason="workers must inherit the invented rates")
def test_ctrl_c_prints_what_is_finished_and_ends_the_workers():
    root = os.path.dirname(os.path.dirname(os.path.abspath(__file__)))
    run = subprocess.Popen(
        [sys.executable, "-c", SLOW_GASES], cwd=root, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True,
        start_new_session=True,
    )  # fmt: skip
    time.sleep(4)  # long enough for imports and the first gas, far less than the others take
    os.killpg(run.pid, signal.SIGINT)  # as a terminal does: to the program and its workers alike
    stdout, stderr = run.communicate(timeout=20)
    assert run.returncode == 130
    assert stderr == "Error: stopped by the user; not finished: He, Ne, Ar, Kr.\n"
    assert "== Rb + Xe" in stdout and "Ar   not finished: stopped by the user" in stdout
    with pytest.raises(ProcessLookupError):
        os.killpg(run.pid, 0)
