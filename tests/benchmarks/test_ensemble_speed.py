"""What an ensemble of 64 members costs beside the single answer, by the clock and by work, in one run.

    python -m pytest tests/benchmarks/test_ensemble_speed.py -m benchmark -s

Goal: 15 times. Single answers are timed before and after the members and the middle is taken, so that other work on
the machine counts for both. Nothing is asserted about the clock; the work is asserted in tests/test_ensemble.py too.
"""

from __future__ import annotations

import time

import numpy as np
import pytest

from pertcalc import rates
from pertcalc.collisions import recipe
from pertcalc.collisions.pair import pair_of
from pertcalc.curves import files
from pertcalc.ensemble import ensemble

pytestmark = pytest.mark.benchmark

MEMBERS, GOAL = 64, 15.0
CASES = [("Na", "He", 400.0), ("K", "Ar", 350.0), ("Rb", "Ar", 333.0), ("Rb", "Xe", 333.0), ("Cs", "Ar", 333.0)]


def seconds(work) -> tuple[float, float, object]:
    wall, cpu = time.perf_counter(), time.process_time()
    found = work()
    return time.perf_counter() - wall, time.process_time() - cpu, found


@pytest.mark.parametrize("alkali, gas, temperature", CASES)
def test_64_members_beside_the_single_answer(alkali, gas, temperature, monkeypatch):
    # Model errors of curves without a shipped table would be computed with either: they are no part of the dynamics.
    curves = files.load_default(alkali, gas)
    T = np.array([temperature])
    keys = [
        key
        for key in recipe.averaged(recipe.thermal_rates, pair_of(curves), T, recipe.family_tables(pair_of(curves), T))
    ]
    monkeypatch.setattr(rates, "model_errors", lambda *_, **__: {key: np.zeros(1) for key in keys})

    def single():
        return rates.collision_rates(alkali, gas, temperature)

    singles = [seconds(single) for _ in range(2)]
    wall, cpu, found = seconds(lambda: ensemble(alkali, gas, temperature, MEMBERS))
    singles += [seconds(single) for _ in range(2)]
    one_wall, one_cpu = (float(np.median([run[i] for run in singles])) for i in (0, 1))
    work = 1 + found.work["exponentials"] / singles[0][2].work["exponentials"]
    print(
        f"\n{alkali}-{gas} {temperature:g} K: single {one_wall:.2f} s, {MEMBERS} members {wall:.1f} s: ratio "
        f"{wall / one_wall:.1f} (processor time {cpu / one_cpu:.1f}, work {work:.1f}; goal {GOAL:g})"
    )
    assert work < GOAL
