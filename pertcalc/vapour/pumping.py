"""Optical pumping by one beam: absorption rate, light shift, saturation, and what circular light does to the spin.

The beam is uniform over its cross section and taken where it enters the vapour. Rate and shifts are means over the
sublevels of the unpolarised ground level. The spin equation ``dS/dt = R (gain s/2 - damping S)`` holds for light that
does not resolve the ground level's hyperfine structure. Equations, limits and sources: notes/absorption-and-pumping.md.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass, replace

from scipy import constants as codata
from scipy.special import voigt_profile

from pertcalc.errors import InputError, UnknownNameError
from pertcalc.species import COMPUTED, UPPER_LEVEL, Sourced
from pertcalc.vapour.absorption import CLEAR, CM1_GHZ, GAUSS_FWHM, AbsorptionLine, Array, absorption_line
from pertcalc.vapour.fill import larmor_rad_s
from pertcalc.vapour.level_rates import J_OF, OTHER_LEVEL, LevelRates

# Excitation faster than this part of the decay saturates the line.
SATURATION_LIMIT = 0.1
# The wing of the impact profile is doubtful beyond the first, meaningless beyond the second [GHz] (common practice,
# no source).
WING_GHZ, FARTHEST_GHZ = 100.0, 1000.0
LARGEST_BEAM_CM = 100.0
# Share of the other D line in the absorption above which it is worth a warning.
_OTHER_LINE = 0.01
# Surviving orientation of the excited level below and above which pumping is called by one name.
_DEPOPULATION, _REPOPULATION = 0.1, 0.9
# Orientation returned by emission, S per <J_z> of the excited level: Clebsch-Gordan branching.
_RETURNED = {"P1/2": -1.0 / 3.0, "P3/2": 1.0 / 3.0}
# Atoms faster than this many standard deviations do not count as being in resonance.
_FASTEST = 2.0
_OTHER_LINE_OF = {"D1": "D2", "D2": "D1"}
# Vector light shift over the scalar one, coefficient of s.S, hyperfine structure unresolved.
_VECTOR = {"D1": -2.0, "D2": 1.0}


@dataclass(frozen=True, slots=True)
class Beam:
    """One pumping beam.

    Parameters
    ----------
    power_W : float
        Power that enters the vapour [W]; > 0.
    diameter_cm : float
        Diameter of the uniform beam [cm]; > 0, at most 100.
    detuning_GHz : float or None
        From the centre of gravity of the line without collisions [GHz]; None means the peak of the absorption.
    linewidth_GHz : float
        Full width of the (Gaussian) light spectrum [GHz]; 0 for narrow light.
    photon_spin : float
        Mean photon spin s along the beam [hbar]; +1 or -1 circular, 0 unpolarised (or linear, for S alone).

    Raises
    ------
    InputError
        Lists every value that is not finite or breaks its rule.
    """

    power_W: float
    diameter_cm: float
    detuning_GHz: float | None = None
    linewidth_GHz: float = 0.0
    photon_spin: float = 1.0

    def __post_init__(self) -> None:
        diameter_rule = f"> 0 and at most {LARGEST_BEAM_CM:g} cm (the unit is cm)"
        rules = [
            ("power", self.power_W, "W", self.power_W > 0, "> 0"),
            ("beam diameter", self.diameter_cm, "cm", 0 < self.diameter_cm <= LARGEST_BEAM_CM, diameter_rule),
            ("laser linewidth", self.linewidth_GHz, "GHz", self.linewidth_GHz >= 0, ">= 0 (0 means narrow)"),
            ("photon spin", self.photon_spin, "hbar", abs(self.photon_spin) <= 1, "from -1 to 1"),
        ]
        if self.detuning_GHz is not None:
            near = abs(self.detuning_GHz) <= FARTHEST_GHZ
            rules.append(("detuning", self.detuning_GHz, "GHz", near, f"within {FARTHEST_GHZ:g} GHz of the line"))
        broken = [
            f"{name} = {value:g} {unit} must be finite and {rule}; give another value."
            for name, value, unit, obeyed, rule in rules
            if not (math.isfinite(value) and obeyed)
        ]
        if broken:
            raise InputError(broken)

    def flux_cm2_s(self, wavelength_cm: float) -> float:
        """Photon flux ``P lambda/(h c A)`` [cm^-2 s^-1], ``A = pi d^2/4``, at a vacuum wavelength [cm]."""
        photon_J = codata.h * codata.c * 100 / wavelength_cm
        return self.power_W / (photon_J * math.pi * self.diameter_cm**2 / 4)


@dataclass(frozen=True, slots=True)
class SpinPumping:
    """Orientation of the electron spin by the beam, nuclear spin a reservoir of ``slowing_down`` q.

    ``q dS/dt = gain s/2 - damping S``: ``gain``, ``damping`` [s^-1]; ``limit`` S without any relaxation [hbar];
    ``surviving`` part of the excited level's orientation that emission returns, free atom 1 [1]; ``kind`` of pumping;
    ``photons_per_atom`` mean number absorbed from unpolarised to fully polarised [1], None where absorption never stops
    (``reason``); ``time_s`` 1/e time of polarisation without relaxation [s], inf if the beam does nothing.
    """

    photon_spin: float
    surviving: float
    kind: str
    gain: float
    damping: float
    limit: float
    slowing_down: float
    photons_per_atom: Sourced | None
    reason: str | None
    time_s: float


@dataclass(frozen=True, slots=True)
class Pumping:
    """What one beam does to the ground level of one vapour.

    ``flux_cm2_s`` [photons cm^-2 s^-1]; ``detuning_GHz`` [GHz]; ``cross_section_cm2`` averaged over the spectrum of the
    light [cm^2]; ``rate`` absorption per atom R [s^-1]; ``light_shift`` scalar, mean over the ground level [rad/s], > 0
    for light on the blue side; ``light_shift_field_G`` field of the vector shift along the beam [G], None with
    ``field_reason``; ``saturation`` excitation and stimulated emission of the atoms in resonance over the decay [1];
    ``excited_fraction`` of all atoms in the steady state [1]; ``spin``; ``warnings``.
    """

    alkali: str
    line: str
    sample: str
    flux_cm2_s: float
    detuning_GHz: float
    cross_section_cm2: float
    rate: Sourced
    light_shift: Sourced
    light_shift_field_G: Sourced | None
    field_reason: str | None
    saturation: float
    excited_fraction: float
    spin: SpinPumping
    warnings: tuple[str, ...]


def pumping(
    line: AbsorptionLine,
    beam: Beam,
    rates: LevelRates | None = None,
    quench_rate_s: float = 0.0,
    slowing_down: float = 1.0,
    loss_error: float | None = None,
) -> Pumping:
    """Pumping rate, light shift, saturation and spin equation of one beam in one vapour.

    ``R = Phi sigma``; light shift ``Phi sigma_disp/2``; both with sigma averaged over the light's spectrum.

    Parameters
    ----------
    line : AbsorptionLine
        With the collisional width and shift at the gas density and their errors.
    beam : Beam
    rates : LevelRates or None
        Decay and collisional relaxation of the P levels at the gas density [s^-1]; None without gas.
    quench_rate_s : float
        Quenching rate of the P levels [s^-1]; >= 0.
    slowing_down : float
        q = <F_z>/<S_z> of the nuclear spin [1]; >= 1; 1 leaves it out, 2I+1 is exact for full polarisation.
    loss_error : float or None
        Relative error of the excited level's loss of orientation [1]; None = not estimated.

    Returns
    -------
    Pumping

    Raises
    ------
    InputError
        A value breaks its rule, or the detuning is nearer to the other D line.
    """
    _check(line, beam, quench_rate_s, slowing_down)
    at = line.peak(beam.linewidth_GHz)[0] if beam.detuning_GHz is None else beam.detuning_GHz
    flux = beam.flux_cm2_s(line.wavelength_cm)
    rate = _sourced(line, lambda one: flux * one.cross_section(at, beam.linewidth_GHz), "s^-1", "flux times sigma")
    shift = _sourced(
        line, lambda one: 0.5 * flux * one.dispersion(at, beam.linewidth_GHz), "rad/s", "flux times sigma_disp / 2"
    )
    # Absorption plus stimulated emission, per absorption: 1 + g/g'.
    both_ways = 1 + 2 / (2 * J_OF[UPPER_LEVEL[line.line]] + 1)
    decay = line.alkali.decay_rate(UPPER_LEVEL[line.line]) + quench_rate_s
    saturation = flux * _resonant_cross_section(line, beam, at) * both_ways / decay
    surviving = surviving_orientation(line.line, rates, quench_rate_s)
    return Pumping(
        line.alkali.symbol,
        line.line,
        line.sample,
        flux,
        at,
        rate.value / flux,
        rate,
        shift,
        *_vector_field(line, beam, at, shift),
        saturation,
        rate.value / (both_ways * rate.value + decay),
        _spin_pumping(line.line, beam.photon_spin, rate.value, surviving, slowing_down, loss_error),
        _warnings(line, beam, at, saturation),
    )


def surviving_orientation(line: str, rates: LevelRates | None, quench_rate_s: float = 0.0) -> float:
    """Orientation that emission returns to the ground level, per orientation excited, over its value for a free atom.

    ``a = sum_J k_J Gamma_J <J_z>_J / (k <J_z>)``, k = -1/3 (P1/2), +1/3 (P3/2), <J_z> of both P levels in the steady
    state with losses, exchange and quenching (quenched atoms return without orientation). One level: Gamma/(Gamma +
    loss_1 + Q). Nuclear spin is left out.

    Parameters
    ----------
    line : str
        "D1" or "D2": the level excited.
    rates : LevelRates or None
        [s^-1]; None without gas.
    quench_rate_s : float
        [s^-1].

    Returns
    -------
    a : float
        [1]; 1 without collisions, 0 when they mix the level fast; negative if most light comes from the other level.

    Raises
    ------
    UnknownNameError
        The line is neither D1 nor D2.
    """
    if line not in UPPER_LEVEL:
        raise UnknownNameError("line", str(line), tuple(UPPER_LEVEL))
    if rates is None:
        return 1.0
    own, other = UPPER_LEVEL[line], OTHER_LEVEL[UPPER_LEVEL[line]]
    pull = {level: rates.decay[level] + rates.loss[level][1] + quench_rate_s for level in (own, other)}
    here = 1 / (pull[own] - rates.gain[own][1] * rates.gain[other][1] / pull[other])
    there = rates.gain[own][1] * here / pull[other]
    # Orthonormal rank 1 -> <J_z>: sqrt(J(J+1)(2J+1)/3).
    length = {level: math.sqrt(J * (J + 1) * (2 * J + 1) / 3) for level, J in J_OF.items()}
    emitted = {own: rates.decay[own] * here, other: rates.decay[other] * there * length[other] / length[own]}
    return emitted[own] + emitted[other] * _RETURNED[other] / _RETURNED[own]


def pumping_kind(surviving: float) -> str:
    """Name of the pumping by the surviving orientation [1]: "depopulation" below 0.1, "repopulation" above 0.9."""
    if abs(surviving) < _DEPOPULATION:
        return "depopulation"
    return "repopulation" if surviving > _REPOPULATION else "mixed"


def spin_coefficients(line: str, surviving: float) -> tuple[float, float]:
    """Gain and damping of ``dS/dt = R (gain s/2 - damping S)`` per absorption rate R of the unpolarised atom.

    D1: 1 - a/3, 1 - a/3. D2: -1/2 + 5a/6, 1 - 2a/3.

    Parameters: ``line``; ``surviving`` a [1] of :func:`surviving_orientation`. Returns (gain, damping) [1].
    UnknownNameError for another line. Source: Happer, Rev. Mod. Phys. 44, 169 (1972), depopulation and repopulation
    pumping, FROM MEMORY; derived in the note and from the sublevel rates in the tests.
    """
    if line not in UPPER_LEVEL:
        raise UnknownNameError("line", str(line), tuple(UPPER_LEVEL))
    a = surviving
    return (1 - a / 3, 1 - a / 3) if line == "D1" else (-0.5 + 5 * a / 6, 1 - 2 * a / 3)


def _spin_pumping(line: str, s: float, rate: float, a: float, q: float, loss_error: float | None) -> SpinPumping:
    gain, damping = spin_coefficients(line, a)
    kind = pumping_kind(a)
    photons, reason = None, None
    if line == "D2":
        reason = "D2 has no dark sublevel: absorption never stops"
    elif abs(s) < 1:
        reason = "only circular light (photon spin +1 or -1) leaves a dark sublevel"
    else:
        # The error of a = Gamma/(Gamma + loss): a (1 - a) times that of the loss.
        error = None if loss_error is None else q * abs(a * (1 - a)) * loss_error / 3 / damping**2
        photons = Sourced(q / damping, "1", "slowing-down factor / (1 - surviving orientation / 3)", COMPUTED, error)
    return SpinPumping(
        s, a, kind, gain * rate, damping * rate, s * gain / (2 * damping), q, photons, reason, q / (damping * rate)
        if rate > 0 else math.inf,
    )  # fmt: skip


def _sourced(line: AbsorptionLine, value_of: Callable[[AbsorptionLine], Array], unit: str, what: str) -> Sourced:
    """A number made from the line, with the errors of collisional width and shift and of the lifetime carried over.

    No error if a collisional one is unknown; where only the lifetime states none, the source says that none is counted.
    """
    central = float(value_of(line))
    lifetime = line.alkali.levels[UPPER_LEVEL[line.line]].lifetime_ns
    assert lifetime is not None
    strength = line.alkali.oscillator_strength[line.line]
    source = f"{what}, uniform beam at the entrance; {line.sample}; f {strength.source}"
    parts: list[float] = []
    if lifetime.error is None:
        source += "; the lifetime states no error, none is counted"
    else:
        parts.append(central * lifetime.error / lifetime.value)
    width, shift = line.fwhm_error_rad_s, line.shift_error_rad_s
    if line.fwhm_rad_s or line.shift_rad_s:  # without gas there is nothing to be wrong about
        if width is None or shift is None:
            return Sourced(central, unit, source, COMPUTED, None)
        wider = [replace(line, fwhm_rad_s=max(line.fwhm_rad_s + sign * width, 0.0)) for sign in (-1, 1)]
        moved = [replace(line, shift_rad_s=line.shift_rad_s + sign * shift) for sign in (-1, 1)]
        parts += [max(abs(float(value_of(one)) - central) for one in pair) for pair in (wider, moved)]
    return Sourced(central, unit, source, COMPUTED, math.hypot(*parts) if parts else None)


def _vector_field(line: AbsorptionLine, beam: Beam, at: float, shift: Sourced) -> tuple[Sourced | None, str | None]:
    """Field whose Zeeman term equals the vector light shift, or why there is none."""
    span, width = line.splitting_GHz("S1/2"), line.component_fwhm_GHz(beam.linewidth_GHz)
    if span * CLEAR > max(width, abs(at - line.shift_GHz)):
        return None, (
            f"the hyperfine structure of the ground level ({span:.3g} GHz) is not small against width "
            f"({width:.3g} GHz) or detuning: the shift differs from one F to the other and is no single field"
        )
    per_gauss = larmor_rad_s(line.alkali.levels["S1/2"].gJ.value, 1.0)
    factor = _VECTOR[line.line] * beam.photon_spin / per_gauss
    error = None if shift.error is None else abs(factor) * shift.error
    return Sourced(factor * shift.value, "G", "vector light shift of the spin, along the beam", COMPUTED, error), None


def _resonant_cross_section(line: AbsorptionLine, beam: Beam, at: float) -> float:
    """Upper limit of the cross section of the atoms whose velocity suits the light best [cm^2]."""
    away = [max(0.0, abs(at - one.offset_GHz - line.shift_GHz) - _FASTEST * one.doppler_GHz) for one in line.components]
    spectrum = beam.linewidth_GHz / GAUSS_FWHM
    return line.area_cm2_GHz * float(voigt_profile(min(away), spectrum, line.lorentz_fwhm_GHz / 2))


def _warnings(line: AbsorptionLine, beam: Beam, at: float, saturation: float) -> tuple[str, ...]:
    found = []
    if saturation > SATURATION_LIMIT:
        found.append(
            f"saturation parameter {saturation:.3g} is above {SATURATION_LIMIT:g} for the atoms in resonance: the rate "
            "is no longer proportional to the power and is too high; widen the beam or lower the power."
        )
    if (words := line.resolution("S1/2", beam.linewidth_GHz)) != "unresolved":
        found.append(
            f"the hyperfine structure of the ground level is {words}: light empties one F more than the other, and the "
            "spin equation holds only if spin exchange or collisions mix the two faster than the beam pumps."
        )
    if abs(at) > WING_GHZ:
        found.append(
            f"detuning {at:.3g} GHz is beyond {WING_GHZ:g} GHz, where the impact profile of the wing is doubtful."
        )
    share = _other_line_share(line, beam, at)
    if share > _OTHER_LINE:
        found.append(f"{_OTHER_LINE_OF[line.line]} adds {share:.2g} of the absorption here, which is left out.")
    return tuple(found)


def _other_line_share(line: AbsorptionLine, beam: Beam, at: float) -> float:
    """Absorption by the other D line over that by both [1], its collisional width taken as the same."""
    name = None if line.sample not in {one.label for one in line.alkali.isotopes} else line.sample
    other = absorption_line(
        line.alkali, _OTHER_LINE_OF[line.line], line.temperature_K, line.fwhm_rad_s, line.shift_rad_s, name
    )
    apart = line.alkali.fine_structure_cm1.value * CM1_GHZ
    there = at - apart if line.line == "D1" else at + apart
    own, theirs = (float(one.cross_section(nu, beam.linewidth_GHz)) for one, nu in ((line, at), (other, there)))
    return theirs / (own + theirs)


def _check(line: AbsorptionLine, beam: Beam, quench_rate: float, slowing_down: float) -> None:
    broken = []
    half = line.alkali.fine_structure_cm1.value * CM1_GHZ / 2
    towards = 1 if line.line == "D1" else -1
    if beam.detuning_GHz is not None and towards * beam.detuning_GHz > half:
        broken.append(
            f"detuning = {beam.detuning_GHz:g} GHz is more than half the fine structure ({half:.4g} GHz) away from "
            f"{line.line}: name line {_OTHER_LINE_OF[line.line]} and count the detuning from it."
        )
    if not (math.isfinite(quench_rate) and quench_rate >= 0):
        broken.append(f"quenching rate = {quench_rate!r} s^-1 must be finite and >= 0; give another rate.")
    if not (math.isfinite(slowing_down) and slowing_down >= 1):
        broken.append(f"slowing-down factor = {slowing_down!r} must be finite and >= 1; 1 leaves the nuclear spin out.")
    if broken:
        raise InputError(broken)
