"""The interaction of the valence electron with a noble-gas atom; inside: atomic units.

Local part, polarisation damped by one cut-off and a Gaussian repulsion; separable s and p (and d) terms on top.
Parameters with their sources: ``pertcalc/data/one_electron/electron_gas.toml``, made by
notes/scripts/fit_electron_gas.py; notes/electron-gas.md has the equations and what the fit leaves.
"""

from __future__ import annotations

import math
import tomllib
from dataclasses import dataclass, replace
from functools import cache
from importlib.resources import files
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from pertcalc.errors import DataFileError, InputError, UnknownNameError
from pertcalc.one_electron.scattering import Separable, bound_states, scattering_length
from pertcalc.species import FROM_MEMORY, noble_gas, noble_gas_symbol

Array = NDArray[np.float64]

DEFAULT_MODEL = "soft"
MODELS = ("calibrated", "soft")
NEGLIGIBLE = 36.0  # exponent where a term is left out: exp(-36) = 2e-16


@dataclass(frozen=True, slots=True)
class GasElectron:
    """Electron-gas potential ``W(u) + separable terms``, W = local_strength exp(-beta u^2) - alpha_d damping(u)/(2 u^4).

    ``symbol``, ``model`` names; ``alpha_d`` [bohr^3]; ``cutoff`` d [bohr]; ``local_strength`` [hartree]; ``beta``
    [bohr^-2]; ``separable`` terms; ``scattering_length_bohr`` [bohr]; ``source``, ``mark`` where the parameters come
    from; ``residuals`` what the fit leaves, in words.
    """

    symbol: str
    model: str
    alpha_d: float
    cutoff: float
    local_strength: float
    beta: float
    separable: tuple[Separable, ...]
    scattering_length_bohr: float
    source: str
    mark: str
    residuals: str

    @property
    def reach(self) -> float:
        """Radius [bohr] beyond which nothing but -alpha_d/(2u^4) is left."""
        ranges = [math.sqrt(NEGLIGIBLE / self.beta) if self.local_strength else 0.0]
        ranges += [math.sqrt(NEGLIGIBLE / term.gamma) + 1.0 for term in self.separable]
        return max(2.0, self.cutoff * NEGLIGIBLE ** (1 / 6), *ranges)

    def damping(self, u: ArrayLike) -> Array:
        """Factor [1] of the polarisation energy, ``1 - exp(-(u/d)^6)``, shape of u [bohr]; its root damps one field."""
        return np.asarray(-np.expm1(-((np.asarray(u, dtype=np.float64) / self.cutoff) ** 6)))

    def local(self, u: ArrayLike) -> Array:
        """W(u) [hartree], shape of u [bohr]; finite at u = 0."""
        u = np.maximum(np.asarray(u, dtype=np.float64), 1e-3 * self.cutoff)
        return np.asarray(
            self.local_strength * np.exp(-self.beta * u * u) - 0.5 * self.alpha_d * self.damping(u) / u**4
        )

    def cross(self, r: ArrayLike, R: ArrayLike, cos_theta: ArrayLike) -> Array:
        """Energy of the gas polarised by core and electron together, beyond the sum of the two alone.

        ``+ alpha_d cos(chi)/(R^2 u^2) sqrt(damping(u) damping(R))``, chi the angle at the gas between core and
        electron: each field is damped by the root of what damps its energy, so that
        -alpha_d/2 |E_core + E_electron|^2 is the sum of core, electron and cross term.

        Parameters
        ----------
        r, R, cos_theta : array_like, shapes that broadcast
            Electron and gas distance from the core [bohr], cosine of the angle between them at the core [1].

        Returns
        -------
        ndarray
            Energy [hartree].
        """
        r, R, x = (np.asarray(one, dtype=np.float64) for one in (r, R, cos_theta))
        u = np.maximum(np.sqrt(np.maximum(r * r + R * R - 2.0 * r * R * x, 0.0)), 1e-3 * self.cutoff)
        fields = np.sqrt(self.damping(u) * self.damping(R)) / (u * R) ** 2
        return np.asarray(self.alpha_d * (R - r * x) / u * fields)


def gas_electron(symbol: str, model: str = DEFAULT_MODEL) -> GasElectron:
    """Return the electron-gas potential of a noble gas.

    ``model``: "l-dependent" (s and p phase shifts, the default), "calibrated" (tuned to the wells of Na with the gas),
    "soft" (softer repulsion, closer to the blue satellites of the caesium D2 line). Raises UnknownNameError.
    """
    gas = noble_gas_symbol(symbol).removeprefix("3")
    if model not in MODELS:
        raise UnknownNameError("electron-gas model", str(model), MODELS)
    return _load(gas, model)


