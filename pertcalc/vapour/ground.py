"""What relaxes the ground level in a cell: wall, transit, gas, weakly bound pairs, other alkali atoms.

Every process has its own rate [s^-1], acting on the electron spin (randomisation rate G: the nucleus is a spectator)
or on the whole atom. `orientation_decay` puts both on one footing, the decay of the longitudinal orientation <F_z>.
notes/ground-level.md. Units: s^-1, cm^-3, cm, K.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable
from dataclasses import dataclass, replace
from functools import lru_cache

from pertcalc.errors import InputError
from pertcalc.species import COMPUTED, READ, Alkali, Isotope, Sourced
from pertcalc.vapour.cell import (
    Cell,
    alkali_speed_cm_s,
    coating_warning,
    depolarisation_per_bounce,
    transit_rate,
    wall_rate,
)
from pertcalc.vapour.ground_spin import observable_rates, slowing_down
from pertcalc.vapour.pairs import PAIRS, pair_loss
from pertcalc.vapour.process import Process, weakest_mark
from pertcalc.vapour.spin_destruction import BY_ALKALI, BY_GAS, EXCHANGE, choose

WALL, TRANSIT = "wall", "transit through the beam"


@dataclass(frozen=True, slots=True)
class GroundProcess(Process):
    """A process of the ground level; ``on_electron``: it acts on the electron spin, not on the atom as a whole."""

    on_electron: bool = False


@dataclass(frozen=True, slots=True)
class Surroundings:
    """What the atoms of one isotope are surrounded by.

    ``temperature_K`` [K]; ``cell`` None when none is given; ``wall`` "bare" | "coated"; ``gas`` symbol or None for no
    gas, with ``gas_density_cm3`` [cm^-3]; ``alkali_density_cm3`` [cm^-3]; ``diffusion_nD`` diffusion coefficient times
    gas density [cm^-1 s^-1]; ``beam_diameter_cm`` [cm]; ``equilibrium_cm3`` bound plus metastable pairs
    [pairs]/([alkali][gas]) at ``temperature_K`` [cm^3] and ``rotation`` rms N of those pairs [1], both from
    `pairs.sticking`. None means unknown.

    Raises InputError naming every value that breaks its rule, and for a beam larger than the cell.
    """

    temperature_K: float
    cell: Cell | None = None
    wall: str = "bare"
    gas: str | None = None
    gas_density_cm3: float | None = None
    alkali_density_cm3: Sourced | None = None
    diffusion_nD: Sourced | None = None
    beam_diameter_cm: float | None = None
    equilibrium_cm3: Sourced | None = None
    rotation: Sourced | None = None

    def __post_init__(self) -> None:
        depolarisation_per_bounce(self.wall)  # refuses an unknown wall
        numbers = (
            ("temperature [K]", self.temperature_K),
            ("gas density [cm^-3]", self.gas_density_cm3),
            ("alkali density [cm^-3]", self.alkali_density_cm3),
            ("diffusion nD [cm^-1 s^-1]", self.diffusion_nD),
            ("--beam-diameter [cm]", self.beam_diameter_cm),
            ("equilibrium constant [cm^3]", self.equilibrium_cm3),
            ("rms N of the pairs", self.rotation),
        )
        broken = [
            f"{name} = {float(value):g} must be finite and > 0; give another value."
            for name, value in numbers
            if value is not None and not (math.isfinite(float(value)) and float(value) > 0)
        ]
        if (self.gas is None) != (self.gas_density_cm3 is None):
            broken.append(f"gas = {self.gas!r} and gas density = {self.gas_density_cm3!r}: give both or neither.")
        beam = self.beam_diameter_cm
        if self.cell is not None and beam is not None and beam > self.cell.opening_cm:
            broken.append(
                f"--beam-diameter = {beam:g} cm is larger than the cell ({self.cell.words}): "
                f"give at most {self.cell.opening_cm:g} cm, or a larger --cell."
            )
        if broken:
            raise InputError(broken)


def ground_processes(alkali: Alkali, isotope: Isotope, around: Surroundings) -> tuple[GroundProcess, ...]:
    """Every process of the ground level that the surroundings allow, each with its rate or the reason for none.

    "wall" always; "transit through the beam" for a beam smaller than the cell; "spin destruction by gas" and "weakly
    bound pairs" with a gas; "alkali-alkali spin destruction" and "spin exchange" always.

    Parameters
    ----------
    alkali : Alkali
    isotope : Isotope
        Its nuclear spin and hyperfine splitting enter the weakly bound pairs; speeds are of the natural mean mass.
    around : Surroundings

    Returns
    -------
    tuple of GroundProcess
        Rates [s^-1] as the process acts; see `orientation_decay`.
    """
    found = [_wall(alkali, around)]
    beam, cell = around.beam_diameter_cm, around.cell
    if beam is not None and (cell is None or beam < cell.opening_cm):
        found.append(_transit(alkali, beam, around))
    if around.gas is not None and around.gas_density_cm3 is not None:
        density = Sourced(around.gas_density_cm3, "cm^-3", "the fill", READ, 0.0)
        found.append(_binary(BY_GAS, alkali, around.gas, density, around))
        found.append(_weakly_bound(alkali, isotope, around))
    found += [_binary(k, alkali, alkali.symbol, around.alkali_density_cm3, around) for k in (BY_ALKALI, EXCHANGE)]
    return tuple(found)


def observable(rate: float, nuclear_spin: float, fast_exchange: bool) -> float:
    """Decay rate of <F_z> [s^-1] under electron randomisation at ``rate`` G [s^-1] with nuclear spin I [hbar].

    Without fast spin exchange the slow eigenrate, ``2 G/(2I+1)^2`` for I >= 1; with it a spin temperature of low
    polarisation, ``G/q, q = [4I(I+1)+3]/3``. InputError for an impossible spin or a negative rate.
    """
    if not (math.isfinite(rate) and rate >= 0):
        raise InputError(f"rate = {rate!r} s^-1 must be finite and >= 0; give another rate.")
    return rate * _slowing(nuclear_spin, fast_exchange)


def exchange_is_fast(processes: Iterable[Process], light_damping: float = 0.0) -> bool:
    """Whether the spin-exchange rate is known and exceeds every other known rate: then a spin temperature holds.

    Parameters: ``light_damping`` rate at which absorption of pumping light damps the electron spin [s^-1]; 0 in the
    dark.
    """
    rates = {p.name: p.rate.value for p in processes if p.rate is not None}
    exchange = rates.pop(EXCHANGE, None)
    return exchange is not None and all(exchange > other for other in (*rates.values(), light_damping))


def orientation_decay(
    processes: Iterable[GroundProcess], nuclear_spin: float, light_damping: float = 0.0
) -> tuple[GroundProcess, ...]:
    """The processes with their rates turned into decay rates of the longitudinal orientation <F_z> [s^-1].

    Those on the electron by `observable`, in the form that `exchange_is_fast` decides; those on the whole atom as they
    are; spin exchange conserves <F_z> and keeps its own rate (``destroys`` False).

    Parameters: ``nuclear_spin`` I [hbar]; ``light_damping`` as `exchange_is_fast` [s^-1]. Notes say what was done;
    errors scale along.
    """
    processes = tuple(processes)
    fast = exchange_is_fast(processes, light_damping)
    factor = _slowing(nuclear_spin, fast)
    word = "1/q of a spin temperature, spin exchange is fastest" if fast else "slow eigenrate, spin exchange is slow"
    turned = []
    for p in processes:
        if p.on_electron and p.destroys and p.rate is not None:
            rate = replace(
                p.rate,
                value=p.rate.value * factor,
                error=None if p.rate.error is None else p.rate.error * factor,
                mark=weakest_mark((p.rate.mark, COMPUTED)),
            )
            p = replace(p, rate=rate, note=f"{p.note}; decay of <F_z>: G x {factor:.4g}, {word}")
        turned.append(p)
    return tuple(turned)


@lru_cache(maxsize=64)
def _slowing(nuclear_spin: float, fast_exchange: bool) -> float:
    """Decay rate of <F_z> per unit electron-randomisation rate [1]."""
    return float(1 / slowing_down(nuclear_spin)) if fast_exchange else observable_rates(nuclear_spin, 1.0)[1]


def _diffusion(around: Surroundings) -> tuple[float | None, float | None, list[str], str]:
    """D [cm^2/s] (None: free flight), its error, marks, source."""
    if around.gas_density_cm3 is None or around.diffusion_nD is None:
        return None, 0.0, [], "free flight, no gas"
    nD, n = around.diffusion_nD, around.gas_density_cm3
    error = None if nD.error is None else nD.error / n
    return nD.value / n, error, [nD.mark], f"D = {nD.value / n:.3g} cm^2/s ({nD.source})"


def _sourced(rate: Callable[..., float], around: Surroundings, eps: Sourced, what: str) -> Sourced:
    """rate(D, eps, corrected) with the errors of D and eps and of the condition at the wall, in quadrature [s^-1]."""
    D, dD, marks, origin = _diffusion(around)
    value = rate(D, eps.value, False)
    # The truth lies between the plain condition and the corrected one, anywhere: rms distance from the plain end.
    parts = [(rate(D, eps.value, True) - value) / math.sqrt(3)]
    if D is not None and dD:
        parts.append(rate(D + dD, eps.value, False) - value)
    if eps.error:
        parts.append(rate(D, min(1.0, eps.value + eps.error), False) - value)
    error = None if dD is None else math.hypot(*parts)
    return Sourced(value, "s^-1", f"{what}; {origin}", weakest_mark([COMPUTED, eps.mark, *marks]), error)


def _unknown_diffusion(alkali: Alkali, around: Surroundings) -> str | None:
    if around.gas is None or around.diffusion_nD is not None:
        return None
    return f"the diffusion coefficient of {alkali.symbol} in {around.gas} is not known"


def _wall(alkali: Alkali, around: Surroundings) -> GroundProcess:
    cell = around.cell
    if cell is None:
        return GroundProcess(WALL, None, "no cell is given: add --cell 'sphere 25 mm'")
    if reason := _unknown_diffusion(alkali, around):
        return GroundProcess(WALL, None, reason)
    speed = alkali_speed_cm_s(alkali.mass_u.value, around.temperature_K)
    eps = depolarisation_per_bounce(around.wall)

    def rate(D: float | None, eps: float, corrected: bool = False) -> float:
        return wall_rate(cell, D, speed, eps, corrected)

    what = f"slowest mode with a wall of eps = {eps.value:.2g} per bounce ({eps.source})"
    found = _sourced(rate, around, eps, what)
    share = found.value / rate(None, eps.value)
    regime = "bounces" if share > 0.5 else "diffusion to the wall"
    note = f"on the whole atom; {cell.words}, {around.wall} wall; set by {regime} ({share:.2g} of free flight)"
    if warning := coating_warning(around.wall, around.temperature_K):
        note += f". {warning}"
    return GroundProcess(WALL, found, note=note)


def _transit(alkali: Alkali, beam: float, around: Surroundings) -> GroundProcess:
    if reason := _unknown_diffusion(alkali, around):
        return GroundProcess(TRANSIT, None, reason)
    speed = alkali_speed_cm_s(alkali.mass_u.value, around.temperature_K)

    def rate(D: float | None, eps: float, corrected: bool = False) -> float:
        return transit_rate(beam, D, speed, corrected)

    edge = Sourced(1.0, "1", "atoms that leave are lost", COMPUTED, 0.0)
    found = _sourced(rate, around, edge, f"slowest mode of an infinite cylinder of {beam:g} cm")
    note = "on the whole atom; atoms that leave the beam count as replaced by unpolarised ones: an upper limit where "
    note += "they come back polarised (coated walls, diffusion back into the beam)"
    return GroundProcess(TRANSIT, found, note=note)


def _binary(kind: str, alkali: Alkali, partner: str, density: Sourced | None, around: Surroundings) -> GroundProcess:
    """Rate n k of binary collisions; on the electron spin."""
    chosen, destroys = choose(alkali.symbol, partner, kind, around.temperature_K), kind != EXCHANGE
    if chosen.rate is None:
        return GroundProcess(kind, None, chosen.reason, destroys, on_electron=True)
    if density is None:
        return GroundProcess(
            kind, None, f"the density of {alkali.symbol} vapour is not known", destroys, on_electron=True
        )
    k = chosen.rate
    error = None
    if k.error is not None and density.error is not None:
        error = math.hypot(k.error * density.value, k.value * density.error)
    note = f"on the electron spin: rate n k, k = {k.value:.3g} cm^3/s; {chosen.note}"
    if not destroys:
        note = f"conserves the spin, destroys none; rate n k, k = {k.value:.3g} cm^3/s; {chosen.note}"
    elif error is not None and error >= k.value * density.value:
        note += "; the error is as large as the rate: only its order of magnitude is known"
    mark = weakest_mark((k.mark, density.mark))
    return GroundProcess(
        kind, Sourced(density.value * k.value, "s^-1", k.source, mark, error), None, destroys, note, True
    )


def _weakly_bound(alkali: Alkali, isotope: Isotope, around: Surroundings) -> GroundProcess:
    assert around.gas is not None and around.gas_density_cm3 is not None  # the caller looked
    loss = pair_loss(
        alkali.symbol,
        around.gas,
        isotope,
        around.gas_density_cm3,
        around.temperature_K,
        around.equilibrium_cm3,
        around.rotation,
    )
    return GroundProcess(PAIRS, loss.rate, loss.reason, True, loss.note, loss.on_electron)
