"""Quasi-bound levels behind the centrifugal barrier: energies and widths.

A quasi-bound level is a solution that is regular at the wall and purely outgoing outside. The outgoing wave starts in
the WKB region, is integrated inwards through the barrier, and meets the regular solution at the barrier's inner side;
the energy is where the real parts of the two logarithmic derivatives agree. Widths by three ways, each where it holds:
flux (outgoing flux over the probability inside the barrier), delay (Lorentzian in d(phase)/dE), WKB tunnelling.
notes/molecules.md.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from pertcalc.molecules import siegert, tunnelling
from pertcalc.molecules.levels import Ints, Levels, turning_points
from pertcalc.molecules.radial import Array, Potential, RadialProblem

# Below this width in units of the barrier height no energy grid resolves the delay: flux and WKB serve.
NARROW = 1e-7
# A flux width above this part of the energy distance to the barrier's top or to the limit is no longer first order.
BROAD = 0.05


@dataclass(frozen=True, slots=True)
class QuasiLevels:
    """Quasi-bound levels, lowest N first and v rising; arrays of shape (n,).

    ``v`` (counted in the well inside the barrier), ``N``; ``energy`` [hartree, > 0] from the limit; ``barrier``
    height [hartree] of that N; ``inner``, ``outer`` turning points of the well [bohr]; ``width`` full width at half
    maximum [hartree], the delay's where ``by_delay``, else the flux's; ``width_flux``, ``width_wkb`` [hartree], nan
    for a level in an inner well behind a second barrier; ``width_delay`` [hartree], nan where too narrow for it;
    ``model_error`` of the energies [hartree] by the curves' stated uncertainties, in first order (nan: not known),
    None where none is stated; ``numerical_error`` [hartree] the largest change of an energy by a step half as long.
    """

    v: Ints
    N: Ints
    energy: Array
    barrier: Array
    inner: Array
    outer: Array
    width_flux: Array
    width_wkb: Array
    width_delay: Array
    model_error: Array | None
    numerical_error: float

    @property
    def by_delay(self) -> NDArray[np.bool_]:
        """Where the delay gives the width: broad levels, for which flux over probability is only first order."""
        near = BROAD * np.minimum(self.energy, self.barrier - self.energy)
        return np.isfinite(self.width_delay) & (self.width_flux > near)

    @property
    def width(self) -> Array:
        """Full width [hartree] by the way that holds."""
        return np.where(self.by_delay, self.width_delay, self.width_flux)


def quasibound_levels(
    problem: RadialProblem,
    levels: Levels,
    deformed: Mapping[str, tuple[Potential, float]] | None = None,
    delays: bool = True,
) -> QuasiLevels:
    """Every quasi-bound level between the limit and the top of its centrifugal barrier.

    Parameters
    ----------
    problem : RadialProblem
    levels : Levels
        Bound levels of the same problem, all N: they fix v.
    deformed : mapping, optional
        Name -> (V(R) changed by one standard deviation, its C6); gives the model error.
    delays : bool
        Whether to compute the widths from the delay as well.

    Returns
    -------
    QuasiLevels
    """
    barriers = tunnelling.barriers(problem)
    if not barriers.N.size:
        return _none()
    changes = [changed for changed, _ in (deformed or {}).values()]
    sought = tunnelling.candidates(problem, barriers, levels, changes)
    if not sought.N.size:
        return _none()
    index = np.searchsorted(barriers.N, sought.N)
    height, top, well = barriers.height[index], barriers.r_top[index], barriers.r_well[index]
    found = siegert.solve(problem, sought.N, sought.energy, top, height, well)
    sound = found.converged & (found.energy > 0) & (found.energy < height) & (found.nodes == sought.v)
    # A level of a second, inner well may be out of reach of the outgoing wave: the spectrum with the wall has it.
    kept = np.flatnonzero(sound | (sought.sure & (sought.energy > 0)))
    # Two starts may lead to one level.
    kept = kept[np.unique(np.stack([sought.N[kept], sought.v[kept]]), axis=1, return_index=True)[1]]
    energy = np.where(sound, found.energy, sought.energy)[kept]
    N, v, sound = sought.N[kept], sought.v[kept], sound[kept]
    height, top, well = height[kept], top[kept], well[kept]
    flux = np.where(sound, found.width[kept], np.nan)
    error = float(np.max(found.error[kept], initial=0.0, where=sound))
    inner, outer = turning_points(problem, N.astype(float), energy)
    wkb = np.where(sound, tunnelling.wkb_widths(problem, N, energy, inner, outer, top), np.nan)
    model = sought.model_error[kept] if changes else None
    made = QuasiLevels(v, N, energy, height, inner, outer, flux, wkb, np.full(len(N), np.nan), model, error)
    return _with_delays(problem, made, top, well) if delays and len(N) else made


def _with_delays(problem: RadialProblem, made: QuasiLevels, top: Array, well: Array) -> QuasiLevels:
    """The same with widths from the delay where a grid of energies can see them, and its energies where they count."""
    wide = np.flatnonzero(made.width_flux > NARROW * made.barrier)
    width, peak = made.width_delay.copy(), made.energy.copy()
    peak[wide], width[wide] = siegert.delays(
        problem, made.N[wide], made.energy[wide], made.width_flux[wide], top[wide], well[wide]
    )
    made = replace(made, width_delay=width)
    return replace(made, energy=np.where(made.by_delay, peak, made.energy))


def _none() -> QuasiLevels:
    empty, none = np.zeros(0), np.zeros(0, dtype=np.int64)
    return QuasiLevels(none, none, empty, empty, empty, empty, empty, empty, empty, None, 0.0)
