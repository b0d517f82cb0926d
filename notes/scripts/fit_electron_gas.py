"""Make pertcalc/data/one_electron/electron_gas.toml: the electron-gas potentials of the one-electron model.

Usage: python notes/scripts/fit_electron_gas.py [OUTPUT_FILE]

"l-dependent": least squares to the rows "fit" of phase_shifts.csv (notes/electron-gas.md). "calibrated", "soft": range
and cut-off given, strength from the scattering length. Parameters are rounded before the residuals are taken.
"""

from __future__ import annotations

import sys
from collections.abc import Sequence
from dataclasses import replace
from pathlib import Path

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import brentq, least_squares

from pertcalc.one_electron.gas_electron import GasElectron, repulsion_for
from pertcalc.one_electron.scattering import Separable, bound_states, scattering_length
from pertcalc.one_electron.scattering_data import ScatteringDatum, predicted, scattering_data
from pertcalc.species import GASES, noble_gas

OUTPUT = Path(__file__).parents[2] / "pertcalc" / "data" / "one_electron" / "electron_gas.toml"
# Cut-off radius [bohr]: given; the fit hardly feels it (notes/electron-gas.md).
CUTOFF = {"He": 1.3, "Ne": 1.5, "Ar": 2.2, "Kr": 2.2, "Xe": 2.5}
# Start of strength B, beta, gamma_0, S_0, gamma_1, S_1; B = None where no local term is wanted.
START = {
    "He": (None, 1.0, 0.43, 0.8, 0.6, 0.0),
    "Ne": (None, 1.0, 0.75, 1.5, 0.43, 0.3),
    "Ar": (-1.0, 0.31, 0.36, 4.0, 0.25, 0.5),
    "Kr": (-0.9, 0.29, 0.30, 4.7, 0.27, 2.0),
    "Xe": (-0.9, 0.27, 0.25, 5.0, 0.24, 2.0),
}
# Xenon's numbers leave the ranges open: these follow from argon and krypton, with this spread of the logarithm.
PRIOR = {"Xe": {1: (0.27, 0.1), 2: (0.25, 0.1), 4: (0.24, 0.1)}}
RANGE = (0.12, 1.5)  # Gaussian exponents [bohr^-2]
STRONGEST = 8.0  # [hartree]; more does not change what is left of the wave inside
GIVEN = {  # beta, cut-off of the two given sets
    "calibrated": {"Ne": (0.4113, 0.891), "Ar": (0.791, 2.40), "Kr": (0.80, 0.895), "Xe": (0.542, 1.56)},
    "soft": {"Ne": (0.4113, 0.891), "Ar": (0.35, 1.90), "Kr": (0.31, 2.20), "Xe": (0.25, 2.40)},
}
GIVEN_HELIUM = {"calibrated": (0.33, 0.70), "soft": (0.27, 0.70)}  # gamma of the s term, cut-off
GIVEN_SOURCE = {
    "calibrated": "range and cut-off tuned to the X and A wells of Na with the gas; strength: scattering length",
    "soft": "softer range, nearer to the blue satellites of the caesium D2 line; strength: scattering length",
}


def beta_1(gas: str) -> float:
    """alpha_d/(2 omega) of one effective oscillator, omega = 4 C6/(3 alpha_d^2) from the homonuclear C6 [bohr^5]."""
    record = noble_gas(gas)
    alpha = record.polarizability_au.value
    return 0.5 * alpha / (4.0 * record.C6_homonuclear_au.value / (3.0 * alpha**2))


def potential(gas: str, p: Sequence[float] | NDArray[np.float64]) -> GasElectron:
    """Potential of p = B, beta, gamma_0, S_0, gamma_1, S_1."""
    record = noble_gas(gas)
    terms = (Separable(0, float(p[3]), float(p[2])), Separable(1, float(p[5]), float(p[4])))
    return GasElectron(
        gas, "l-dependent", record.polarizability_au.value, CUTOFF[gas], float(p[0]), float(p[1]), terms, 0.0,
        "", "", "", record.quadrupole_polarizability_au.value, round(beta_1(gas), 3),
    )  # fmt: skip


def residuals(model: GasElectron, data: Sequence[ScatteringDatum]) -> NDArray[np.float64]:
    """(model - published)/error of every value and of the energy of every minimum."""
    value, energy = predicted(model, data)
    found = [(v - one.value) / one.error for v, one in zip(value, data, strict=True)]
    found += [
        (E - one.energy_eV) / one.energy_error_eV for E, one in zip(energy, data, strict=True) if one.energy_error_eV
    ]
    return np.array(found)


