"""An invented pair whose rates are power laws of the curve parameters: its ensemble is known exactly."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

import numpy as np

from pertcalc.collisions.pair import CollisionPair
from pertcalc.curves import files
from pertcalc.curves.curveset import CurveSet
from pertcalc.curves.deform import Deformed
from tests.report_fakes import fake_rates

KEYS = (
    *((quantity, line) for quantity in ("fwhm", "shift") for line in ("D1", "D2")),
    ("loss", "P1/2", "1"),
    *(("loss", "P3/2", str(K)) for K in (1, 2, 3)),
    *(("transfer", level) for level in ("P1/2", "P3/2")),
    *(("gain", level, "1") for level in ("P1/2", "P3/2")),
)
# d ln rate / d ln parameter of every rate but the shifts.
POWERS = {("B", "De"): 0.7, ("B", "Re"): 3.0, ("A", "C6"): -0.4}


def stated(errors: Mapping[str, Mapping[str, float]], correlation: Mapping[str, float] | None = None) -> CurveSet:
    """The default curves of K-Ar with these errors alone, and the correlation in state B."""
    curves = files.load_default("K", "Ar")
    states = {
        name: replace(
            one, uncertainty=dict(errors.get(name, {})), correlation=dict((correlation or {}) if name == "B" else {})
        )
        for name, one in curves.states.items()
    }
    return replace(curves, states=states)


def power_law(pair: CollisionPair, temperatures: np.ndarray, grids: object) -> tuple[dict, dict]:
    """Stands for `coarse_rates`: rates 2 prod (1 + change)^power; shifts 1 plus the same power law minus 1."""
    value = 1.0
    for (state, parameter), power in POWERS.items():
        curve = getattr(pair, state)
        if isinstance(curve, Deformed):
            value *= (1 + getattr(curve, parameter)) ** power
    rates = {key: np.full(temperatures.shape, value if key[0] == "shift" else 2 * value) for key in KEYS}
    rates |= {key: 0.3 * rates[key] for key in KEYS if key[0] == "gain"}
    return rates, {"paths": 1, "exponentials": 10}


def install(monkeypatch) -> None:
    """Put the invented pair in the place of the dynamics."""
    monkeypatch.setattr("pertcalc.rates.collision_rates", _nominal)
    monkeypatch.setattr("pertcalc.ensemble.coarse_rates", power_law)
    monkeypatch.setattr("pertcalc.ensemble.coarse_grids", lambda pair, temperatures: {})


def _nominal(alkali, gas, temperature, method="semiclassical", curves=None, progress=None):
    """Invented rates; a set called "other" has twice as large ones."""
    found = fake_rates(alkali, gas, temperature, method)
    if getattr(curves, "id", "") != "other":
        return found
    from pertcalc.ensemble_result import value_of, with_values

    return with_values(found, {key: 2 * value_of(found, key) for key in KEYS})
