"""Saltmarsh Instruments, an invented maker, asks what rules its invented Curlew cell before it is filled.

The Curlew orients the ground level of rubidium with D1 light; a second head watches the alignment of P3/2 in the light
of D2. What do 20 Torr of argon change, at which pressure does each answer turn, and which rates does a model of the
polarised lines need? Run:  python examples/verdict_of_a_cell.py
"""

from __future__ import annotations

from pertcalc.report.verdict_words import VISIBLE
from pertcalc.units import parse_field, parse_length, parse_power, parse_pressure, parse_temperature
from pertcalc.vapour.question import ask
from pertcalc.vapour.verdict import Verdict, verdict


def curlew(gas: str) -> Verdict:
    """The verdict on the Curlew cell, with a gas or with "none"."""
    return verdict(
        ask(
            "Rb",
            gas,
            temperature_K=parse_temperature("60 degC"),
            pressure_torr=None if gas == "none" else parse_pressure("20 Torr"),
            field_G=parse_field("0.1 G"),
            cell="cylinder 25 mm x 50 mm",
            power_W=parse_power("20 uW"),
            beam_diameter_cm=parse_length("10 mm"),
        )
    )


def main() -> None:
    """Print what rules each level with and without gas, and the rates of both lines."""
    print("Curlew cell: Rb at 60 degC, 25 mm x 50 mm, 0.1 G, 20 uW of D1 light")
    found = {gas: curlew(gas) for gas in ("none", "Ar")}
    print("gas   level  rank  ruled or relaxed by        Hanle field, G")
    for gas, answer in found.items():
        for level, K in VISIBLE.items():
            one = answer.balances[level][K]
            print(f"{gas:4}  {level:5}  {K:4}  {one.dominant:24}  {one.hanle_G:14.1f}")
        ground = answer.ground
        strongest = ground.strongest
        assert strongest is not None and ground.crossover_field_G is not None  # the wall has a rate in any cell
        print(f"{gas:4}  S1/2      1  {strongest.name:24}  {ground.crossover_field_G:14.1e}")
    answer = found["Ar"]
    for level, K in VISIBLE.items():
        one = answer.balances[level][K]
        print(f"{level}: collisions rule above {one.crossover_pressure_torr:.2g} Torr of Ar")
    print(
        f"S1/2: the gas relaxes more than wall and transit above {answer.ground.crossover_pressure_torr:.2g} Torr of Ar"
    )
    W2 = {gas: one.scattering["D2"].W2.value for gas, one in found.items()}
    print(f"W2 of D2: {W2['none']:.3f} without gas, {W2['Ar']:.3f} in Ar")
    print("line    Gamma_R    Gamma_I    Gamma_E         D1         D2   [1/s]")
    for line, rates in answer.models.items():
        columns = (rates.gamma_R, rates.gamma_I, rates.gamma_E, rates.depolarising[1], rates.depolarising.get(2))
        print(f"{line:4}" + "".join(f"{'-':>11}" if value is None else f"{value:11.2e}" for value in columns))


if __name__ == "__main__":
    main()