def fit(gas: str) -> GasElectron:
    """Fit one gas; exponents are varied as logarithms."""
    data = [one for one in scattering_data(gas) if one.use == "fit"]
    start = START[gas]
    local = start[0] is not None
    free = [0, 1, 2, 3, 4, 5] if local else [2, 3, 4, 5]
    base = np.array([start[0] or 0.0, *start[1:]], dtype=np.float64)

    def unpack(x: NDArray[np.float64]) -> NDArray[np.float64]:
        p = base.copy()
        p[free] = x
        p[[1, 2, 4]] = np.exp(p[[1, 2, 4]]) if local else [base[1], *np.exp(p[[2, 4]])]
        return p

    def cost(x: NDArray[np.float64]) -> NDArray[np.float64]:
        p = unpack(x)
        extra = [np.log(p[i] / centre) / spread for i, (centre, spread) in PRIOR.get(gas, {}).items()]
        return np.concatenate([residuals(potential(gas, p), data), extra])

    low = np.array([-3.0, np.log(RANGE[0]), np.log(RANGE[0]), 0.0, np.log(RANGE[0]), -1.0])
    high = np.array([3.0, np.log(RANGE[1]), np.log(RANGE[1]), STRONGEST, np.log(RANGE[1]), STRONGEST])
    x0 = base.copy()
    x0[[1, 2, 4]] = np.log(x0[[1, 2, 4]])
    scale = np.array([0.2, 0.2, 0.2, 0.5, 0.2, 0.5])
    found = least_squares(
        cost, x0[free], x_scale=scale[free], bounds=(low[free], high[free]), loss="soft_l1", max_nfev=80, xtol=1e-7
    )
    model = potential(gas, np.round(unpack(found.x), 4))
    assert not any(bound_states(model, l) for l in range(4)), f"{gas}: the fit binds an electron"
    left = residuals(model, data)
    report(gas, model, data)
    size = f"rms {np.sqrt(np.mean(left**2)):.2f}, largest {np.max(abs(left)):.1f}"
    words = f"{len(data)} published numbers FROM MEMORY: {size} of their errors"
    source = "least squares to published s, p, d phase shifts, scattering length and cross sections (phase_shifts.csv)"
    return replace(
        model,
        scattering_length_bohr=round(scattering_length(model), 4),
        source=source,
        mark="COMPUTED",
        residuals=words,
    )


def report(gas: str, model: GasElectron, data: Sequence[ScatteringDatum]) -> None:
    """Print what the fit leaves, row by row."""
    everything = [*data, *(one for one in scattering_data(gas) if one.use == "check")]
    for one, v, E in zip(everything, *predicted(model, everything), strict=True):
        where = f"{E:6.3f} eV ({one.energy_eV:g})"
        print(f"{gas} {one.use:5s} {one.quantity:26s} {where:18s} {one.value:8.4f} +- {one.error:.4f}  model {v:8.4f}")


def given(gas: str, model: str) -> GasElectron:
    """One gas of a given set."""
    record = noble_gas(gas)
    a = record.electron_scattering_length_bohr.value
    start = GasElectron(
        gas, model, record.polarizability_au.value, 0.0, 0.0, 1.0, (), a, GIVEN_SOURCE[model], "COMPUTED",
        "scattering length met; phase shifts not fitted",
    )  # fmt: skip
    if gas == "He":
        gamma, cutoff = GIVEN_HELIUM[model]
        start = replace(start, cutoff=cutoff)
        strength = brentq(lambda S: scattering_length(_with_s(start, S, gamma)) - a, 0.25, 1.0, xtol=1e-12)
        return _with_s(start, round(float(strength), 8), gamma)
    beta, cutoff = GIVEN[model][gas]
    start = replace(start, cutoff=cutoff, beta=beta)
    return replace(start, local_strength=round(repulsion_for(start, a), 8))


def _with_s(model: GasElectron, strength: float, gamma: float) -> GasElectron:
    return replace(model, separable=(Separable(0, float(strength), gamma),))


def toml(model: GasElectron) -> str:
    """One table."""
    terms = ", ".join(f"{{ l = {t.l}, strength = {t.strength:.9g}, gamma = {t.gamma:.9g} }}" for t in model.separable)
    numbers = ("cutoff", "local_strength", "beta", "scattering_length_bohr", "alpha_q", "beta_1")
    lines = [f"[{model.model}.{model.symbol}]", *(f"{key} = {float(getattr(model, key)):.9g}" for key in numbers)]
    words = ("source", "mark", "residuals")
    return "\n".join([*lines, f"separable = [{terms}]", *(f'{key} = "{getattr(model, key)}"' for key in words)]) + "\n"


def main(output: Path) -> None:
    """Fit, write, report."""
    tables = [fit(gas) for gas in GASES] + [given(gas, model) for model in GIVEN for gas in GASES]
    header = "# Made by notes/scripts/fit_electron_gas.py (notes/electron-gas.md). Atomic units. Do not edit by hand.\n"
    output.write_text("\n".join([header, *map(toml, tables)]), encoding="utf-8")


if __name__ == "__main__":
    main(Path(sys.argv[1]) if len(sys.argv) > 1 else OUTPUT)
