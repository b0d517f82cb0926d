"""The cell: its shape, how fast atoms meet its wall, and what a bounce costs.

The slowest mode of diffusion with a partially depolarising wall, D d(rho)/dn = -(vbar/4) eps rho at the wall: D k1^2
at high gas density, vbar A/(4V) eps at low, both exactly. notes/ground-level.md says why this condition and what a
better one would change. Units: cm, s^-1, cm^2/s, cm/s, K.
"""

from __future__ import annotations

import math
import re
from collections.abc import Callable
from dataclasses import dataclass
from functools import cache

from scipy.optimize import brentq
from scipy.special import j0, j1, jn_zeros, spherical_jn

from pertcalc import species
from pertcalc.constants import AMU_AU, AU_VELOCITY_CM_S
from pertcalc.errors import InputError, UnknownNameError
from pertcalc.species import COMPUTED, FROM_MEMORY, READ, Sourced
from pertcalc.thermal import mean_speed
from pertcalc.units import parse_length

# Shape -> what its sizes are called.
SHAPES = {"sphere": ("diameter",), "cylinder": ("diameter", "length"), "cube": ("edge",)}
WALLS = ("bare", "coated")
EXAMPLES = "'sphere 25 mm' (diameter), 'cylinder 25 mm x 50 mm' (diameter x length) or 'cube 10 mm' (edge)"
SMALLEST_CM, LARGEST_CM = 1e-3, 1e4  # below, no wall is far from any other; above, no cell (both only stop nonsense)
# An alkane coating melts above about 60 to 80 degC (common practice, no source).
COATING_LIMIT_K = 333.15

# Published bounces and rates behind the coated wall, see `depolarisation_per_bounce`.
_BOUNCES = 1e4
_BOUNCES_SOURCE = (
    "Balabas, Karaulanov, Ledbetter & Budker, PRL 105, 070801 (2010); "
    "read at https://www.arxiv-vanity.com/papers/1005.1617/"
)
_COATED_HZ, _COATED_DIAMETER_CM, _COATED_TEMPERATURE_K = 2.0, 3.0, 295.0
_COATED_SOURCE = (
    "Guzman et al., Phys. Rev. A 74, 053415 (2006); "
    "read at https://dorsalhub.com/ann/c553767f-6150-47ca-905e-bf51f113fbf5"
)


@dataclass(frozen=True, slots=True)
class Cell:
    """A vapour cell.

    ``shape`` "sphere" | "cylinder" | "cube"; ``sizes_cm`` its diameter, its diameter and length, or its edge [cm].

    Raises InputError for another shape, a wrong number of sizes, or a size outside 1e-3 .. 1e4 cm.
    """

    shape: str
    sizes_cm: tuple[float, ...]

    def __post_init__(self) -> None:
        if self.shape not in SHAPES:
            raise UnknownNameError("cell shape", str(self.shape), tuple(SHAPES))
        names = SHAPES[self.shape]
        if len(self.sizes_cm) != len(names):
            raise InputError(f"--cell: a {self.shape} needs {' and '.join(names)}; write --cell as {EXAMPLES}.")
        for name, size in zip(names, self.sizes_cm, strict=True):
            if not SMALLEST_CM <= size <= LARGEST_CM:
                raise InputError(
                    f"--cell: {name} of the {self.shape} = {size:g} cm must lie between {SMALLEST_CM:g} and "
                    f"{LARGEST_CM:g} cm; write --cell as {EXAMPLES}."
                )

    @property
    def volume_cm3(self) -> float:
        """Volume [cm^3]."""
        d = self.sizes_cm[0]
        return {"sphere": math.pi / 6, "cylinder": math.pi / 4, "cube": 1.0}[self.shape] * d * d * self.sizes_cm[-1]

    @property
    def area_cm2(self) -> float:
        """Area of the wall [cm^2]."""
        d, last = self.sizes_cm[0], self.sizes_cm[-1]
        return {"sphere": math.pi * d * d, "cylinder": math.pi * d * (d / 2 + last), "cube": 6 * d * d}[self.shape]

    @property
    def opening_cm(self) -> float:
        """Diameter of the widest beam along the axis that clears the wall [cm]: diameter or edge."""
        return self.sizes_cm[0]

    @property
    def words(self) -> str:
        """The cell in words, such as "cylinder, diameter 2.5 cm, length 5 cm"."""
        names = SHAPES[self.shape]
        return ", ".join([self.shape, *(f"{n} {s:g} cm" for n, s in zip(names, self.sizes_cm, strict=True))])


