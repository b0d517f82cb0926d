"""The spread of an ensemble beside the quadrature estimate of pertcalc.model_error, for notes/ensemble.md.

    python notes/scripts/compare_ensemble.py Rb Ar 333 Na He 400

Per rate: sd and half of the 16-84 % interval over the value; the quadrature of one-at-a-time changes of the curves and
the method difference; the share the linear fit explains; the three inputs that dominate.
"""

from __future__ import annotations

import sys

import numpy as np

from pertcalc import model_error
from pertcalc.curves import files
from pertcalc.ensemble import ensemble
from pertcalc.ensemble_result import value_of

MEMBERS = 64


def compare(alkali: str, gas: str, temperature: float) -> None:
    curves, T = files.load_default(alkali, gas), np.array([temperature])
    quadrature = model_error.shipped_errors(curves, T) or model_error.curve_errors(curves, T)
    method = model_error.method_errors(curves, T)
    whole = ensemble(alkali, gas, temperature, MEMBERS)
    print(f"\n{alkali}-{gas} {temperature:g} K, {curves.id}")
    print("| rate | sd | half interval | quadrature (curves, method) | explained | dominant inputs |")
    print("|---|---|---|---|---|---|")
    for key in whole.samples:
        value = np.abs(value_of(whole.nominal, key))[0]
        low, high = whole.interval(key)[:, 0]
        inputs, explained = whole.fit(key)
        named = ", ".join(f"{one.name} {100 * one.share[0]:.0f} %" for one in inputs[:3])
        total = np.hypot(quadrature[key][0], method[key][0])
        print(
            f"| {' '.join(key)} | {whole.sd(key)[0] / value:.3f} | {0.5 * (high - low) / value:.3f} | {total:.3f} "
            f"({quadrature[key][0]:.3f}, {method[key][0]:.3f}) | {explained[0]:.2f} | {named} |"
        )


if __name__ == "__main__":
    words = sys.argv[1:]
    for alkali, gas, temperature in zip(words[::3], words[1::3], words[2::3], strict=True):
        compare(alkali, gas, float(temperature))