@cache
def _load(gas: str, model: str) -> GasElectron:
    path = files("pertcalc") / "data" / "one_electron" / "electron_gas.toml"
    try:
        raw: dict[str, Any] = tomllib.loads(path.read_text(encoding="utf-8"))[model][gas]
        terms = tuple(Separable(**one) for one in raw.pop("separable", []))
        return GasElectron(
            symbol=gas, model=model, alpha_d=noble_gas(gas).polarizability_au.value, separable=terms, **raw
        )
    except (OSError, ValueError, KeyError, TypeError) as problem:
        raise DataFileError(path, f"[{model}.{gas}]: {problem!r}; reinstall pertcalc") from problem


def custom_gas_electron(
    scattering_length_bohr: float, alpha_d: float, cutoff: float, beta: float, symbol: str = "user"
) -> GasElectron:
    """Electron-gas potential of your own gas: a Gaussian repulsion over polarisation, fixed by its scattering length.

    The strength A of ``A exp(-beta u^2) - alpha_d damping(u)/(2u^4)`` is the weakest repulsion that gives the
    scattering length without a bound state.

    Parameters
    ----------
    scattering_length_bohr : float
        s-wave scattering length of the electron [bohr].
    alpha_d : float
        Dipole polarisability [bohr^3]; >= 0.
    cutoff : float
        Cut-off radius d of the polarisation [bohr]; > 0.
    beta : float
        Gaussian exponent of the repulsion [bohr^-2]; > 0.
    symbol : str
        Label of the gas.

    Returns
    -------
    GasElectron
        model "custom", mark FROM MEMORY (what the user says); its scattering length is the wanted one to 1e-8.

    Raises
    ------
    InputError
        Every bad number at once; or no repulsion of this range gives this scattering length without a bound state.
    """
    wanted = {"scattering_length_bohr": scattering_length_bohr, "alpha_d": alpha_d, "cutoff": cutoff, "beta": beta}
    problems = [f"{key} = {value!r} must be a finite number." for key, value in wanted.items() if not _number(value)]
    if not problems:
        if alpha_d < 0:
            problems.append(f"alpha_d = {alpha_d:g} bohr^3 must be >= 0. Give the dipole polarisability.")
        problems += [f"{key} = {wanted[key]:g} must be > 0." for key in ("cutoff", "beta") if wanted[key] <= 0]
    if problems:
        raise InputError(problems)
    start = GasElectron(
        symbol, "custom", float(alpha_d), float(cutoff), 0.0, float(beta), (), float(scattering_length_bohr),
        "parameters given by the user", FROM_MEMORY, "scattering length met; no phase shift compared",
    )  # fmt: skip
    return replace(start, local_strength=repulsion_for(start, float(scattering_length_bohr)))


def repulsion_for(gas: GasElectron, wanted: float, strongest: float = 1e3) -> float:
    """Strength [hartree] of the Gaussian repulsion of ``gas`` that gives a scattering length [bohr] without bound states.

    Along the branch without bound state the length falls monotonically from that of ``strongest`` [hartree] to
    -infinity, where the first bound state appears. Raises InputError for a length above the branch.
    """
    from scipy.optimize import brentq

    def at(strength: float) -> GasElectron:
        return replace(gas, local_strength=strength)

    top = scattering_length(at(strongest))
    if wanted >= top:
        raise InputError(
            f"scattering_length_bohr = {wanted:g} bohr: with alpha_d = {gas.alpha_d:g} bohr^3, cutoff = {gas.cutoff:g} "
            f"bohr and beta = {gas.beta:g} bohr^-2 a potential without bound state stays below {top:.3g} bohr; noble "
            "gases bind no electron. Check the sign, or give a smaller beta."
        )
    low = -strongest  # attractive enough to bind
    high = strongest
    while high - low > 1e-9 * max(1.0, abs(high)):  # the weakest strength without a bound state
        middle = 0.5 * (low + high)
        low, high = (middle, high) if bound_states(at(middle), 0) else (low, middle)
    return float(brentq(lambda strength: scattering_length(at(strength)) - wanted, high, strongest, xtol=1e-13))


def _number(value: object) -> bool:
    return isinstance(value, (int, float)) and not isinstance(value, bool) and math.isfinite(value)
