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

DEFAULT_MODEL = "l-dependent"
MODELS = (DEFAULT_MODEL, "calibrated", "soft")
NEGLIGIBLE = 36.0  # exponent where a term is left out: exp(-36) = 2e-16


@dataclass(frozen=True, slots=True)
class GasElectron:
    """Electron-gas potential: local W(u) plus separable terms, and the gas polarised by electron and core together.

    ``W = B exp(-beta u^2) - alpha_d D(u)/(2u^4) - (alpha_q - 6 beta_1) D(u)^2/(2u^6)``, D = ``damping``.
    ``symbol``, ``model`` names; ``alpha_d`` [bohr^3], ``alpha_q`` [bohr^5] dipole and quadrupole polarisability,
    ``beta_1`` [bohr^5] how much the dipole lags behind a moving electron; ``cutoff`` d [bohr]; ``local_strength`` B
    [hartree]; ``beta`` [bohr^-2]; ``separable`` terms; ``scattering_length_bohr`` [bohr] as fitted; ``source``,
    ``mark`` where the parameters come from; ``residuals`` what the fit leaves, in words.
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
    alpha_q: float = 0.0
    beta_1: float = 0.0

    @property
    def tail_q(self) -> float:
        """Coefficient alpha_q - 6 beta_1 [bohr^5] of the -1/(2u^6) tail."""
        return self.alpha_q - 6.0 * self.beta_1

    @property
    def reach(self) -> float:
        """Radius [bohr] beyond which only the bare tail is left; a multiple of 2, so that tail waves are reused."""
        ranges = [math.sqrt(NEGLIGIBLE / self.beta)] if self.local_strength else []
        ranges += [math.sqrt(NEGLIGIBLE / term.gamma) + 1.0 for term in self.separable]
        return 2.0 * math.ceil(0.5 * max(2.0, self.cutoff * NEGLIGIBLE ** (1 / 6), *ranges))

    def damping(self, u: ArrayLike) -> Array:
        """D(u) = ``1 - exp(-(u/d)^6)`` [1], shape of u [bohr]: damps the square of a field, its gradient once."""
        return np.asarray(-np.expm1(-((np.asarray(u, dtype=np.float64) / self.cutoff) ** 6)))

    def polarisation(self, u: ArrayLike, tail_q: float) -> Array:
        """Energy [hartree] of the gas at u [bohr] from one unit charge, ``-alpha_d D/(2u^4) - tail_q D^2/(2u^6)``.

        ``tail_q`` [bohr^5]: ``self.tail_q`` for the electron, alpha_q for the core, which does not move.
        """
        u = np.maximum(np.asarray(u, dtype=np.float64), 1e-3 * self.cutoff)
        D = self.damping(u)
        return np.asarray(-0.5 * self.alpha_d * D / u**4 - 0.5 * tail_q * (D / u**3) ** 2)

    def local(self, u: ArrayLike) -> Array:
        """W(u) [hartree], shape of u [bohr]; finite at u = 0."""
        u = np.asarray(u, dtype=np.float64)
        return np.asarray(self.local_strength * np.exp(-self.beta * u * u) + self.polarisation(u, self.tail_q))

    def cross(self, r: ArrayLike, R: ArrayLike, cos_theta: ArrayLike) -> Array:
        """Energy of the gas polarised by core and electron together, beyond the sum of the two alone.

        ``alpha_d cos(chi) sqrt(D(u) D(R))/(R^2 u^2) + alpha_q P2(cos chi) D(u) D(R)/(R^3 u^3)``, chi the angle at the
        gas between core and electron: the mixed terms of -alpha_d |E|^2/2 and of its quadrupole analogue, every field
        damped as in the pure terms.

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
        chi = (R - r * x) / u
        damped = self.damping(u) * self.damping(R)
        dipole = self.alpha_d * chi * np.sqrt(damped) / (u * R) ** 2
        return np.asarray(dipole + self.alpha_q * (1.5 * chi * chi - 0.5) * damped / (u * R) ** 3)


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
    """Strength [hartree] of the Gaussian of ``gas`` that gives a scattering length [bohr] without a bound state.

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
