"""The command ``pertcalc verdict``: words only; the library computes."""

from __future__ import annotations

from typing import Any

import click

from pertcalc.cli_options import (
    AnyGas,
    Species,
    Words,
    check_targets,
    checked_gas,
    deliver,
    one_format,
    progress_bar,
    rate_options,
    result_options,
)
from pertcalc.errors import InputError

NO_GAS = "none"


@click.command(short_help="What rules each level: collisions, field, light, walls or free decay.")
@click.argument("alkali", type=Species("alkali"))
@click.argument("gas", type=AnyGas("noble gas"), required=False)
@click.option("--gas", "gas_option", type=AnyGas("noble gas"), help='As GAS; "none" for a cell without buffer gas.')
@click.option("--temperature", type=Words("temperature", "K"), help='Of the cell, as "60 degC"; a bare number is K.')
@click.option("--pressure", type=Words("pressure"), help='Of the gas at the fill, as "20 Torr".')
@click.option(
    "--fill-temperature", type=Words("temperature", "K"), help="At which the pressure was read. [default: 20 degC]"
)
@click.option("--field", type=Words("field"), help='Magnetic field, as "0.5 G".')
@click.option("--cell", metavar="WORDS", help='As "cylinder 25 mm x 50 mm", "cube 10 mm". [default: sphere 25 mm]')
@click.option(
    "--wall",
    type=click.Choice(["bare", "coated"]),
    default="bare",
    show_default=True,
    help="Of glass, or alkane coated.",
)
@click.option("--power", type=Words("power"), help='Of the pumping light, as "1 mW"; needs --beam-diameter.')
@click.option("--beam-diameter", type=Words("length"), help='As "5 mm". [default: fills the cell]')
@click.option("--line", type=click.Choice(["D1", "D2"]), help="Which the light pumps. [default: D1]")
@click.option("--detuning", type=Words("frequency", "GHz"), help='From the free line, as "-2 GHz". [default: the peak]')
@click.option("--linewidth", type=Words("frequency", "GHz"), help='Of the light, as "50 MHz". [default: narrow]')
@rate_options
@click.option("--plot", metavar="FILE", help="Also draw the rates against pressure: FILE ends in .png or .svg.")
@click.option("--plot-hanle", metavar="FILE", help="Also draw the Hanle curves of D2: FILE ends in .png or .svg.")
@result_options
def verdict(
    alkali: str,
    gas: str | None,
    gas_option: str | None,
    temperature: float | None,
    pressure: float | None,
    fill_temperature: float | None,
    field: float | None,
    cell: str | None,
    wall: str,
    power: float | None,
    beam_diameter: float | None,
    line: str | None,
    detuning: float | None,
    linewidth: float | None,
    method: str,
    curve_file: str | None,
    plot: str | None,
    plot_hanle: str | None,
    as_json: bool,
    as_csv: bool,
    output: str | None,
    force: bool,
) -> None:
    """What rules the polarisation of each level of ALKALI in GAS: collisions, field, light, walls or free decay.

    Every rate of every level with its error and origin, who wins and by what factor, and the pressure and the field at
    which the answer changes. --csv gives Gamma_R, Gamma_I, Gamma_E, D1, D2 for a model of polarised lines (warnings
    on stderr).

    \b
    Examples:
        pertcalc verdict Rb Ar --cell "sphere 25 mm" --pressure "20 Torr" --field "0.1 G"
        pertcalc verdict Cs --gas none --cell "cube 10 mm" --wall coated
        pertcalc verdict K He --power "5 mW" --beam-diameter "5 mm" --plot rates.png
    """
    one_format(as_json, as_csv)
    check_targets(force, output, plot, plot_hanle)
    chosen = _gas(gas, gas_option)
    if plot is not None or plot_hanle is not None:
        from pertcalc.report.curve_figures import figure_format

        for target in (plot, plot_hanle):
            if target is not None:
                figure_format(target)
    if plot is not None and chosen.lower() == NO_GAS:
        raise InputError("--plot draws rates against pressure, and gas = none has no pressure; leave --plot out.")
    from pertcalc.vapour.question import ask
    from pertcalc.vapour.verdict import verdict as compute

    question = ask(
        alkali,
        chosen if chosen.lower() == NO_GAS else checked_gas(chosen, curve_file),
        temperature_K=temperature,
        pressure_torr=pressure,
        fill_temperature_K=fill_temperature,
        field_G=field,
        cell=cell,
        wall=wall,
        power_W=power,
        beam_diameter_cm=beam_diameter,
        line=line,
        detuning_GHz=detuning,
        linewidth_GHz=linewidth,
        method=method,
        curves=curve_file,
    )
    with progress_bar(f"{alkali} + {chosen}") as progress:
        found = compute(question, progress)
    _draw(found, plot, plot_hanle)
    if as_csv:  # rows have no place for them
        for warning in found.warnings:
            click.echo(f"warning: {warning}", err=True)
    deliver(_rendered(found, as_json, as_csv), output, force)


def _gas(argument: str | None, option: str | None) -> str:
    """The gas, named once."""
    named = [one for one in (argument, option) if one is not None]
    if not named:
        raise InputError("no gas is named: add GAS after the alkali, or --gas none for a cell without buffer gas.")
    if len(named) > 1 and named[0].lower() != named[1].lower():
        raise InputError(f"GAS = {named[0]} and --gas = {named[1]} differ; name the gas once.")
    return named[0]


def _draw(found: Any, plot: str | None, plot_hanle: str | None) -> None:
    """The figures asked for."""
    if plot is not None:
        from pertcalc.report.verdict_figures import save_rates

        click.echo(f"wrote {save_rates(found, plot)}", err=True)
    if plot_hanle is not None:
        from pertcalc.report.hanle_figures import save_hanle
        from pertcalc.vapour.verdict import hanle_of

        click.echo(f"wrote {save_hanle(*hanle_of(found), plot_hanle)}", err=True)


def _rendered(found: Any, as_json: bool, as_csv: bool) -> str:
    """The answer in the format asked for."""
    if as_json:
        from pertcalc.report.as_json import dump
        from pertcalc.report.verdict_data import verdict_json

        return dump(verdict_json(found))
    if as_csv:
        from pertcalc.report.verdict_data import verdict_csv

        return verdict_csv(found)
    from pertcalc.report.verdict_text import verdict_text

    return verdict_text(found)