def parse_cell(words: object, name: str = "--cell") -> Cell:
    """A cell from words: "sphere 25 mm" (diameter), "cylinder 25 mm x 50 mm" (diameter x length), "cube 10 mm".

    Raises InputError with the field ``name``, the words, the rule and an example for anything else.
    """
    if not isinstance(words, str):
        raise InputError(f"{name} = {words!r} must be text; write {name} as {EXAMPLES}.")
    shown = repr(words if len(words) <= 60 else words[:60] + "...")
    shape, _, rest = words.strip().partition(" ")
    shape = shape.lower()
    if shape not in SHAPES:
        raise InputError(f"{name} = {shown}: must begin with {', '.join(SHAPES)}; write {name} as {EXAMPLES}.")
    sizes = [size for size in re.split(r"\s*[xX×]\s*", rest.strip()) if size]
    wanted = SHAPES[shape]
    if len(sizes) != len(wanted):
        rule = f"a {shape} needs {' x '.join(wanted)}, {len(wanted)} length{'s' * (len(wanted) > 1)}, not {len(sizes)}"
        raise InputError(f"{name} = {shown}: {rule}; write {name} as {EXAMPLES}.")
    try:
        return Cell(shape, tuple(parse_length(size, n) for size, n in zip(sizes, wanted, strict=True)))
    except InputError as problem:
        rule = str(problem).removeprefix("--cell: ").rsplit("; write", 1)[0]
        raise InputError(f"{name} = {shown}: {rule}; write {name} as {EXAMPLES}.") from problem


def alkali_speed_cm_s(mass_u: float, temperature_K: float) -> float:
    """Mean speed of an atom, ``vbar = sqrt(8 k T/(pi m))`` [cm/s], of mass [u] at a temperature [K]."""
    return float(mean_speed(temperature_K, mass_u * AMU_AU)) * AU_VELOCITY_CM_S


def depolarisation_per_bounce(wall: str) -> Sourced:
    """Probability [1] that one collision with the wall destroys the polarisation.

    Bare glass: 1 (common practice, no source). Coated (paraffin): the middle of two published figures, half their
    distance as error: 1/bounces of "about 1e4 bounces", and ``2 pi 2.0 Hz / (vbar A/4V)`` of potassium in a 3 cm cell,
    taken as a sphere at 295 K.

    Raises UnknownNameError for another wall.
    """
    if wall not in WALLS:
        raise UnknownNameError("wall", str(wall), WALLS)
    if wall == "bare":
        return Sourced(1.0, "1", "every bounce on bare glass depolarises: common practice, no source", FROM_MEMORY, 0.0)
    return _coated()


@cache
def _coated() -> Sourced:
    potassium = species.alkali("K")
    speed = alkali_speed_cm_s(potassium.mass_u.value, _COATED_TEMPERATURE_K)
    measured = 2 * math.pi * _COATED_HZ / wall_rate(Cell("sphere", (_COATED_DIAMETER_CM,)), None, speed, 1.0)
    pair = sorted((1 / _BOUNCES, measured))
    source = (
        f"middle of {pair[0]:.2g} and {pair[1]:.2g} on paraffin: 1e4 bounces ({READ}: {_BOUNCES_SOURCE}) and "
        f"{_COATED_HZ:g}(6) Hz of K in a 3 cm cell ({READ}: {_COATED_SOURCE}); real coatings differ more"
    )
    return Sourced(sum(pair) / 2, "1", source, COMPUTED, (pair[1] - pair[0]) / 2)


def coating_warning(wall: str, temperature_K: float) -> str | None:
    """A sentence when a coated cell is hotter than its coating stands, else None; ``temperature_K`` [K]."""
    if wall != "coated" or temperature_K <= COATING_LIMIT_K:
        return None
    return (
        "An alkane coating melts above about 60 to 80 degC (common practice, no source): at "
        f"{temperature_K - 273.15:.0f} degC it may be as bad as a bare wall. Take --wall bare or a cooler cell."
    )


