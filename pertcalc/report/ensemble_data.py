"""An ensemble of rates as one JSON object and as columns beside the rows of the rates."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import asdict
from typing import Any

import numpy as np
from numpy.typing import NDArray

from pertcalc.collisions.recipe import Key
from pertcalc.ensemble_result import Ensemble, Sensitivity, with_values
from pertcalc.errors import InputError
from pertcalc.report.rows import RateRow, as_csv, rate_rows

Array = NDArray[np.float64]

# Inputs named beside every rate.
DOMINANT = 3
_SHORT = {"multipole_loss": "loss", "multipole_transfer": "gain"}
_PATHS = {
    "fwhm": "lines.{1}.fwhm_rad_s_cm3",
    "shift": "lines.{1}.shift_rad_s_cm3",
    "loss": "levels.{1}.multipole_loss_cm3_s.{2}",
    "transfer": "levels.{1}.transfer_cm3_s",
    "gain": "levels.{1}.multipole_transfer_cm3_s.{2}",
}


def key_of(row: RateRow) -> Key:
    """The ensemble's key of a row of the rates."""
    rank = () if row.rank is None else (str(row.rank),)
    return (_SHORT.get(row.quantity, row.quantity), row.line_or_level, *rank)


def known(ask: Callable[[], Any]) -> tuple[Any, str]:
    """What a question about the samples answers and "", or None and why there are too few of them."""
    try:
        return ask(), ""
    except InputError as error:
        return None, str(error)


def rates_ensemble_json(found: Ensemble) -> dict[str, Any]:
    """The object of ``pertcalc.rates/1`` with ``ensemble`` beside its keys."""
    return found.nominal.to_json() | {"ensemble": ensemble_json(found)}


def ensemble_json(found: Ensemble) -> dict[str, Any]:
    """Inputs, moments, the 16-84 % interval, sensitivities and correlations; what is not known is null with a reason.

    ``mean``, ``sd``, ``q16``, ``q84`` have the lines/levels shape of the rates.
    """
    reasons: dict[str, str] = {}

    def tree(name: str, statistic: Callable[[Key], Array]) -> dict[str, Any] | None:
        values, reason = known(lambda: {key: statistic(key) for key in found.samples})
        if reason:
            reasons[name] = reason
            return None
        shown = with_values(found.nominal, values).to_json()
        return {part: shown[part] for part in ("lines", "levels")}

    made = {
        "samples": found.asked,
        "finished": found.size,
        "interrupted": found.interrupted,
        "failed": dict(found.failed),
        "seed": found.seed,
        "curve_sets": list(found.sets),
        "inputs": [
            {"name": one.name, "kind": one.kind, "relative_error": one.relative or None} for one in found.inputs
        ],
        "mean": tree("mean", found.mean),
        "sd": tree("sd", found.sd),
        "sd_relative_error": found.sd_error if found.size > 1 else None,
        "q16": tree("q16", lambda key: found.interval(key)[0]),
        "q84": tree("q84", lambda key: found.interval(key)[1]),
        "sensitivities": _sensitivities(found, reasons),
        "correlation": _correlation(found, reasons),
        "work": dict(found.work),
    }
    return made | {"reasons": reasons}


def _path(key: Key) -> str:
    return _PATHS[key[0]].format(*key)


def _sensitivities(found: Ensemble, reasons: dict[str, str]) -> dict[str, Any] | None:
    fits, reason = known(lambda: {key: found.fit(key) for key in found.samples})
    if reason:
        reasons["sensitivities"] = reason
        return None
    return {
        _path(key): {"explained": explained.tolist(), "inputs": [_listed(one) for one in inputs]}
        for key, (inputs, explained) in fits.items()
    }


def _listed(one: Sensitivity) -> dict[str, Any]:
    return {
        "name": one.name,
        "d_ln_rate_d_ln_parameter": None if one.derivative is None else one.derivative.tolist(),
        "standard_error": None if one.derivative_error is None else one.derivative_error.tolist(),
        "share_of_variance": one.share.tolist(),
        "share_standard_error": one.share_error.tolist(),
    }


def _correlation(found: Ensemble, reasons: dict[str, str]) -> dict[str, Any] | None:
    matrices, reason = known(found.correlation)
    if reason:
        reasons["correlation"] = reason
        return None
    finite = [[[float(x) if np.isfinite(x) else None for x in row] for row in matrix] for matrix in matrices]
    return {"rates": [_path(key) for key in found.samples], "by_temperature": finite}


def ensemble_csv(found: Ensemble) -> str:
    """The rows of the rates with mean, sd and interval of the ensemble and the inputs that dominate each."""
    return as_csv(_row(found, row) for row in rate_rows(found.nominal))


def _row(found: Ensemble, row: RateRow) -> dict[str, Any]:
    key, at = key_of(row), list(found.nominal.temperatures).index(row.temperature_K)
    mean, _ = known(lambda: found.mean(key)[at])
    sd, _ = known(lambda: found.sd(key)[at])
    interval, _ = known(lambda: found.interval(key)[:, at])
    low, high = (None, None) if interval is None else interval
    columns = {"ensemble_mean": mean, "ensemble_sd": sd, "ensemble_q16": low, "ensemble_q84": high}
    return asdict(row) | columns | {"dominant_inputs": " ".join(one.name for one in dominant(found, key, at))}


def dominant(found: Ensemble, key: Key, at: int) -> list[Sensitivity]:
    """The DOMINANT inputs of a rate at temperature number `at`, largest share first; none when too few samples."""
    fit, _ = known(lambda: found.fit(key)[0])
    return sorted(fit or [], key=lambda one: -float(one.share[at]))[:DOMINANT]
