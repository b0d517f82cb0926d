"""Which g factor rules a P level in a cell, and the fields that follow: one number, or a range where neither holds.

g_J stands where the hyperfine structure is unresolved or the field decouples the nucleus, g_F of the stretched level
where each F turns by itself; in between the truth lies between the two (`hanle_fields.regime`). notes/verdict.md.
"""

from __future__ import annotations

from pertcalc.species import COMPUTED, Alkali, Isotope, Sourced
from pertcalc.vapour.excited import RankBalance
from pertcalc.vapour.fill import hanle_field_G
from pertcalc.vapour.hanle_fields import CLEAR, Regime, regime
from pertcalc.vapour.level_rates import J_OF, LevelRates
from pertcalc.vapour.process import weakest_mark


def visible_regimes(isotope: Isotope, electronic: LevelRates, field_G: float) -> dict[str, Regime]:
    """Hyperfine structure of both P levels against the damping of their visible rank, in ``field_G`` [G]."""
    visible = {"P1/2": 1, "P3/2": 2}
    return {
        level: regime(isotope, level, electronic.decay[level] + electronic.loss[level][K], field_G)
        for level, K in visible.items()
    }


def stretched_g(atom: Alkali, isotope: Isotope, level: str) -> Sourced:
    """g factor of the level F = I + J, ``g_F = g_J J/F`` [1]; g_I is neglected."""
    g_J, J = atom.levels[level].gJ, J_OF[level]
    F = J + isotope.nuclear_spin
    error = None if g_J.error is None else g_J.error * J / F
    source = f"g_F of F={F:g}, {isotope.label}: g_J J/F, g_J {g_J.source}"
    return Sourced(g_J.value * J / F, "1", source, weakest_mark((COMPUTED, g_J.mark)), error)


def g_in_force(atom: Alkali, isotope: Isotope, where: Regime) -> tuple[Sourced, str]:
    """g factor of the Larmor frequency of a level [1], and in words which one: g_F too where neither holds."""
    if where.g_factor == "g_J":
        free = "unresolved" if where.structure == "unresolved" else "decoupled by the field"
        return atom.levels[where.level].gJ, f"g_J: nuclear spin {free}"
    return stretched_g(
        atom, isotope, where.level
    ), f"g_F of F={J_OF[where.level] + isotope.nuclear_spin:g}, {where.isotope}"


def hanle_range_G(atom: Alkali, isotope: Isotope, where: Regime, balance: RankBalance) -> tuple[float, float]:
    """Hanle fields with g_J and with g_F where neither holds, else twice the one of ``balance`` [G]."""
    if where.g_factor is not None:
        return balance.hanle_G, balance.hanle_G
    damping = balance.radiative.value + balance.collisional.value
    g_J, g_F = atom.levels[where.level].gJ.value, stretched_g(atom, isotope, where.level).value
    return hanle_field_G(g_J, damping), hanle_field_G(g_F, damping)


def crossover_field_G(
    atom: Alkali, isotope: Isotope, here: Regime, balance: RankBalance
) -> tuple[float, tuple[float, float]]:
    """Field at which the Larmor frequency, with the g in force there, reaches the larger of decay and collisions [G].

    g only grows with the field, from g_F to g_J where the nucleus is decoupled; a rate that lies between both Larmor
    frequencies there is passed at that step.

    Parameters
    ----------
    atom, isotope : Alkali, Isotope
    here : Regime
        Of the level in the cell.
    balance : RankBalance

    Returns
    -------
    field, (low, high) : float, tuple of float
        [G]; low < high where neither g holds at the crossover: low with g_J, or where the levels F cease to turn by
        themselves if that is higher; high is ``field``.
    """

    def at(field_G: float) -> Regime:
        return regime(isotope, here.level, here.width, field_G)

    def g_at(field_G: float) -> float:
        return g_in_force(atom, isotope, at(field_G))[0].value

    rate = max(balance.radiative.value, balance.collisional.value)
    weak, g_J = g_at(0.0), atom.levels[here.level].gJ.value
    electronic = hanle_field_G(g_J, rate)
    if g_at(field := hanle_field_G(weak, rate)) == weak:
        if at(field).g_factor is not None:
            return field, (field, field)
    elif g_at(electronic) == g_J:
        return electronic, (electronic, electronic)
    else:
        field = hanle_field_G(g_J, CLEAR * here.largest)
    apart = hanle_field_G(g_J, here.smallest / CLEAR) if here.structure == "resolved" else 0.0
    return field, (max(electronic, apart), field)