def wall_rate(
    cell: Cell, D_cm2_s: float | None, mean_speed_cm_s: float, depolarisation: float, corrected: bool = False
) -> float:
    """Rate of the slowest mode of diffusion with a partially depolarising wall [s^-1].

    ``D k^2`` with ``D d(rho)/dn = -(vbar/4) eps rho``, that is, with h = vbar eps/(4 D): sphere
    ``1 - x cot x = h R, k = x/R``; infinite cylinder ``x J1(x)/J0(x) = h R``; two planes L apart
    ``y tan y = h L/2, k = 2y/L``; a cylinder adds the last two, a cube has three pairs of planes.

    Parameters
    ----------
    cell : Cell
        [cm].
    D_cm2_s : float or None
        Diffusion coefficient [cm^2/s] > 0; None: no gas, free flight ``vbar A/(4V) eps``.
    mean_speed_cm_s : float
        Mean speed of an atom [cm/s] > 0.
    depolarisation : float
        eps, probability per bounce [1], 0 < eps <= 1.
    corrected : bool
        Take eps/(1 - eps/2), the net flux of kinetic theory: what a polarisation left alone decays with at the end.

    Returns
    -------
    rate : float
        [s^-1]; exact for the equations apart from rounding.

    Raises
    ------
    InputError
        Names the value that breaks its rule.
    """
    return _mode_rate(_pieces(cell), D_cm2_s, mean_speed_cm_s, depolarisation, corrected)


def transit_rate(
    beam_diameter_cm: float, D_cm2_s: float | None, mean_speed_cm_s: float, corrected: bool = False
) -> float:
    """Rate at which atoms leave a beam [s^-1]: `wall_rate` of an infinite cylinder whose wall ends every orbit.

    Free flight: ``vbar/d``. Atoms are taken as replaced by unpolarised ones. Parameters: diameter d [cm], D [cm^2/s]
    or None without gas, mean speed [cm/s], ``corrected`` as there; InputError names a value that is not > 0.
    """
    if not (math.isfinite(beam_diameter_cm) and beam_diameter_cm > 0):
        raise InputError(f"--beam-diameter = {beam_diameter_cm:g} cm must be finite and > 0; give another diameter.")
    return _mode_rate((("cylinder", beam_diameter_cm / 2),), D_cm2_s, mean_speed_cm_s, 1.0, corrected)


# Shape -> first root with a wall that lets nothing survive; A r/V; the two radial functions u, w of x u(x) = h r w(x).
# The planes have r = L/2. Written with Bessel functions nothing cancels at small x (1 - x cot x = x j1/j0).
_RADIAL: dict[str, tuple[float, int, Callable[[float], float], Callable[[float], float]]] = {
    "sphere": (math.pi, 3, lambda x: spherical_jn(1, x), lambda x: spherical_jn(0, x)),
    "cylinder": (float(jn_zeros(0, 1)[0]), 2, j1, j0),
    "planes": (math.pi / 2, 1, math.sin, math.cos),
}


def _pieces(cell: Cell) -> tuple[tuple[str, float], ...]:
    """The separable parts of a cell: (radial problem, its radius or half distance [cm])."""
    half = tuple(size / 2 for size in cell.sizes_cm)
    return {
        "sphere": (("sphere", half[0]),),
        "cylinder": (("cylinder", half[0]), ("planes", half[-1])),
        "cube": (("planes", half[0]),) * 3,
    }[cell.shape]


def _first_root(kind: str, H: float) -> float:
    """First root of x u(x) = H w(x); between sqrt(d H), the free-flight limit, and the root of w nothing is lost."""
    last, d, u, w = _RADIAL[kind]
    high = min(last, math.sqrt(d * H) * (1 + 1e-9))  # rounding must not put the root outside

    def balance(x: float) -> float:
        return float((x * u(x) - H * w(x)) / (1 + H))

    return float(brentq(balance, 0.0, high, xtol=1e-300, rtol=1e-14)) if balance(high) > 0 else high


def _mode_rate(
    pieces: tuple[tuple[str, float], ...], D: float | None, speed: float, eps: float, corrected: bool
) -> float:
    for name, value, rule in (
        ("diffusion coefficient [cm^2/s]", D, "> 0"),
        ("mean speed [cm/s]", speed, "> 0"),
        ("depolarisation per bounce [1]", eps, "> 0 and <= 1"),
    ):
        if value is not None and not (math.isfinite(value) and value > 0 and (rule == "> 0" or value <= 1)):
            raise InputError(f"{name} = {value!r} must be finite and {rule}; give another value.")
    speed_in = speed / 4 * (eps / (1 - eps / 2) if corrected else eps)
    if D is None:
        return speed_in * sum(_RADIAL[kind][1] / r for kind, r in pieces)
    return D * math.fsum((_first_root(kind, speed_in / D * r) / r) ** 2 for kind, r in pieces)
